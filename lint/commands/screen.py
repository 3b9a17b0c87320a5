"""``overlapse screen``: will the functions go linearly dependent in a real geometry?"""

import sys
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from overlapse.lint.common import (
    CLEAN,
    FOUND,
    SEVERITIES,
    UNREADABLE,
    Refused,
    Unreadable,
    a_layout,
    a_report,
    bytes_of,
    draw,
    like_a_layout,
    like_a_report,
    output,
)

if TYPE_CHECKING:
    from overlapse.grammar.geometry import Geometry, Unit
    from overlapse.grammar.model import Document
    from overlapse.lint.choices import Shelf, Use
    from overlapse.lint.engine import FileAudit
    from overlapse.lint.screening import Screening, Task
    from overlapse.rules.measured.probe import Probe

# Below this much work (cubes of the numbers of functions) no bar would be seen.
_QUIET = 2e9
_STDIN = Path("-")


class _Screen(click.Command):
    """Takes all words behind ``--on``, up to the next option, as geometries: ``--on *.xyz``."""

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        spread: list[str] = []
        behind = False
        for word in args:
            if word.startswith("-") and word != "-":
                behind = word == "--on"
                if not behind:
                    spread.append(word)
            else:
                spread += ["--on", word] if behind else [word]
        return super().parse_args(ctx, spread)


def _a_size(context: click.Context, parameter: click.Parameter, value: str | None) -> int | None:
    from overlapse.lint.memory import allowed, parsed_size

    if value is None:
        return allowed()
    try:
        return parsed_size(value)
    except ValueError as problem:
        raise click.BadParameter(str(problem)) from problem


def _some_uses(
    context: click.Context, parameter: click.Parameter, value: tuple[str, ...]
) -> "list[Use]":
    from overlapse.lint.choices import ChoiceError, parsed_use

    try:
        return [use for text in value for use in parsed_use(text)]
    except ChoiceError as problem:
        raise click.BadParameter(str(problem)) from problem


def _a_mesh(context: click.Context, parameter: click.Parameter, value: str) -> tuple[int, int, int]:
    words = value.replace("x", ",").split(",")
    if not all(word.isdecimal() and 1 <= int(word) <= 50 for word in words) or len(words) != 3:
        raise click.BadParameter(f"{value!r}: write three numbers of points, such as 2,2,2")
    return int(words[0]), int(words[1]), int(words[2])


def _a_fraction(context: click.Context, parameter: click.Parameter, value: float) -> float:
    if not 0.0 < value < 1.0:
        raise click.BadParameter(f"{value:g} is not between 0 and 1")
    return value


