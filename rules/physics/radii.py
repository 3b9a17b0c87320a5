"""Covalent radii: how close bonded atoms come.

Source: B. Cordero, V. Gomez, A. E. Platero-Prats, M. Reves, J. Echeverria, E. Cremades, F.
Barragan, S. Alvarez, Dalton Trans. 2008, 2832, table 2, in picometres; from memory.  Carbon with
sp3, manganese, iron and cobalt with low spin.
"""

from overlapse.grammar.geometry import BOHR

_PICOMETRES = (
    31, 28, 128, 96, 84, 76, 71, 66, 57, 58, 166, 141, 121, 111, 107, 105, 102, 106, 203, 176, 170,
    160, 153, 139, 139, 132, 126, 124, 132, 122, 122, 120, 119, 120, 120, 116, 220, 195, 190, 175,
    164, 154, 147, 146, 142, 139, 145, 144, 142, 139, 139, 138, 139, 140, 244, 215, 207, 204, 203,
    201, 199, 198, 198, 196, 194, 192, 192, 189, 190, 187, 187, 175, 170, 162, 151, 144, 141, 136,
    136, 132, 145, 146, 148, 140, 150, 150, 260, 221, 215, 206, 200, 196, 190, 187, 180, 169,
)  # fmt: skip


def covalent_radius(z: int) -> float | None:
    """Covalent radius in bohr, None beyond curium, where none is published."""
    return _PICOMETRES[z - 1] / 100.0 / BOHR if 1 <= z <= len(_PICOMETRES) else None
