"""How many electrons a core potential may replace; what families and terms say about it."""

import re
from functools import cache
from typing import Any, NamedTuple

import numpy as np

from overlapse.grammar.elements import replaced_by, row_of
from overlapse.grammar.model import BasisSet, Block, Channel, Potential
from overlapse.rules.families.counted import table, within


class FamilyCore(NamedTuple):
    """What a family says about an element: the label, and electrons replaced (0: no potential)."""

    label: str
    electrons: int


@cache
def family_core(label: str, z: int) -> FamilyCore | None:
    """The core that belongs to a label in its usual form, or None where nothing is on record."""
    for family in table("cores")["families"]:
        if re.fullmatch(family["labels"], label, re.IGNORECASE):
            if family["none"] and within(family["none"], z):
                return FamilyCore(label, 0)
            for electrons, ranges in family["cores"].items():
                if within(ranges, z):
                    return FamilyCore(label, int(electrons))
    return None


@cache
def is_usual(electrons: int, z: int) -> bool:
    """Whether a potential for so many electrons is in use for the element."""
    data: Any = table("cores")
    ranges = data["usual"].get(str(electrons))
    return electrons == 0 or (ranges is not None and within(ranges, z)) or opens_f(electrons, z)


@cache
def opens_f(electrons: int, z: int) -> bool:
    """Whether the core is one that holds the open f shell of a lanthanide or actinide."""
    data = table("cores")["open_f_shell"]
    return z - electrons in data["outside"] and within(data["elements"], z)


@cache
def is_closed(electrons: int, modelled: bool = True) -> bool:
    """Whether so many electrons fill closed shells; model potentials allow a few more counts."""
    if replaced_by(electrons) is not None:
        return True
    return not modelled and electrons in table("cores")["closed_shells"]["electrons"]


@cache
def possible_cores(z: int) -> tuple[int, ...]:
    """Usual core sizes of an element, small to large."""
    usual = table("cores")["usual"]
    return tuple(int(n) for n, ranges in usual.items() if within(ranges, z))


def scalar_channels(potential: Potential) -> list[Channel]:
    """The channels without spin-orbit terms."""
    return [channel for channel in potential.channels if channel.kind == "scalar"]


def local_charge(potential: Potential) -> float | None:
    """Coefficients of the 1/r terms in the local part, summed; None where it has none."""
    local = [channel for channel in scalar_channels(potential) if channel.local]
    if len(local) != 1 or 1 not in local[0].powers:
        return None
    powers = np.array(local[0].powers)
    return float(local[0].coefficients[powers == 1].sum())


class Carrier(NamedTuple):
    """A block and its potential."""

    block: Block
    potential: Potential


def carriers_of(members: BasisSet) -> list[Carrier]:
    """Blocks with a potential, by atomic number."""
    found = [Carrier(block, block.potential) for block in members.blocks if block.potential]
    return sorted(found, key=lambda carrier: carrier.block.atomic_number)


def neighbours(carrier: Carrier, carriers: list[Carrier]) -> list[Carrier]:
    """The carriers on both sides, if they lie in the same stretch of the periodic table."""
    z = carrier.block.atomic_number
    low, high = row_of(z)
    near = [
        c
        for c in carriers
        if abs(c.block.atomic_number - z) == 1 and low <= c.block.atomic_number <= high
    ]
    return near if len(near) == 2 else []
