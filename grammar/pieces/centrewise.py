"""What the centres of the open schema amount to: their elements, their kinds and sizes."""

import re
from collections.abc import Iterator
from operator import mul

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, FunctionType
from overlapse.grammar.elements import number_of
from overlapse.grammar.pieces.leaves import SHELL_KINDS, Shape

_NAME = re.compile(r"([A-Za-z]{1,3})\d*")


def symbol_in(name: str) -> str | None:
    """The element's symbol in a centre's name: C, C1, bs_c, C-1, or None."""
    for part in _parts_of(name):
        if (match := _NAME.fullmatch(part)) and number_of(match[1]):
            return match[1]
    return None


def _parts_of(name: str) -> Iterator[str]:
    yield name
    parts = re.split(r"[^A-Za-z0-9]+", name)
    yield parts[-1]
    yield parts[0]


def settle_functions(build: Build, block: BlockDraft, shapes: list[Shape]) -> None:
    """Spherical or Cartesian; s and p functions, which are both, decide if alone."""
    above = {kind for angular, kind, _, _ in shapes if max(angular) > 1}
    kinds = {SHELL_KINDS[kind] for kind in above or {kind for _, kind, _, _ in shapes}}
    if len(kinds) > 1 and above:
        build.fault_line(
            "form.syntax",
            block.line,
            "some shells of this centre are spherical, others Cartesian",
            severity="note",
            element=block.symbol,
            remedy="nothing, if this is meant: few programs can use such a set",
        )
    block.functions = kinds.pop() if len(kinds) == 1 else None


def sizes_of(atoms: list[list[Shape]]) -> tuple[int, int] | None:
    """How many functions the shells of some atoms have, None where a kind leaves it open.

    Some programs count a general contraction as one function: that is the second number.
    """
    shells = [shape for atom in atoms for shape in atom]
    if not all(SHELL_KINDS[kind] for _, kind, _, _ in shells):
        return None
    sizes = [_components(angular, SHELL_KINDS[kind]) for angular, kind, _, _ in shells]
    contractions = [columns // len(angular) for angular, _, _, columns in shells]
    return sum(map(mul, sizes, contractions)), sum(sizes)


def _components(angular: tuple[int, ...], functions: FunctionType | None) -> int:
    """Number of components, of one contraction for each l."""
    if functions == "spherical":
        return sum(2 * l + 1 for l in angular)
    return sum((l + 1) * (l + 2) // 2 for l in angular)
