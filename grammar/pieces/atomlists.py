"""The `[Atoms]` section of a file of bracket sections: which atom is which element."""

import re
from collections.abc import Set

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import integer
from overlapse.grammar.elements import number_of, symbol_of

_NAME = re.compile(r"([A-Za-z]+)\d*")


class AtomList:
    """The atoms of one file; ``elements`` holds symbol and 0-based line by the atom's number.

    The symbol is "" for an atom that is of no element.
    """

    def __init__(self, build: Build) -> None:
        self.build = build
        self.elements: dict[int, tuple[str, int]] = {}

    def symbol_of(self, atom: int) -> str:
        return self.elements.get(atom, ("", 0))[0]

    def add(self, line: str, index: int) -> None:
        """The atom of a line (0-based)."""
        words = line.split()
        atom = integer(words[1]) if len(words) > 2 else None
        charge = integer(words[2]) if len(words) > 2 else None
        if atom is None or charge is None:
            self.build.fault_line(
                "form.syntax",
                index,
                "an atom is given by its name, its number and its atomic number, "
                "before its position",
                expected="C   1   6   0.0   0.0   0.0",
                remedy="write the line in this order",
            )
        elif atom in self.elements:
            self.build.fault_word(
                "form.repeat",
                index,
                1,
                f"an atom {atom} was already given on line {self.elements[atom][1] + 1}",
                measured=atom,
                remedy="number the atoms 1, 2, 3 ...",
            )
        else:
            self.elements[atom] = (self._symbol(words[0], charge, index), index)

    def _symbol(self, name: str, charge: int, index: int) -> str:
        """The element of an atom: by its atomic number, unless that and a plain name disagree.

        "" for an atom that is none: no fault as long as it has no functions.
        """
        match = _NAME.fullmatch(name)
        named = number_of(match[1]) if match else None
        by_number = symbol_of(charge) if 1 <= charge <= 118 else None
        # Names such as CA and HB are labels of a C and an H atom; ghosts have the charge 0.
        labelled = by_number is not None and name[: len(by_number)].lower() == by_number.lower()
        if named is None or labelled or named == charge:
            return by_number or ""
        if charge:
            self.build.fault_word(
                "form.element",
                index,
                2,
                f"{name} has the atomic number {named}, not {charge}: read as {symbol_of(named)}",
                severity="warning",
                element=symbol_of(named),
                measured=charge,
                expected=named,
                remedy="mend the name or the number",
            )
        return symbol_of(named)

    def check(self, described: Set[int], heading: int) -> None:
        """Hold the list against the atoms of the section whose heading is a line (0-based)."""
        known = {atom for atom, (symbol, _) in self.elements.items() if symbol}
        missing = sorted(known - described)
        if not missing:
            return
        listed = ", ".join(f"{atom} ({self.elements[atom][0]})" for atom in missing[:5])
        more = f" and {len(missing) - 5} more" if len(missing) > 5 else ""
        self.build.fault_line(
            "form.count",
            heading,
            f"`[Atoms]` lists {len(known)} atoms; no functions are given here for {listed}{more}",
            severity="warning",
            measured=len(known) - len(missing),
            expected=len(known),
            remedy="an atom's basis was lost, unless it is meant to have none",
        )
