"""Reports of a screening: text for people, and one object as plain data."""

import json
from collections import Counter
from collections.abc import Iterator, Sequence
from math import isfinite
from textwrap import wrap
from typing import Any, TextIO

from overlapse.lint.reports.json import as_object, finding_object
from overlapse.lint.reports.lines import one_line
from overlapse.lint.reports.text import write as write_findings
from overlapse.lint.screening import Screening
from overlapse.rules.finding import Finding
from overlapse.rules.measured.overlap_words import dropped, plain, shares, worth
from overlapse.rules.measured.probe import Function, Left, Probe, Share, Small

_WIDTH = 96
_BLAMED = 6  # eigenvalues that are told; the object has all
_FULL = 3  # so many frames are told in full; of more only the worst, and a table of all


# ---- for people


def write_text(screening: Screening, out: TextIO, colour: bool) -> None:
    """Frames with their numbers, then the findings."""
    probes = screening.probes
    if len(probes) > _FULL:
        out.write("\n".join(_table(probes)) + "\n\n")
        shown = [min(probes, key=lambda probe: probe.smallest)]
        out.write("The frame with the smallest eigenvalue:\n\n")
    else:
        shown = list(probes)
    for probe in shown:
        out.write("\n".join(_frame(probe)) + "\n\n")
    write_findings(screening.audits, out, colour)


def _frame(probe: Probe) -> Iterator[str]:
    found = probe.spectrum
    kind = {True: "spherical", False: "Cartesian", None: "spherical and Cartesian"}[probe.spherical]
    norms = "" if probe.spherical else " (components share their radial norm)"
    yield one_line(f"{probe.where}: {probe.formula}, {found.functions} {kind} functions{norms}")
    if probe.title.strip():
        yield from _item("title", one_line(probe.title.strip()))
    yield from _item(
        "overlap",
        f"smallest eigenvalue {probe.at_most}{found.smallest:.3g}, largest {found.largest:.3g}, "
        f"condition number {found.condition:.2g} ({found.method})",
    )
    yield from _item(
        "ladder", ", ".join(f"{count} below {plain(step)}" for step, count in found.below.items())
    )
    yield from _item(
        "removal",
        f"{probe.kept} of {found.functions} orbitals at the threshold {plain(probe.threshold)}"
        + (f"; {probe.near} within a factor 3 of it" if probe.near else ""),
    )
    if not probe.fitting:
        yield from _item("outlook", f"{probe.outlook.level}: {probe.outlook.reason}")
    if probe.counterpart is not None:
        yield from _item("spherical", _left(probe.counterpart))
    yield from _lattice(probe)
    told = [(f"{small.value:.1e}", shares(small, 4)) for small in probe.blame]
    for (value, words), count in list(Counter(told).items())[:_BLAMED]:
        yield from _item(value, words + (f" ({count} times)" if count > 1 else ""))
    if probe.drop:
        yield from _item(
            "to drop",
            f"{dropped(probe.drop, 20)}, by pivoted Cholesky decomposition at "
            f"{plain(probe.tolerance)}",
        )
    if probe.after is not None:
        yield from _item("then", _left(probe.after))
        if probe.after.loss is not None:
            yield from _item("cost", worth(probe.after.loss))


def _left(left: Left) -> str:
    return (
        f"{left.functions} functions, smallest eigenvalue {left.smallest:.3g}, condition number "
        f"{left.condition:.2g}"
    )


def _item(name: str, text: str) -> list[str]:
    head = f"  {name:<10}"
    return wrap(text, _WIDTH, initial_indent=head, subsequent_indent=" " * len(head) + "  ")


def _lattice(probe: Probe) -> Iterator[str]:
    if probe.lattice is None:
        return
    lattice = probe.lattice
    for point in lattice.points:
        k = ", ".join(f"{x:.3g}" for x in point.k)
        yield from _item("k point", f"({k}): smallest eigenvalue {point.smallest:.3g}")
    yield from _item(
        "sums",
        f"over images within {lattice.reach:.1f} bohr, error at most {lattice.bound:.1g}; with "
        f"those within {lattice.cut_at:.1f} bohr alone the smallest eigenvalue is "
        f"{lattice.cut:.3g}",
    )