@click.command(cls=_Screen)
@click.argument("basis", nargs=-1, type=click.Path(dir_okay=False, allow_dash=True, path_type=Path))
@click.option(
    "--on",
    "geometry",
    multiple=True,
    required=True,
    type=click.Path(allow_dash=True, path_type=Path),
    help="Geometry files, or folders of XYZ files; all words up to the next option.",
)
@click.option(
    "--use",
    "uses",
    multiple=True,
    callback=_some_uses,
    metavar="WHO=FILE",
    help="Basis file for an element or for atoms: C=FILE, 3=FILE, 1-4,7=FILE.",
)
@click.option("--set", "wanted", default="", help="Label of the set, where a file has several.")
@click.option(
    "--spherical/--cartesian",
    "spherical",
    default=None,
    help="Kind of the functions [the file's mark, else what the family is used with].",
)
@click.option(
    "--unit", type=click.Choice(["angstrom", "bohr"]), help="Unit of length in the geometries."
)
@click.option(
    "--removal-threshold",
    "threshold",
    default=1e-6,
    show_default=True,
    callback=_a_fraction,
    help="Eigenvalue below which the program removes combinations.",
)
@click.option(
    "--prune",
    "tolerance",
    default=1e-7,
    show_default=True,
    callback=_a_fraction,
    help="Tolerance of the choice of functions to drop.",
)
@click.option(
    "--per-element",
    is_flag=True,
    help="Drop from all atoms of an element, not from those alone that can spare a function.",
)
@click.option("--charge", default=0, help="Charge of the molecule, for the outlook [0].")
@click.option(
    "--unpaired",
    type=click.IntRange(0),
    help="Unpaired electrons, for the outlook [the fewest possible].",
)
@click.option(
    "--mesh",
    default="2,2,2",
    show_default=True,
    callback=_a_mesh,
    help="k points along the vectors of a cell, beside the centre of the zone.",
)
@click.option(
    "--write",
    "folder",
    type=click.Path(file_okay=False, path_type=Path),
    help="Write the pruned basis files, and variants for single atoms, into this folder.",
)
@click.option(
    "--picture",
    "drawing",
    type=click.Path(path_type=Path),
    help="Draw eigenvalues and culprits into this file: .svg, .png or .pdf (extra: report).",
)
@click.option(
    "--memory", "limit", callback=_a_size, help="Memory to use at most, 4G [3/4 of what is free]."
)
@click.option("--jobs", type=click.IntRange(1), help="Processes for many frames [one per core].")
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
    help="Read all basis files as this layout.",
)
@click.option("--named", default="<stdin>", help="File name to report for standard input (-).")
@click.option("--fail-at", type=SEVERITIES, help="Level from which the screening fails [warning].")
@click.option("--least", type=SEVERITIES, default="note", help="Least level to show [note].")
def screen(
    basis: tuple[Path, ...],
    geometry: tuple[Path, ...],
    uses: "list[Use]",
    wanted: str,
    spherical: bool | None,
    unit: "Unit | None",
    threshold: float,
    tolerance: float,
    per_element: bool,
    charge: int,
    unpaired: int | None,
    mesh: tuple[int, int, int],
    folder: Path | None,
    drawing: Path | None,
    limit: int | None,
    jobs: int | None,
    report: str,
    out: Path | None,
    layout: str | None,
    named: str,
    fail_at: str | None,
    least: str,
) -> None:
    """Measure the overlap of BASIS files in real molecules or cells, before a field is solved.

    Name the basis files first: overlapse screen c.basis --on molecule.xyz.  One of all files may be
    standard input (-).

    Exit status: 0 nothing found at the failing level, 1 something found, 2 wrong use or settings,
    3 a file could not be read.

    \b
    Examples:
      overlapse screen c.basis --on molecule.xyz
      overlapse screen c.basis h.basis --on molecules/ --picture spectra.svg
      overlapse screen --use C=c.basis --use H=h.basis --on crystal.extxyz
    """
    from overlapse.lint.geometries import impossible, unmet
    from overlapse.lint.scanning import measure_all
    from overlapse.lint.screening import ScreenError, screened, tasks
    from overlapse.rules.measured.probing import Wanted

    if not basis and not uses:
        raise click.UsageError("name a basis file: overlapse screen BASIS... --on GEOMETRY...")
    if [*basis, *geometry].count(_STDIN) > 1:
        raise click.UsageError("standard input can stand for one file only")
    shelf = _shelf(basis, uses, layout, named, wanted, spherical)
    read, unread = _geometries(geometry, unit, named)
    try:
        found, audits = tasks(shelf, read)
        unserved = unmet(shelf, read)
        if unserved is not None:
            raise click.UsageError(unserved)
        for task in found:
            if (reason := impossible(shelf, task.frame, charge, unpaired)) is not None:
                raise click.UsageError(f"{task.geometry}, frame {task.frame.index}: {reason}")
        with _progress(found) as done:
            values = drawing is not None or report == "html"  # both draw all eigenvalues
            asked = Wanted(threshold, tolerance, not per_element, mesh, values, charge, unpaired)
            probes = measure_all(found, shelf, asked, jobs=jobs, limit=limit, done=done)
    except ScreenError as problem:
        raise Refused(str(problem)) from problem
    screening = screened(shelf, probes, [*audits, *unread])
    if drawing is not None:
        from overlapse.lint.spectra import spectra

        draw(drawing, lambda kind: spectra(probes, kind))
    with output(out) as stream:
        _write(screening.at_least(least), report, stream, out is None and stream.isatty())
    if folder is not None:
        _write_pruned(shelf, found, probes, folder)
    sys.exit(_status(screening, fail_at))


