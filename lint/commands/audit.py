"""``overlapse audit``: judge files, folders and standard input."""

import sys
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

import click

from overlapse.lint.common import (
    CLEAN,
    FOUND,
    SEVERITIES,
    UNREADABLE,
    a_layout,
    a_report,
    like_a_layout,
    like_a_report,
    output,
)

if TYPE_CHECKING:
    from overlapse.lint.engine import FileAudit, Target
    from overlapse.lint.ledger import Sieve

# Up to this much text, energies are computed unless somebody says otherwise: some ten files.
_ENERGETIC_BYTES = 1_000_000


@click.command()
@click.argument("paths", nargs=-1, required=True, type=click.Path(allow_dash=True, path_type=Path))
@click.option(
    "--report",
    callback=a_report,
    shell_complete=like_a_report,
    default="text",
    help="text, lines, json, sarif or html (extra: report).",
)
@click.option("--out", type=click.Path(path_type=Path), help="Write the report to this file.")
@click.option(
    "--layout",
    callback=a_layout,
    shell_complete=like_a_layout,
    help="Read all files as this layout.",
)
@click.option("--label", help="What the sets are called, over what the files say.")
@click.option("--named", default="<stdin>", help="File name to report for standard input (-).")
@click.option("--fail-at", type=SEVERITIES, help="Level from which the audit fails [warning].")
@click.option("--least", type=SEVERITIES, default="note", help="Least level to show [note].")
@click.option("--recognised-only", is_flag=True, help="Pass over files that show no layout.")
@click.option(
    "--write-ledger",
    is_flag=True,
    help="Record all findings as known; from then on only new ones count.",
)
@click.option(
    "--ledger", type=click.Path(dir_okay=False, path_type=Path), help="The ledger to use."
)
@click.option("--without-ledger", is_flag=True, help="Let known findings count as well.")
@click.option("--processes", type=click.IntRange(1), help="Judge on so many processors [all].")
@click.option("--no-cache", is_flag=True, help="Judge anew, and keep no results.")
@click.option(
    "--energies/--no-energies",
    default=None,
    help="Compute the atoms, H to Kr, or not.  [up to 1 MB of files, but not recognised-only]",
)
@click.option("--staged", is_flag=True, help="Judge what is staged in git, not the working files.")
@click.option("-q", "--quiet", is_flag=True, help="Say only what makes the audit fail.")
@click.option("-v", "--verbose", is_flag=True, help="Tell of each file how it was taken.")
def audit(
    paths: tuple[Path, ...],
    report: str,
    out: Path | None,
    layout: str | None,
    label: str | None,
    named: str,
    fail_at: str | None,
    least: str,
    recognised_only: bool,
    write_ledger: bool,
    ledger: Path | None,
    without_ledger: bool,
    processes: int | None,
    no_cache: bool,
    energies: bool | None,
    staged: bool,
    quiet: bool,
    verbose: bool,
) -> None:
    """Judge files, folders (searched by content) and standard input (-).

    Where energies are computed, each element takes some hundredths of a second, and one that looks
    wrong a second; so large amounts of files and hooks go without them unless they are asked for.

    Exit status: 0 nothing found at the failing level, 1 something found, 2 wrong use or settings,
    3 a file could not be read.

    \b
    Examples:
      overlapse audit sets/
      overlapse audit --report html --out page.html sets/
      overlapse audit --write-ledger sets/
      overlapse audit --staged --quiet sets/
      overlapse recast a.basis --layout stars | overlapse audit - --named a.basis
    """
    from overlapse.lint.bulk import size_of
    from overlapse.lint.engine import FileAudit, Options, Target, targets
    from overlapse.lint.ledger import Sieve
    from overlapse.lint.neighbours import Beside
    from overlapse.lint.reports import needs_documents
    from overlapse.lint.tree import is_folder
    from overlapse.lint.underway import SERIAL_BYTES, in_tree, of_files, of_staged, probed, told_of
    from overlapse.lint.unused import with_unused

    if quiet and verbose:
        raise click.UsageError("--quiet and --verbose exclude each other")
    if staged and write_ledger:
        raise click.UsageError("--write-ledger records working files, not what is --staged")
    troubles: list[FileAudit] = []

    def trouble(message: str) -> None:
        troubles.append(FileAudit(message.partition(":")[0], problem=message))

    sieve = None if without_ledger or write_ledger else Sieve(ledger)
    with in_tree(staged, paths):
        if staged:
            from overlapse.lint.staged import staged_targets

            found = staged_targets(paths)
        else:
            found = []
            for path in paths:
                found += [Target(path, False)] if path == Path("-") else targets([path], trouble)
        if recognised_only:
            found = [Target(target.path, True) for target in found]
        size = 0 if staged else sum(size_of(target.path) for target in found)
        if energies is None:
            is_hook = staged or recognised_only
            reason = "" if is_hook else _left_out(size, sieve, found)
            energies = not is_hook and not reason
            if reason and not quiet:
                click.echo(f"energies are left out, {reason}; --energies asks for them", err=True)
        beside = Beside([target.path for target in found if target.path != Path("-")])
        options = Options(label, layout, beside=beside, energies=energies)
        if staged:
            judged = of_staged(paths, options, recognised_only)
        else:
            documents, silent = needs_documents(report), quiet or verbose
            judged = of_files(found, size, options, named, processes, no_cache, documents, silent)
        folders = [path for path in paths if is_folder(path)]
        tally = _Tally()

        def stream() -> Iterator[FileAudit]:
            yield from with_unused(probed(told_of(judged) if verbose else judged), folders)
            yield from troubles
            if sieve is not None:
                yield from sieve.absent(folders)

        if write_ledger:
            _record(stream(), ledger, energies, tally)
        else:
            shown = _sifted(stream(), sieve, fail_at, least, quiet, tally)
            below = None if quiet or recognised_only else _Below(paths, sieve)
            _write(shown, report, out, size > SERIAL_BYTES, quiet, below, tally)
    _tell_of_plugins()
    sys.exit(tally.status)


