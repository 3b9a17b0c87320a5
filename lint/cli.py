"""The command line.  Commands import what they need when they run, so that starting stays quick."""

import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, TextIO

import click

if TYPE_CHECKING:
    from overlapse.lint.describe import Description
    from overlapse.lint.engine import FileAudit, Target

CLEAN, FOUND, MISUSED, UNREADABLE, BROKEN = 0, 1, 2, 3, 70
_LEVELS = click.Choice(["error", "warning", "note"])
# Below this much text an audit is over before a progress bar would be seen.
_QUIET_BYTES = 1_500_000


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="overlapse", prog_name="overlapse")
def cli() -> None:
    """Judge Gaussian basis-set files before cluster time is spent on them."""


def _a_report(context: click.Context, parameter: click.Parameter, value: str) -> str:
    """Check the name of a report; which there are is found by presence, when it is needed."""
    from overlapse.lint.reports import names

    if value not in names():
        raise click.BadParameter(f"{value!r} is not one of {', '.join(names())}")
    return value


def _a_layout(context: click.Context, parameter: click.Parameter, value: str | None) -> str | None:
    """Check the name of a layout."""
    from overlapse.grammar.layouts import layouts

    if value is not None and value not in layouts():
        raise click.BadParameter(f"{value!r} is not one of {', '.join(layouts())}")
    return value


@cli.command()
@click.argument("paths", nargs=-1, required=True, type=click.Path(allow_dash=True, path_type=Path))
@click.option("--report", callback=_a_report, default="text", help="text, lines, json or sarif.")
@click.option("--out", type=click.Path(path_type=Path), help="Write the report to this file.")
@click.option("--layout", callback=_a_layout, help="Read all files as this layout.")
@click.option("--label", help="What the sets are called, over what the files say.")
@click.option("--named", default="<stdin>", help="File name to report for standard input (-).")
@click.option("--fail-at", type=_LEVELS, help="Level from which the audit fails [warning].")
@click.option("--least", type=_LEVELS, default="note", help="Least level to show [note].")
@click.option("--recognised-only", is_flag=True, help="Pass over files that show no layout.")
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
) -> None:
    """Judge files, folders (searched by content) and standard input (-).

    Exit status: 0 nothing found at the failing level, 1 something found, 2 wrong use or settings,
    3 a file could not be read.
    """
    from overlapse.lint.engine import LEVELS, FileAudit, Target, audit_file, targets
    from overlapse.lint.reports import writer

    troubles: list[FileAudit] = []

    def trouble(message: str) -> None:
        troubles.append(FileAudit(message.partition(":")[0], problem=message))

    found: list[Target] = []
    for path in paths:
        found += [Target(path, False)] if path == Path("-") else targets([path], trouble)
    if recognised_only:
        found = [Target(target.path, True) for target in found]
    audits: list[FileAudit] = []
    with _progress(found) as steps:
        for target in steps:
            if target.path == Path("-"):
                audits.append(_standard_input(named, label, layout))
            else:
                audits.append(audit_file(target, label=label, layout=layout))
    audits += troubles
    if fail_at is not None:
        audits = [_failing_at(item, fail_at) for item in audits]
    status = UNREADABLE if any(item.problem for item in audits) else CLEAN
    if status == CLEAN and any(item.fails for item in audits):
        status = FOUND
    shown = [_at_least(item, LEVELS[LEVELS.index(least) :]) for item in audits]
    with _output(out) as stream:
        writer(report)(shown, stream, out is None and stream.isatty())
    sys.exit(status)


def _failing_at(item: "FileAudit", level: str) -> "FileAudit":
    from dataclasses import replace

    return replace(item, settings=replace(item.settings, fail_at=level))


def _at_least(item: "FileAudit", levels: Sequence[str]) -> "FileAudit":
    from dataclasses import replace

    return replace(item, findings=tuple(f for f in item.findings if f.severity in levels))


def _standard_input(named: str, label: str | None, layout: str | None) -> "FileAudit":
    from overlapse.grammar.reading import read_bytes
    from overlapse.lint.engine import judge
    from overlapse.lint.settings import settings_for

    document = read_bytes(sys.stdin.buffer.read(), named, layout=layout)
    return judge(document, label=label, settings=settings_for(Path(named).absolute()))


@contextmanager
def _progress(found: "Sequence[Target]") -> "Iterator[Iterator[Target]]":
    """A bar on the terminal where more than a moment's work is ahead."""
    sizes = [t.path.stat().st_size if t.path.is_file() else 0 for t in found]
    if sum(sizes) < _QUIET_BYTES or not sys.stderr.isatty():
        yield iter(found)
        return

    def steps() -> "Iterator[Target]":
        for target, size in zip(found, sizes, strict=True):
            yield target
            bar.update(size)

    with click.progressbar(length=sum(sizes), label="auditing", file=sys.stderr) as bar:
        yield steps()


@contextmanager
def _output(path: Path | None) -> Iterator[TextIO]:
    """Standard output, or a file that appears only when it is complete."""
    if path is None:
        yield sys.stdout
        return
    try:
        opened = click.open_file(str(path), "w", encoding="utf-8", atomic=True)
    except OSError as problem:
        raise click.UsageError(f"{path}: {problem.strerror or problem}") from problem
    with opened as stream:
        yield stream  # type: ignore[misc]


