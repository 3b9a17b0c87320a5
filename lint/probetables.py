"""Probes that settings ask for: basis files tried in geometries beside an audit.

A table names basis files and a geometry.  Its files are measured together, so that a molecule may
take its elements from several of them, and each file gets the findings about its own shells.
"""

from dataclasses import replace
from pathlib import Path
from typing import NamedTuple

from overlapse.grammar.geometry import GeometryError
from overlapse.lint.choices import ChoiceError
from overlapse.lint.engine import LEVELS, FileAudit, targets
from overlapse.lint.patterns import matches
from overlapse.lint.screening import ScreenError, screen_files
from overlapse.lint.settings import Probe as Setting
from overlapse.rules.measured.probing import Wanted


class Table(NamedTuple):
    """Basis files and the geometry (a file or a folder of XYZ files) to try them in.

    wanted: thresholds and mesh.  spherical: kind of the functions, None for what the files say.
    """

    basis: tuple[Path, ...]
    geometry: Path
    wanted: Wanted = Wanted()
    spherical: bool | None = None


def table_of(probe: Setting, folder: Path) -> Table:
    """The table that a setting stands for; its patterns are of paths below ``folder``."""
    basis = (
        target.path
        for target in targets([folder], lambda trouble: None)
        if any(
            matches(target.path.relative_to(folder).as_posix(), pattern) for pattern in probe.basis
        )
    )
    wanted = Wanted()
    if probe.removal_threshold is not None:
        wanted = wanted._replace(threshold=probe.removal_threshold)
    if probe.mesh is not None:
        wanted = wanted._replace(mesh=probe.mesh)
    spherical = None if probe.cartesian is None else not probe.cartesian
    return Table(tuple(basis), probe.geometry, wanted, spherical)


class Probing:
    """Adds to audits what the probes of their settings find; each probe is measured once."""

    def __init__(self) -> None:
        self._measured: dict[Table, dict[Path, FileAudit]] = {}
        self._tables: dict[tuple[Setting, Path], Table] = {}
        self._told: list[FileAudit] = []

    def joined(self, audit: FileAudit) -> FileAudit:
        """An audit with what the probes of its settings add to it."""
        origin = audit.settings.origin
        for probe in audit.settings.probes if origin is not None and not audit.passed_over else ():
            assert origin is not None
            key = (probe, origin.parent)
            if key not in self._tables:
                self._tables[key] = table_of(*key)
            audit = self.with_table(audit, self._tables[key])
        return audit

    def with_table(self, audit: FileAudit, table: Table) -> FileAudit:
        """An audit with what one table's measurements add to it, if it is of one of its files."""
        place = Path(audit.path).resolve()
        if place not in {path.resolve() for path in table.basis}:
            return audit
        if table not in self._measured:
            self._measured[table] = {}
            for found in _screened(table):
                if found.problem or found.path not in map(str, table.basis):
                    self._told.append(found)
                else:
                    self._measured[table][Path(found.path).resolve()] = found
        more = self._measured[table].get(place)
        return audit if more is None else _joined(audit, more)

    def of_geometries(self) -> list[FileAudit]:
        """Audits of the geometries: their faults, or why a table could not be measured.

        Faults in basis files are the business of their own audits.
        """
        return self._told


def _screened(table: Table) -> list[FileAudit]:
    try:
        return list(
            screen_files(
                table.basis, table.geometry, wanted=table.wanted, spherical=table.spherical
            ).audits
        )
    except OSError as problem:
        told = f"{problem.filename}: {problem.strerror}" if problem.strerror else str(problem)
        return [FileAudit(str(table.geometry), problem=told)]
    except (ScreenError, ChoiceError, GeometryError) as problem:
        return [FileAudit(str(table.geometry), problem=str(problem))]


def _joined(audit: FileAudit, more: FileAudit) -> FileAudit:
    findings = sorted(
        (*audit.findings, *(replace(finding, path=audit.path) for finding in more.findings)),
        key=lambda f: (f.line, f.column, -LEVELS.index(f.severity), f.rule),
    )
    return replace(
        audit,
        findings=tuple(findings),
        accepted=(*audit.accepted, *more.accepted),
        excerpts={**audit.excerpts, **more.excerpts},
        probes=(*audit.probes, *more.probes),
        silent=audit.silent & more.silent,
    )
