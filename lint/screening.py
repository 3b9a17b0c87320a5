"""Screening: basis files in real geometries, from paths to measurements and findings.

Nothing here prints.
"""

import os
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np

from overlapse.grammar import geometry as geometries
from overlapse.grammar.geometry import Frame, Geometry, Unit
from overlapse.grammar.model import Document, Fault
from overlapse.grammar.reading import read_bytes
from overlapse.lint import memory, tree
from overlapse.lint.choices import Shelf, Use, shelf
from overlapse.lint.engine import FileAudit, at_least, judge
from overlapse.lint.geometries import read_all
from overlapse.lint.settings import Settings, settings_for
from overlapse.rules.finding import Finding
from overlapse.rules.measured.closeness import doubt
from overlapse.rules.measured.probe import Probe
from overlapse.rules.measured.probing import Label, Wanted, probe
from overlapse.rules.measured.site import Site, size
from overlapse.rules.physics.integrals import TooLarge as TooLargeInAnyForm
from overlapse.rules.registry import rules


class ScreenError(ValueError):
    """Files that cannot be screened as they are; the message says where and why."""


class TooLarge(ScreenError):
    """A frame that needs more memory than is allowed."""


class Task(NamedTuple):
    """One frame to measure."""

    geometry: str
    frame: Frame
    functions: int


@dataclass(frozen=True)
class Screening:
    """What a run found.

    probes: in the order of the frames.  by_frame: what the rules say of each alone.  audits: what
    they say of all together, file by file.
    """

    probes: tuple[Probe, ...]
    by_frame: tuple[tuple[Finding, ...], ...]
    audits: tuple[FileAudit, ...]

    def at_least(self, level: str) -> "Screening":
        """The same with only the findings of this level and above."""
        return replace(
            self,
            by_frame=tuple(at_least(findings, level) for findings in self.by_frame),
            audits=tuple(audit.at_least(level) for audit in self.audits),
        )


# ---- reading


def read_basis(path: Path, data: bytes, layout: str | None = None) -> Document:
    """Read a basis file.  Raises ScreenError for one in which no layout is recognised."""
    document = read_bytes(data, os.fspath(path), layout=layout)
    if not document.blocks:
        told = [fault.message for fault in document.faults if fault.severity == "error"]
        raise ScreenError(f"{path}: {(told or ['no element was found'])[0]}")
    return document


# ---- from frames to tasks


def tasks(shelf: Shelf, read: Sequence[Geometry]) -> tuple[list[Task], list[FileAudit]]:
    """Frames that can be measured, and what is wrong with the geometries.

    Raises ScreenError where a block that is needed has a fault of form or an impossible function.
    """
    found: list[Task] = []
    audits = []
    seen: set[int] = set()
    for geometry in read:
        faults = list(geometry.faults)
        for frame in geometry.frames:
            sites, lacking = shelf.sites(frame)
            faults += _lacks(shelf, geometry, lacking, faults)
            if not any(fault.message.startswith("suspect") for fault in faults):
                faults += _doubts(geometry, frame)
            for site in sites:
                if id(site.block) not in seen:
                    seen.add(id(site.block))
                    _check(shelf, site)
            if frame.complete and not lacking:
                found.append(Task(geometry.path, frame, size(sites)))
        if faults:
            document = Document(geometry.source, geometry.layout, faults=tuple(faults))
            names = {fault.rule for fault in faults}
            settings = settings_for(Path(geometry.path).absolute())
            audits.append(judge(document, settings=settings, only=names))
    return found, audits


def _lacks(
    shelf: Shelf, geometry: Geometry, lacking: Sequence[geometries.Atom], faults: Sequence[Fault]
) -> Iterator[Fault]:
    """One fault for each element without functions, told once for all frames."""
    told = {fault.element for fault in faults if fault.rule == "overlap.molecule"}
    for atom in lacking:
        if atom.symbol in told:
            continue
        told.add(atom.symbol)
        yield Fault(
            "overlap.molecule",
            shelf.because(atom),
            _span_of(geometry, atom),
            element=atom.symbol,
            remedy=f"name a file that has {atom.symbol}: another one, or --use {atom.symbol}=FILE",
        )


def _doubts(geometry: Geometry, frame: Frame) -> Iterator[Fault]:
    """Distances that no atoms have; in a scan told once."""
    found = doubt(frame.atoms, frame.cell, frame.periodic)
    if found is None:
        return
    at, message = found
    suspect = message.startswith("suspect")
    far = "bonding distance" in message
    yield Fault(
        "overlap.molecule",
        f"{message} ({geometry.unit}, says {geometry.unit_from})" if suspect else message,
        _span_of(geometry, frame.atoms[at]),
        "note" if far else "warning" if suspect else "error",
        element=frame.atoms[at].symbol,
        remedy="--unit bohr or --unit angstrom, or units=... in the comment line"
        if suspect
        else "take one of the two out, or make it a ghost",
    )


def _span_of(geometry: Geometry, atom: geometries.Atom) -> tuple[int, int]:
    """Where the name of an atom stands in the text."""
    source = geometry.source
    if not source.text:
        return 0, 0
    start = source.starts[atom.line - 1] + atom.column - 1
    return start, start + len(source.text[start : start + 40].split(maxsplit=1)[0])


