"""Write how far above the Hartree-Fock limit the atoms of published sets lie.

    python tests/bench/levels.py

Reads the sets bundled with PySCF that are named below and rewrites `rules/families/levels.json`:
for each label the largest (E - E_limit) / |E_limit| of its elements in each period.
"""

import json
from pathlib import Path

import pyscf

from overlapse.grammar.designation import parse_label
from overlapse.grammar.elements import period_of
from overlapse.grammar.reading import read
from overlapse.rules.atomic.atoms import atom_of
from overlapse.rules.atomic.level import plain

FOLDER = Path(pyscf.__file__).parent / "gto" / "basis"
TARGET = Path(__file__).parents[2] / "rules" / "families" / "levels.json"
SETS = (
    "sto-3g sto-6g pople-basis/3-21G pople-basis/4-31G pople-basis/6-31G pople-basis/6-311G "
    "cc-pvdz cc-pvtz cc-pvqz cc-pv5z def2-svp def2-svpd def2-tzvp def2-tzvpp def2-tzvpd def2-qzvp "
    "def2-qzvpp pc-0 pc-1 pc-2 pc-3 pc-4 pcseg-0 pcseg-1 pcseg-2 pcseg-3 pcseg-4"
).split()


def main() -> None:
    levels: dict[str, list[float | None]] = {}
    for name in SETS:
        path = FOLDER / f"{name}.dat"
        designation = parse_label(path.stem)
        if designation is None:
            raise SystemExit(f"{path.name} is no label")
        largest: list[float | None] = [None] * 4
        for block in read(path).sets[0].blocks:
            atom = atom_of(block)
            if atom is None or atom.gap is None:
                continue
            period = period_of(block.atomic_number) - 1
            largest[period] = max(largest[period] or 0.0, float(f"{atom.gap:.2g}"))
        levels[plain(designation)] = largest
        print(name, plain(designation), largest)
    lines = [f"    {json.dumps(label)}: {json.dumps(found)}" for label, found in levels.items()]
    source = (
        "Computed by tests/bench/levels.py from published sets, in the files that the tests "
        "compare with: for each period the largest share by which an atom's energy lies above "
        "its Hartree-Fock limit."
    )
    TARGET.write_text(
        '{\n  "source": ' + json.dumps(source) + ',\n  "levels": {\n' + ",\n".join(lines)
        + "\n  }\n}\n"
    )  # fmt: skip


if __name__ == "__main__":
    main()
