"""Which sets contain which: what a decoration adds to a set leaves the set itself unchanged.

Sources: W. J. Hehre, R. Ditchfield, J. A. Pople, J. Chem. Phys. 56, 2257 (1972); P. C. Hariharan,
J. A. Pople, Theor. Chim. Acta 28, 213 (1973); T. Clark et al., J. Comput. Chem. 4, 294 (1983) for
stars and plus signs; R. A. Kendall, T. H. Dunning, R. J. Harrison, J. Chem. Phys. 96, 6796 (1992)
for aug-; E. Papajak, D. G. Truhlar, J. Chem. Theory Comput. 7, 10 (2011) for the sets between;
D. E. Woon, T. H. Dunning, J. Chem. Phys. 103, 4572 (1995) for core-valence sets; F. Jensen,
J. Chem. Phys. 117, 9234 (2002) for aug-pc-n; D. Rappoport, F. Furche, J. Chem. Phys. 133, 134105
(2010) for def2-XD.  The elements of `_REMADE` were found by comparing published files.
"""

from overlapse.grammar.designation import Designation

# Each holds the ones before it.  maug stands aside: its place depends on the cardinal number.
_CHAIN = ("", "feb", "mar", "apr", "may", "jun", "jul", "aug", "d-aug", "t-aug", "q-aug")
_WITHIN_KARLSRUHE = {"def2-SVP": "def2-SV(P)"}
# Elements whose functions were optimised anew in the larger set.
_METALS = ((21, 30), (39, 48), (72, 80))  # f and g functions of core-valence sets
_REMADE = {
    "def2-SVPD": {75, 76},
    "def2-TZVPD": {55},
    "def2-TZVPPD": {55},
    "def2-QZVPD": {53},
    "def2-QZVPPD": {53},
}


def may_contain(label: Designation, parent: Designation) -> bool:
    """Whether a set must contain another, element by element, by what the two are called."""
    if label.family != parent.family or label == parent or label.fitting or parent.fitting:
        return False
    if label.family == "STO-nG":
        return label.core == parent.core and parent.stars < label.stars
    if label.family == "N-MPG":
        return _split(label, parent)
    if label.but(augmentation="", core_valence="", name="") != parent.but(
        augmentation="", core_valence="", name=""
    ):
        return False
    return (
        _named(label.name, parent.name, label.augmentation == parent.augmentation)
        and _augmented(label.augmentation, parent.augmentation)
        and _with_core(label, parent)
    )


def contains(label: Designation, parent: Designation, atomic_number: int) -> bool:
    """Whether one set must contain all functions that another has for an element.

    Some elements were optimised anew in the larger set.
    """
    if not may_contain(label, parent):
        return False
    if label.core_valence != parent.core_valence and any(
        first <= atomic_number <= last for first, last in _METALS
    ):
        return False
    return label.name == parent.name or atomic_number not in _REMADE.get(label.name, ())


def _split(label: Designation, parent: Designation) -> bool:
    """Plus signs add to a set, and so do stars; (2d) replaces what (d) added."""
    return (
        (label.core, label.valence) == (parent.core, parent.valence)
        and parent.diffuse <= label.diffuse
        and parent.heavy in ((), label.heavy)
        and parent.light in ((), label.light)
    )


def _named(label: str, parent: str, alike: bool) -> bool:
    return label == parent or (
        alike and (label == f"{parent}D" or _WITHIN_KARLSRUHE.get(label) == parent)
    )


def _augmented(label: str, parent: str) -> bool:
    if label == parent or not parent:
        return True
    if "maug" in (label, parent) or label not in _CHAIN or parent not in _CHAIN:
        return parent == "maug" and label in _CHAIN and _CHAIN.index(label) >= _CHAIN.index("jul")
    return _CHAIN.index(parent) < _CHAIN.index(label)


def _with_core(label: Designation, parent: Designation) -> bool:
    """Core functions come on top up to quadruple zeta; beyond, contractions were made anew."""
    if label.core_valence == parent.core_valence:
        return True
    return not parent.core_valence and label.zeta <= 4