def _table(probes: Sequence[Probe]) -> Iterator[str]:
    """All frames, one line each."""
    rows = [("geometry", "frame", "functions", "smallest", "condition", "orbitals", "outlook")]
    rows += [
        (
            one_line(probe.geometry),
            str(probe.frame),
            str(probe.spectrum.functions),
            f"{probe.smallest:.2e}",
            f"{probe.spectrum.condition:.1e}",
            str(probe.kept),
            probe.outlook.level if not probe.fitting else "",
        )
        for probe in probes
    ]
    widths = [max(map(len, column)) for column in zip(*rows, strict=True)]
    for index, row in enumerate(rows):
        cells = [row[0].ljust(widths[0])]
        cells += [cell.rjust(width) for cell, width in zip(row[1:6], widths[1:6], strict=True)]
        yield "  ".join([*cells, row[6]]).rstrip()
        if index == 0:
            yield "-" * (sum(widths) + 2 * 6)


# ---- plain data


def write_json(screening: Screening, out: TextIO) -> None:
    """One object: ``screens``, one for each frame, and ``files`` with the findings of the run.

    A number that is not finite (the condition number of a singular matrix) is null.
    """
    plain_screens = [
        _screen_object(probe, findings)
        for probe, findings in zip(screening.probes, screening.by_frame, strict=True)
    ]
    files = [as_object(audit) for audit in screening.audits]
    json.dump({"screens": plain_screens, "files": files}, out, indent=1, allow_nan=False)
    out.write("\n")


def _screen_object(probe: Probe, findings: Sequence[Finding]) -> dict[str, Any]:
    found = probe.spectrum
    return {
        "geometry": probe.geometry,
        "frame": probe.frame,
        "title": probe.title,
        "formula": probe.formula,
        "files": list(probe.files),
        "functions": found.functions,
        "spherical": probe.spherical,
        "smallest": _number(found.smallest),
        "largest": _number(found.largest),
        "condition": _number(found.condition),
        "method": found.method,
        "below": {plain(step): count for step, count in found.below.items()},
        "removal": {"threshold": probe.threshold, "orbitals": probe.kept, "near": probe.near},
        "outlook": None if probe.fitting else probe.outlook.level,
        "because": None if probe.fitting else probe.outlook.reason,
        "blame": [_small_object(small) for small in probe.blame],
        "drop": [
            {**_function_object(part.function), "atom": part.atom or None} for part in probe.drop
        ],
        "tolerance": probe.tolerance,
        "after": _after_object(probe.after),
        "counterpart": _left_object(probe.counterpart),
        "lattice": _lattice_object(probe),
        "findings": [finding_object(finding) for finding in findings],
    }


def _number(value: float) -> float | None:
    return value if isfinite(value) else None


def _function_object(function: Function) -> dict[str, Any]:
    return {
        "element": function.element,
        "shell": function.name,
        "part": function.letter or None,
        "exponent": function.exponent,
        "path": function.path,
        "line": function.line,
    }


def _share_object(share: Share) -> dict[str, Any]:
    where = {"atom": share.atom} if share.atom else {}
    return {"share": share.weight, **where, **_function_object(share.function)}


def _small_object(small: Small) -> dict[str, Any]:
    return {
        "eigenvalue": small.value,
        "shares": [_share_object(share) for share in small.shares],
        "kinds": [_share_object(share) for share in small.kinds],
    }


def _left_object(left: Left | None) -> dict[str, Any] | None:
    if left is None:
        return None
    return {
        "functions": left.functions,
        "smallest": _number(left.smallest),
        "condition": _number(left.condition),
    }


def _after_object(left: Left | None) -> dict[str, Any] | None:
    found = _left_object(left)
    if left is None or found is None:
        return None
    return {**found, "loss": None if left.loss is None else _number(left.loss)}


def _lattice_object(probe: Probe) -> dict[str, Any] | None:
    lattice = probe.lattice
    if lattice is None:
        return None
    return {
        "points": [{"k": list(p.k), "smallest": _number(p.smallest)} for p in lattice.points],
        "bound": lattice.bound,
        "reach": lattice.reach,
        "cut": {"at": lattice.cut_at, "smallest": _number(lattice.cut)},
        "loose": [_function_object(function) for function in lattice.loose],
    }
