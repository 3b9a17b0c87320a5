"""An atom of a geometry with the block that was chosen for it."""

from collections import Counter
from collections.abc import Sequence
from typing import NamedTuple

from overlapse.grammar.geometry import Atom
from overlapse.grammar.model import Block
from overlapse.rules.physics.placed import Placed


class Site(NamedTuple):
    """An atom of a geometry and the block that was chosen for it, from the file at ``path``.

    fitting: the block is of a set for fitting, so that no field is solved in its functions.
    """

    atom: Atom
    path: str
    block: Block
    spherical: bool = True
    fitting: bool = False

    @property
    def placed(self) -> Placed:
        return Placed(self.block, self.atom.position, self.spherical)


def size(sites: Sequence[Site]) -> int:
    """Number of basis functions, without making any."""
    return sum(
        (2 * l + 1 if site.spherical else (l + 1) * (l + 2) // 2) * count
        for site in sites
        for l, count in site.block.counts.items()
    )


def kind_of(sites: Sequence[Site]) -> bool | None:
    """Whether the functions are spherical; None where both kinds occur."""
    kinds = {site.spherical for site in sites if max(site.block.counts, default=0) > 1}
    return None if len(kinds) > 1 else kinds.pop() if kinds else True


def formula(sites: Sequence[Site]) -> str:
    """Hill's order: carbon, hydrogen, the others by letter; ghosts apart."""
    parts = []
    for ghost in (False, True):
        symbols = Counter(site.atom.symbol for site in sites if site.atom.ghost == ghost)
        first = ("C", "H") if "C" in symbols else ()
        order = sorted(symbols, key=lambda symbol: (*(symbol != f for f in first), symbol))
        text = "".join(f"{s}{symbols[s] if symbols[s] > 1 else ''}" for s in order)
        if text:
            parts.append(f"ghosts {text}" if ghost else text)
    return " and ".join(parts)
