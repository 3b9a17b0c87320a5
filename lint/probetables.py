"""Probes that settings ask for: basis files tried in geometries beside an audit.

A table names basis files and a geometry.  Its files are measured together, so that a molecule may
take its elements from several of them, and each file gets the findings about its own shells.
"""

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import NamedTuple

from overlapse.grammar.geometry import GeometryError
from overlapse.lint.choices import ChoiceError
from overlapse.lint.engine import LEVELS, FileAudit
from overlapse.lint.screening import ScreenError, screen_files
from overlapse.rules.probing import Wanted


class Table(NamedTuple):
    """Basis files and the geometry (a file or a folder of XYZ files) to try them in.

    wanted: thresholds and mesh.  spherical: kind of the functions, None for what the files say.
    """

    basis: tuple[Path, ...]
    geometry: Path
    wanted: Wanted = Wanted()
    spherical: bool | None = None


def with_probes(audits: Sequence[FileAudit], tables: Sequence[Table]) -> list[FileAudit]:
    """Audits with what the tables' measurements add to them, then those of geometries with faults.

    Only tables that name an audited file are measured.  A table that cannot be measured becomes
    an audit of its geometry with the problem; faults in basis files are the audit's own business.
    """
    result = list(audits)
    places = {Path(audit.path).resolve(): k for k, audit in enumerate(audits)}
    for table in tables:
        if not any(path.resolve() in places for path in table.basis):
            continue
        for audit in _screened(table):
            at = places.get(Path(audit.path).resolve())
            if at is not None:
                result[at] = _joined(result[at], audit)
            elif audit.problem or audit.path not in map(str, table.basis):
                result.append(audit)
    return result


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
        (*audit.findings, *more.findings),
        key=lambda f: (f.line, f.column, -LEVELS.index(f.severity), f.rule),
    )
    return replace(audit, findings=tuple(findings), probes=(*audit.probes, *more.probes))
