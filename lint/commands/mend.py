"""``overlapse mend``: repair files, shown as a diff before anything is written."""

import os
import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from overlapse.lint.common import CLEAN, FOUND, UNREADABLE, a_layout, like_a_layout

if TYPE_CHECKING:
    from overlapse.lint.mending import Mended


def _rules(context: click.Context, parameter: click.Parameter, value: tuple[str, ...]) -> set[str]:
    """Rules whose repairs change what a file says; a group's name stands for all of its rules."""
    from overlapse.lint.mending import NUMERIC

    found: set[str] = set()
    for name in value:
        named = {rule for rule in NUMERIC if name in (rule, rule.partition(".")[0])}
        if not named:
            raise click.BadParameter(f"{name!r} is not one of {', '.join(NUMERIC)}")
        found |= named
    return found


def _like_rules(context: click.Context, parameter: click.Parameter, begun: str) -> list[str]:
    """Names of these rules, for the completion of a command line."""
    from overlapse.lint.mending import NUMERIC

    return [name for name in NUMERIC if name.startswith(begun)]


@click.command()
@click.argument("paths", nargs=-1, required=True, type=click.Path(allow_dash=True, path_type=Path))
@click.option("--write", is_flag=True, help="Write the mended files instead of showing a diff.")
@click.option(
    "--also",
    multiple=True,
    callback=_rules,
    shell_complete=_like_rules,
    metavar="RULE",
    help="Make repairs of this rule that change what the file says; may be given several times.",
)
@click.option(
    "--layout",
    callback=a_layout,
    shell_complete=like_a_layout,
    help="Read all files as this layout.",
)
@click.option("--label", help="What the sets are called, over what the files say.")
@click.option("--named", default="<stdin>", help="File name to report for standard input (-).")
def mend(
    paths: tuple[Path, ...],
    write: bool,
    also: set[str],
    layout: str | None,
    label: str | None,
    named: str,
) -> None:
    """Repair files and files in folders; without --write, show what would change.

    Safe repairs change no number: line ends, characters that look like digits, lost exponent
    letters, row numbers in front of rows, elements given twice with the same numbers. Repairs that
    change what a file says are made only for the rules named with --also: contraction.norm scales
    a contraction to self-overlap one, contraction.idle takes out a primitive without coefficients,
    label.* writes the label that fits, label.composition the composition that is there.

    A mended text is read again and judged before anything is written; one that does not say the
    same numbers is refused. Findings that are accepted are left alone.

    Exit status: 0 nothing to do, or all written; 1 a diff is shown, or a repair was refused; 2
    wrong use; 3 a file could not be read or written.

    \b
    Examples:
      overlapse mend sets/
      overlapse mend --write sets/carbon.basis
      overlapse mend --also contraction.norm sets/carbon.basis
    """
    from overlapse.lint.engine import Options, Target, targets
    from overlapse.lint.mending import mend as mended
    from overlapse.lint.settings import settings_for

    options, status = Options(label=label, layout=layout), CLEAN

    def trouble(message: str) -> None:
        nonlocal status
        status = UNREADABLE
        click.echo(f"error: {message}", err=True)

    for path in paths:
        found = [Target(path, False)] if path == Path("-") else targets([path], trouble)
        for target in found:
            name = named if target.path == Path("-") else os.fspath(target.path)
            try:
                data = _content(target.path)
                result = mended(data, name, settings_for(Path(name).absolute()), also, options)
                if target.searched and not result.audit.layout:
                    continue
                status = max(status, _told(result, target.path, name, data, write))
            except BrokenPipeError:
                raise  # who reads our output has gone
            except OSError as problem:
                trouble(f"{name}: {problem.strerror or problem}")
    sys.exit(status)


def _content(path: Path) -> bytes:
    return sys.stdin.buffer.read() if path == Path("-") else path.read_bytes()


def _told(result: "Mended", path: Path, name: str, data: bytes, write: bool) -> int:
    """Write a mended file or show its diff; the exit status that it gives."""
    from overlapse.lint.atomic import write_bytes
    from overlapse.lint.diff import diff
    from overlapse.lint.reports.lines import one_line

    for refusal in result.refused:
        repair = refusal.repair
        told = f"{name}: {repair.where}: {repair.rule} is left alone: {refusal.reason}"
        click.echo(one_line(told), err=True)
    status = FOUND if result.refused else CLEAN
    if path == Path("-") and write:
        sys.stdout.buffer.write(result.data)
        return status
    if result.data == data:
        return status
    if not write:
        shown = diff(data, result.data, name, sys.stdout.isatty())
        click.echo(shown.encode("utf-8", "surrogateescape"), nl=False)
        return FOUND
    if path.read_bytes() != data:
        raise OSError("it was changed by someone else meanwhile; nothing was written")
    write_bytes(path, result.data)
    count = len(result.done)
    click.echo(f"{one_line(name)}: {count} repair{'s' * (count != 1)} ({_rules_of(result)})")
    if path.is_symlink():
        target = one_line(os.path.realpath(path))
        click.echo(f"{one_line(name)} is a link; the file that was written is {target}")
    return status


def _rules_of(result: "Mended") -> str:
    from collections import Counter

    counts = Counter(repair.rule for repair in result.done)
    return ", ".join(f"{rule} {count}" for rule, count in sorted(counts.items()))
