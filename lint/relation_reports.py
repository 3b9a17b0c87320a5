"""What a comparison found, for people and as plain data."""

import json
from collections.abc import Iterator, Sequence
from typing import Any, TextIO

from overlapse.lint.describe import ranges
from overlapse.lint.relating import LEVELS, Compared, FileRelation, SetRelation
from overlapse.lint.reports.lines import one_line
from overlapse.lint.terminal import width, wrapped
from overlapse.rules.compare.relation import Relation
from overlapse.rules.compare.sides import Difference, Spot

_SHOWN = 5  # elements of one verdict that are told one by one
_THING = {"row": "primitive", "function": "function"}


# ---- for people


def write_text(found: Sequence[FileRelation], out: TextIO, level: str) -> None:
    """Each pair of files with its elements by verdict; then one line that sums up."""
    several, columns = len(found) > 1, width(out)
    for pair in found:
        brief = several and pair.is_equal(level)
        for line in [_brief(pair, level)] if brief else [*_pair_lines(pair), ""]:
            out.write(_wrapped(line, columns) + "\n")
    if several:
        out.write("\n")
    out.write(_summary(found) + "\n")


def _brief(pair: FileRelation, level: str) -> str:
    """A pair of files that are equal, among others, in few words."""
    assert pair.left is not None and pair.right is not None
    weakest = max((relation.verdict for relation in pair.elements), key=LEVELS[level].index)
    names = f"{one_line(pair.left.path)} and {one_line(pair.right.path)}"
    return f"{names}: {weakest}, {ranges(pair.left.elements)}"


def _pair_lines(pair: FileRelation) -> Iterator[str]:
    left, right = pair.left, pair.right
    if left is None or right is None:
        document, where = (left, "first") if left is not None else (right, "second")
        assert document is not None
        yield f"{one_line(document.path)}  only in the {where}: {ranges(document.elements)}"
        return
    yield f"first:  {_told(left)}"
    yield f"second: {_told(right)}"
    for members in pair.sets:
        if len(pair.sets) > 1:
            names = [one_line(name) or "(none)" for name in (members.left, members.right)]
            yield f"  set {names[0]} and set {names[1]}"
        yield from _set_lines(members, left, right)


def _told(document: Compared) -> str:
    count = document.faults
    faults = f"; {count} fault{'s' * (count != 1)} of form may hide something" if count else ""
    return f"{one_line(document.path)}  (layout {document.layout or 'unknown'}{faults})"


def _set_lines(members: SetRelation, left: Compared, right: Compared) -> Iterator[str]:
    by_verdict: dict[str, list[Relation]] = {}
    for relation in members.elements:
        by_verdict.setdefault(relation.verdict, []).append(relation)
    for verdict, found in by_verdict.items():
        elements = ranges(sorted({relation.atomic_number for relation in found}))
        yield f"  {verdict}: {elements}"
        if verdict not in ("equal text", "equal numbers") and not verdict.startswith("only"):
            for relation in found[:_SHOWN]:
                yield from _element_lines(relation, left, right)
            if len(found) > _SHOWN:
                yield f"    and {len(found) - _SHOWN} elements more (all with --report json)"


def _element_lines(relation: Relation, left: Compared, right: Compared) -> Iterator[str]:
    count = len(relation.differences)
    told = list(relation.reasons)
    if relation.angle is not None and relation.verdict == "different":
        told.append(f"largest principal angle {relation.angle:.2g} rad")
    if count:
        told.append(f"{count} difference{'s' * (count != 1)}")
    yield f"    {relation.symbol}: {'; '.join(told)}"
    if relation.first is not None:
        yield f"      first: {_difference(relation.first, left, right)}"


def _difference(difference: Difference, left: Compared, right: Compared) -> str:
    one, other = difference.left, difference.right
    if one is None or other is None:
        spot, document = (one, left) if one is not None else (other, right)
        assert spot is not None
        thing = _THING.get(difference.what, difference.what)
        which = "first" if one is not None else "second"
        return f"a {thing} of {spot.shell} is only in the {which}: {_place(spot, document)}"
    apart = other.value - one.value
    share = 100 * apart / one.value if one.value else 0.0
    told = f" ({share:+{',.0f' if abs(share) >= 100 else '.2g'}} %)" if share else ""
    return (
        f"{difference.what} of {one.shell}: {_place(one, left)}; {_place(other, right)}; "
        f"difference {apart:+.6g}{told}"
    )


def _place(spot: Spot, document: Compared) -> str:
    return f"{spot.spelling} at {one_line(document.path)}:{spot.line}:{spot.column}"


def _wrapped(line: str, columns: int) -> str:
    indent = " " * (len(line) - len(line.lstrip()) + 2)
    return wrapped(line, columns, below=indent)


def _summary(found: Sequence[FileRelation]) -> str:
    counts: dict[str, int] = {}
    for pair in found:
        for relation in pair.elements:
            counts[relation.verdict] = counts.get(relation.verdict, 0) + 1
    paired = sum(pair.left is not None and pair.right is not None for pair in found)
    parts = [f"{paired} pair{'s' * (paired != 1)} of files"]
    parts += [f"{count} {verdict}" for verdict, count in counts.items()]
    if lonely := len(found) - paired:
        parts.append(f"{lonely} file{'s' * (lonely != 1)} without a partner")
    return "; ".join(parts)


# ---- plain data


def write_json(found: Sequence[FileRelation], out: TextIO, level: str) -> None:
    """One object: the pairs of files, and the elements of all, each with the number of its pair."""
    pairs = [pair for pair in found if pair.left is not None and pair.right is not None]
    plain = {
        "equal": level,
        "pairs": [_pair_object(pair, level) for pair in pairs],
        "elements": [
            _element_object(at, ordinal, members, relation, pair, level)
            for at, pair in enumerate(pairs, 1)
            for ordinal, members in enumerate(pair.sets, 1)
            for relation in members.elements
        ],
        "only_in_first": [pair.left.path for pair in found if pair.left and not pair.right],
        "only_in_second": [pair.right.path for pair in found if pair.right and not pair.left],
    }
    json.dump(plain, out, indent=1, allow_nan=False)
    out.write("\n")


def _pair_object(pair: FileRelation, level: str) -> dict[str, Any]:
    plain: dict[str, Any] = {
        which: {
            "path": document.path,
            "layout": document.layout or None,
            "faults": document.faults,
        }
        for which, document in (("first", pair.left), ("second", pair.right))
        if document is not None
    }
    return {**plain, "all_equal": pair.is_equal(level)}


def _element_object(
    at: int,
    ordinal: int,
    members: SetRelation,
    relation: Relation,
    pair: FileRelation,
    level: str,
) -> dict[str, Any]:
    first = relation.first
    return {
        "pair": at,
        "set": ordinal,
        "sets": [members.left or None, members.right or None],
        "element": relation.symbol,
        "atomic_number": relation.atomic_number,
        "lines": list(relation.lines),
        "verdict": relation.verdict,
        "equal": relation.verdict in LEVELS[level],
        "reasons": list(relation.reasons),
        "angle": relation.angle,
        "differences": len(relation.differences),
        "first_difference": None
        if first is None
        else {
            "what": first.what,
            "first": _spot_object(first.left, pair.left),
            "second": _spot_object(first.right, pair.right),
            "difference": first.apart,
            "rounded": first.rounded,
        },
    }


def _spot_object(spot: Spot | None, document: Compared | None) -> dict[str, Any] | None:
    if spot is None or document is None:
        return None
    return {"path": document.path, **spot._asdict()}