class _Below(NamedTuple):
    """What the lines below a report rest on."""

    paths: Sequence[Path]
    sieve: "Sieve | None"


def _write(
    audits: "Iterable[FileAudit]",
    report: str,
    out: Path | None,
    large: bool,
    quiet: bool,
    below: _Below | None,
    tally: "_Tally",
) -> None:
    """Write the report; ``below``: what to say below one for people."""
    from overlapse.lint.closing import Shown, closing
    from overlapse.lint.reports import writer
    from overlapse.lint.terminal import coloured, width

    shown = Shown()

    def seen() -> "Iterator[FileAudit]":
        for item in audits:
            shown.add(item)
            yield item

    passing = seen()
    if quiet and out is None:
        passing = iter(list(passing))  # whether anything fails must be known first
        if tally.status == CLEAN:
            return
    with output(out, large) as written:
        writer(report)(passing, written, out is None and coloured(written))
        if below is not None and report == "text":
            ledgers = below.sieve.ledgers if below.sieve is not None else ()
            lines = closing(shown, below.paths, ledgers, width(written))
            written.writelines(f"{line}\n" for line in lines)


def _left_out(size: int, sieve: "Sieve | None", found: "Sequence[Target]") -> str:
    """Why energies are not computed unless they are asked for; "" if they are."""
    if size > _ENERGETIC_BYTES:
        return f"as {size / 1e6:.1f} MB of files would take long"
    if sieve is not None and sieve.without_energies(found):
        return "as the ledger was written without them"
    return ""


class _Tally:
    """The exit status that the audits seen so far give."""

    def __init__(self) -> None:
        self.status = CLEAN

    def add(self, item: "FileAudit") -> None:
        if item.problem:
            self.status = UNREADABLE
        elif item.fails and self.status == CLEAN:
            self.status = FOUND


def _sifted(
    audits: "Iterable[FileAudit]",
    sieve: "Sieve | None",
    fail_at: str | None,
    least: str,
    quiet: bool,
    tally: _Tally,
) -> "Iterator[FileAudit]":
    """The audits as they are shown: without what is known, or below the least level."""
    from overlapse.lint.engine import LEVELS

    for item in audits:
        if sieve is not None:
            item = sieve.sifted(item)
        if fail_at is not None:
            item = item.failing_at(fail_at)
        tally.add(item)
        if quiet and not item.fails and not item.problem:
            continue
        lowest = max(least, item.settings.fail_at, key=LEVELS.index) if quiet else least
        yield item if lowest == LEVELS[0] else item.at_least(lowest)


def _record(
    audits: "Iterable[FileAudit]", ledger: Path | None, energies: bool, tally: _Tally
) -> None:
    """Write ledgers of all findings and say so."""
    from overlapse.lint.ledger import write
    from overlapse.lint.reports.lines import one_line
    from overlapse.lint.tree import shown

    def seen() -> "Iterator[FileAudit]":
        for item in audits:
            # Known findings do not fail; files that could not be read still do.
            tally.add(replace(item, findings=()))
            if item.problem:
                click.echo(f"error: {item.problem}", err=True)
            yield item

    try:
        ledgers = write(seen(), ledger, energies=energies)
    except OSError as problem:
        raise click.UsageError(f"{problem.filename}: {problem.strerror or problem}") from problem
    for each in ledgers:
        files = len(each.files)
        click.echo(
            f"{one_line(shown(each.path))} holds {each.count} finding{'s' * (each.count != 1)} of "
            f"{files} file{'s' * (files != 1)}; from now on only new ones count"
        )
    if not energies and ledgers:
        click.echo("without energies, which later audits leave out as well unless --energies asks")


def _tell_of_plugins() -> None:
    from overlapse.grammar import plugins

    for message in plugins.troubles:
        click.echo(f"warning: {message}", err=True)