def _check(shelf: Shelf, site: Site) -> None:
    document = next(d for d in shelf.documents if d.path == site.path)
    for fault in document.faults:
        if fault.severity == "error" and fault.element == site.block.symbol:
            place = document.source.place(fault.span[0])
            raise ScreenError(
                f"{site.path}:{place.line}:{place.column}: {fault.message}; mend the file first"
            )
    for name, shell in zip(site.block.names, site.block.shells, strict=True):
        if not np.isfinite(shell.normalised()).all() or shell.exponents.min() <= 0.0:
            raise ScreenError(
                f"{site.path}:{shell.line}:1: {site.block.symbol} {name} holds a function that "
                "cannot be normalised; mend the file first"
            )


# ---- measuring


def measure(task: Task, shelf: Shelf, wanted: Wanted, limit: int | None = None) -> Probe:
    """Measure one frame within ``limit`` bytes, in sparse form where the dense matrix is too large.

    Raises TooLarge where it does not fit in any form.
    """
    frame = task.frame
    sites, _ = shelf.sites(frame)
    label = Label(task.geometry, frame.index, frame.title)
    wide = 2 if frame.cell is not None else 1
    fits = limit is None or memory.needed(task.functions, wide=wide) <= limit
    if frame.cell is not None:
        # Crystals are the rarer case, and their sums need more libraries.
        from overlapse.rules.measured.probing_lattice import probe_lattice

        if not fits:
            raise _too_large(task, wide, limit or 0)
        try:
            return probe_lattice(sites, frame.cell, frame.periodic, wanted, label)
        except TooLargeInAnyForm as problem:
            where = f"{task.geometry}, frame {frame.index}"
            raise TooLarge(f"{where}: {problem}; is the cell right?") from problem
    if fits:
        return probe(sites, wanted, label)
    from overlapse.rules.measured.probing_large import probe_large

    try:
        return probe_large(sites, wanted, label, limit or 0)
    except TooLargeInAnyForm as problem:
        raise _too_large(task, wide, limit or 0) from problem


def _too_large(task: Task, wide: int, limit: int) -> TooLarge:
    need = memory.needed(task.functions, wide=wide)
    return TooLarge(
        f"{task.geometry}, frame {task.frame.index}: {task.functions:,} functions need about "
        f"{memory.told(need)} of memory, {memory.told(limit)} are allowed; --memory allows more"
    )


# ---- judging


def geometric_rules() -> frozenset[str]:
    """Rules that judge measurements."""
    return frozenset(name for name, rule in rules().items() if rule.needs == "geometry")


def judged(
    shelf: Shelf, probes: Sequence[Probe], settings: Settings | None = None
) -> list[FileAudit]:
    """What the rules say of the measurements, for each basis file that was used."""
    used = {path for each in probes for path in each.files}
    only = geometric_rules()
    return [
        judge(
            document,
            settings=settings or settings_for(Path(document.path).absolute()),
            probes=probes,
            only=only,
        )
        for document in shelf.documents
        if document.path in used
    ]


def screened(shelf: Shelf, probes: Sequence[Probe], audits: Sequence[FileAudit] = ()) -> Screening:
    """Measurements with what the rules say of them; ``audits`` are those of the geometries."""
    by_frame = [
        tuple(finding for audit in judged(shelf, [each]) for finding in audit.findings)
        for each in probes
    ]
    return Screening(tuple(probes), tuple(by_frame), (*judged(shelf, probes), *audits))


def screen_files(
    basis: Sequence[Path],
    geometry: Path,
    *,
    uses: Sequence[Use] = (),
    wanted: Wanted = Wanted(),  # noqa: B008  it is a constant
    label: str = "",
    spherical: bool | None = None,
    unit: Unit | None = None,
) -> Screening:
    """Screen basis files in one geometry, a file or a folder of XYZ files.

    uses: files for elements or atoms; label: of the set to take where a file has several;
    spherical: kind of the functions, None to follow the files.  Of several geometries those that
    cannot be read are among the audits.  Raises OSError for basis files that cannot be opened,
    ScreenError, `overlapse.lint.choices.ChoiceError` or `overlapse.grammar.geometry.GeometryError`
    for what cannot be screened.
    """
    documents = [read_basis(path, tree.content(path)) for path in basis]
    chosen = [(use, read_basis(use.path, tree.content(use.path))) for use in uses]
    made = shelf(documents, chosen, wanted=label, spherical=spherical)
    read, unread = read_all([geometry], unit, {})
    found, audits = tasks(made, read)
    limit = memory.allowed()
    probes = [measure(task, made, wanted, limit) for task in found]
    return screened(made, probes, [*audits, *unread])


def screen(*basis: str | os.PathLike[str], on: str | os.PathLike[str], **options: Any) -> Screening:
    """Measure basis files in the geometries of a file or folder, and judge what was measured.

    ``options`` are those of `screen_files`, and so are the errors raised.
    """
    return screen_files([Path(path) for path in basis], Path(on), **options)
