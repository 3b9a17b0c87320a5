"""How near the Hartree-Fock limit the atoms of a set should come by its label."""

from overlapse.grammar.designated import Designation
from overlapse.grammar.elements import period_of
from overlapse.rules.families.counted import table


def plain(label: Designation) -> str:
    """The label without what an atom's energy does not need: diffuse and polarization functions."""
    return str(
        label.but(
            augmentation="", core_valence="", tight=False, diffuse=0, heavy=(), light=(), stars=0
        )
    )


def usual_gap(label: Designation, z: int) -> float | None:
    """The largest share by which atoms of such sets lie above the limit in the element's period."""
    periods: list[float | None] | None = table("levels")["levels"].get(plain(label))
    period = period_of(z)
    return periods[period - 1] if periods is not None and period <= len(periods) else None
