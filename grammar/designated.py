"""What a label says, taken apart and printed back in its usual form."""

from dataclasses import dataclass, replace
from typing import Any, Literal

LETTERS = "spdfghi"
CARDINALS = "DTQ"


@dataclass(frozen=True)
class Designation:
    """A label taken apart.

    family: "STO-nG", "N-MPG", "cc-pVXZ", "def2", "pc-n" and so on.

    Of the digit families: core: primitives of each core function (n of STO-nG).  valence:
    primitives of each valence function, tight to loose; () for STO-nG.  diffuse: 0, 1 ("+", heavy
    atoms) or 2 ("++", hydrogen as well).  heavy, light: number of polarization functions by
    angular momentum, for Li and beyond and for H and He.  stars: 1 or 2 where they were written
    as stars, because a star means different things in different rows.

    Of the others: name: the set's usual name without prefixes and endings ("def2-TZVPP", "pc-2",
    "LANL2DZ"), "" for cc-pVXZ.  zeta: cardinal number, 2 for double zeta; 0 where the name has
    none.  augmentation: "aug", "d-aug", "t-aug", "jul" to "feb", "maug", "ma".  core_valence: "C"
    or "wC".  tight: the d of (X+d).  relativity: "DK", "DK3", "NR", "".  potential: "PP" or the
    potential's own name.  variant: an ending that makes another set ("F12", "J", "seg-opt").
    fitting: kind of an auxiliary set ("JKFIT", "RI" ...), "" for an orbital set.  readings: the
    sets that an ambiguous name may mean.
    """

    family: str
    core: int = 0
    valence: tuple[int, ...] = ()
    diffuse: int = 0
    heavy: tuple[tuple[int, int], ...] = ()
    light: tuple[tuple[int, int], ...] = ()
    stars: int = 0
    name: str = ""
    zeta: int = 0
    augmentation: str = ""
    core_valence: str = ""
    tight: bool = False
    relativity: str = ""
    potential: str = ""
    variant: str = ""
    fitting: str = ""
    readings: tuple["Designation", ...] = ()

    def __str__(self) -> str:
        """The label in its usual form."""
        if self.family == "STO-nG":
            return f"STO-{self.core}G{'*' * self.stars}"
        if self.family == "N-MPG":
            digits = "".join(map(str, self.valence))
            return f"{self.core}-{digits}{'+' * self.diffuse}G{self._polarization()}"
        if self.family == "cc-pVXZ":
            return self._consistent()
        prefix = f"{self.augmentation}-" if self.augmentation else ""
        return f"{prefix}{self.name}" + (f"-{self.fitting}" if self._fits_apart else "")

    @property
    def _fits_apart(self) -> bool:
        return bool(self.fitting) and self.fitting.lower() not in self.name.lower()

    def _consistent(self) -> str:
        cardinal = CARDINALS[self.zeta - 2] if self.zeta < 5 else str(self.zeta)
        level = f"({cardinal}+d)" if self.tight else cardinal
        own = f"{self.potential}_" if self.potential not in ("", "PP") else ""
        prefix = f"{own}{self.augmentation}-" if self.augmentation else own
        endings = [self.variant, self.relativity, self.potential if not own else "", self.fitting]
        stem = f"{prefix}cc-p{self.core_valence}V{level}Z"
        return "-".join([stem, *filter(None, endings)]).replace("Z-(", "Z(")

    def _polarization(self) -> str:
        if self.stars:
            return "*" * self.stars
        if not self.heavy and not self.light:
            return ""
        return "(" + ",".join(filter(None, (_terms(self.heavy), _terms(self.light)))) + ")"

    @property
    def role(self) -> Literal["orbital", "fitting"]:
        """Whether the set describes the orbitals, or densities and products of orbitals."""
        return "fitting" if self.fitting else "orbital"

    def but(self, **changes: Any) -> "Designation":
        """The same label with some parts changed."""
        return replace(self, **changes)

    @property
    def parent(self) -> "Designation":
        """The undecorated set."""
        if self.family in ("STO-nG", "N-MPG"):
            return Designation(self.family, self.core, self.valence)
        return Designation(
            self.family,
            name=self.name,
            zeta=self.zeta,
            relativity=self.relativity,
            potential=self.potential,
            variant=self.variant,
            fitting=self.fitting,
        )


def _terms(terms: tuple[tuple[int, int], ...]) -> str:
    return "".join(f"{count if count > 1 else ''}{LETTERS[l]}" for l, count in terms)