def _status(screening: "Screening", fail_at: str | None) -> int:
    audits = screening.audits
    if fail_at is not None:
        audits = tuple(audit.failing_at(fail_at) for audit in audits)
    if any(audit.problem for audit in audits):
        return UNREADABLE
    if not screening.probes and not any(audit.fails for audit in audits):
        return UNREADABLE
    return FOUND if any(audit.fails for audit in audits) else CLEAN


def _write(screening: "Screening", report: str, stream: Any, colour: bool) -> None:
    from overlapse.lint import screens
    from overlapse.lint.reports import writer

    if report == "text":
        screens.write_text(screening, stream, colour)
    elif report == "json":
        screens.write_json(screening, stream)
    else:
        writer(report)(screening.audits, stream, colour)


def _shelf(
    basis: Sequence[Path],
    uses: "Sequence[Use]",
    layout: str | None,
    named: str,
    wanted: str,
    spherical: bool | None,
) -> "Shelf":
    from overlapse.lint.choices import ChoiceError, shelf

    read: dict[Path, Document] = {}
    for path in [*basis, *(use.path for use in uses)]:
        if path not in read:
            read[path] = _document(path, layout, named)
    try:
        return shelf(
            [read[path] for path in dict.fromkeys(basis)],
            [(use, read[use.path]) for use in uses],
            wanted=wanted,
            spherical=spherical,
        )
    except ChoiceError as problem:
        raise click.UsageError(str(problem)) from problem


def _document(path: Path, layout: str | None, named: str) -> "Document":
    from overlapse.lint.screening import ScreenError, read_basis

    data = bytes_of(path)
    try:
        return read_basis(Path(named) if path == _STDIN else path, data, layout)
    except ScreenError as problem:
        raise Unreadable(str(problem)) from problem


def _geometries(
    paths: Sequence[Path], unit: "Unit | None", named: str
) -> "tuple[list[Geometry], list[FileAudit]]":
    """The geometries, and of several files those that cannot be read."""
    from overlapse.grammar.geometry import GeometryError
    from overlapse.lint.geometries import read_all

    texts = {_STDIN: (named, sys.stdin.buffer.read())} if _STDIN in paths else {}
    try:
        return read_all(paths, unit, texts)
    except GeometryError as problem:
        raise Unreadable(str(problem)) from problem


@contextmanager
def _progress(found: "Sequence[Task]") -> Iterator[Callable[[int], None]]:
    """A bar on the terminal where more than a moment's work is ahead."""
    total = sum(task.functions**3 for task in found)
    if total < _QUIET or len(found) < 2 or not sys.stderr.isatty():
        yield lambda count: None
        return
    with click.progressbar(length=total, label="screening", file=sys.stderr) as bar:
        yield lambda count: bar.update(count**3)


def _write_pruned(
    shelf: "Shelf", found: "Sequence[Task]", probes: "Sequence[Probe]", folder: Path
) -> None:
    """Write the files that lose functions; what a file loses beside them is said."""
    from overlapse.lint.pruned import PruneError
    from overlapse.lint.variants import pruned_files, told, write_files

    try:
        made = pruned_files(shelf, found, probes)
        paths = write_files(folder, made, [document.path for document in shelf.originals])
    except PruneError as problem:
        raise Refused(str(problem)) from problem
    except OSError as problem:
        raise click.UsageError(f"{folder}: {problem.strerror or problem}") from problem
    for line in told(made, paths, probes):
        click.echo(line, err=True)