@cli.command()
@click.argument("name", required=False)
def rules(name: str | None) -> None:
    """List all rules, or explain one."""
    from difflib import get_close_matches

    from overlapse.lint.pages import page
    from overlapse.rules.registry import rules as known

    if name is None:
        for each in known().values():
            click.echo(f"{each.name:<22} {each.explanation.what}")
        return
    if name not in known():
        near = get_close_matches(name, known(), 1)
        hint = f"; did you mean {near[0]}?" if near else ""
        raise click.UsageError(f"no rule is called {name!r}{hint}")
    click.echo(page(known()[name]))


def _some_elements(
    context: click.Context, parameter: click.Parameter, value: tuple[str, ...]
) -> tuple[int, ...]:
    """Atomic numbers of the symbols given."""
    from overlapse.grammar.elements import number_of

    numbers = tuple(number_of(symbol) or 0 for symbol in value)
    if 0 in numbers:
        raise click.BadParameter(f"{value[numbers.index(0)]!r} is not the symbol of an element")
    return numbers


@cli.command()
@click.argument("path", type=click.Path(dir_okay=False, allow_dash=True, path_type=Path))
@click.option(
    "--element",
    "elements",
    multiple=True,
    callback=_some_elements,
    help="Only this element; may be given several times.",
)
@click.option("--report", type=click.Choice(["text", "json"]), default="text")
@click.option("--out", type=click.Path(path_type=Path), help="Write the report to this file.")
@click.option(
    "--picture",
    "drawing",
    type=click.Path(path_type=Path),
    help="Draw the exponents into this file: .svg, .png or .pdf (extra: report).",
)
@click.option("--layout", callback=_a_layout, help="Read the file as this layout.")
@click.option("--named", default="<stdin>", help="File name to report for standard input (-).")
def describe(
    path: Path,
    elements: tuple[int, ...],
    report: str,
    out: Path | None,
    drawing: Path | None,
    layout: str | None,
    named: str,
) -> None:
    """Say what a file, or standard input (-), contains, and which label fits it best.

    Exit status: 0 described, 1 faults of form may have cost something, 2 wrong use, 3 the file
    could not be read.
    """
    from overlapse.grammar.reading import read_bytes
    from overlapse.lint import describe as facts
    from overlapse.lint.tables import write_text

    try:
        data = sys.stdin.buffer.read() if path == Path("-") else path.read_bytes()
    except OSError as problem:
        raise _Unreadable(f"{path}: {problem.strerror or problem}") from problem
    name = named if path == Path("-") else str(path)
    description = facts.describe(read_bytes(data, name, layout=layout), elements)
    if lack := facts.emptiness(description):
        raise click.UsageError(lack) if description.document.blocks else _Unreadable(lack)
    if drawing is not None:
        _draw(description, drawing)
    with _output(out) as stream:
        (facts.write_json if report == "json" else write_text)(description, stream)
    sys.exit(FOUND if description.broken else CLEAN)


def _draw(description: "Description", path: Path) -> None:
    """Write the picture; without its library, or to a place that cannot be written, wrong use."""
    from overlapse.lint.picture import KINDS, PictureError, picture

    kind = path.suffix[1:].lower()
    if kind not in KINDS:
        raise click.UsageError(f"{path}: a picture's name ends in .{', .'.join(KINDS)}")
    try:
        drawn = picture(description, kind)
        with click.open_file(str(path), "wb", atomic=True) as stream:
            stream.write(drawn)
    except PictureError as problem:
        raise click.UsageError(str(problem)) from problem
    except OSError as problem:
        raise click.UsageError(f"{path}: {problem.strerror or problem}") from problem


class _Unreadable(click.ClickException):
    exit_code = UNREADABLE


@cli.command()
@click.argument("path", type=click.Path(exists=True, dir_okay=False, path_type=Path))
@click.option("--layout", "target", callback=_a_layout, required=True, help="Layout to write.")
@click.option("--from-layout", "origin", callback=_a_layout, help="Read the file as this layout.")
@click.option("--out", type=click.Path(path_type=Path), help="Write to this file.")
def recast(path: Path, target: str, origin: str | None, out: Path | None) -> None:
    """Write a file in another layout, its numbers with the digits they have.

    What the new layout cannot express is said on standard error.
    """
    from overlapse.grammar.layouts import layouts
    from overlapse.grammar.reading import read

    document = read(path, layout=origin)
    broken = [fault for fault in document.faults if fault.severity == "error"]
    if broken:
        place = document.source.place(broken[0].span[0])
        raise _Refused(
            f"{path}:{place.line}:{place.column}: {broken[0].message}; "
            f"mend the file first ({len(broken)} such faults)",
        )
    written = layouts()[target].write(document)
    with _output(out) as stream:
        stream.write(written.text)
    for loss in written.losses:
        click.echo(f"not expressed in {target}: {loss}", err=True)


class _Refused(click.ClickException):
    exit_code = FOUND


@cli.command()
@click.argument("folder", required=False, type=click.Path(path_type=Path))
def demo(folder: Path | None) -> None:
    """Copy the built-in scenario into FOLDER (or a temporary one) and audit it."""
    from overlapse.lint.demonstration import demonstrate

    demonstrate(folder, sys.stdout, sys.stdout.isatty())


def main() -> None:
    """Entry point: errors that are nobody's finding get their own exit status."""
    from overlapse.lint.settings import SettingsError

    try:
        cli()
    except SettingsError as problem:
        click.echo(f"error: {problem}", err=True)
        sys.exit(MISUSED)
    except BrokenPipeError:
        # The reader of our output has gone, which is its right.
        sys.stderr.close()
        sys.exit(CLEAN)
    except Exception as failure:
        click.echo(
            f"internal failure: {type(failure).__name__}: {failure}\n"
            "This is a fault of the program, not of your file; please report it with the file.",
            err=True,
        )
        sys.exit(BROKEN)
