"""Make the table of Slater expansions that rules/physics/slater.py reads.

python tests/bench/expansions.py

Takes some minutes.  1s to 4f each for itself, and the shells whose functions share their exponents
in minimal sets.
"""

import json
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path
from typing import Any

from overlapse.rules.physics.slater import Orbital, fit

TARGET = Path(__file__).parents[2] / "rules" / "physics" / "expansions.json"
SHELLS = "1s 2sp 3sp 3spd 4sp 4spd 5sp 2s 2p 3s 3p 3d 4s 4p 4d 4f".split()


def orbitals(shell: str) -> tuple[Orbital, ...]:
    return tuple((int(shell[0]), "spdf".index(letter)) for letter in shell[1:])


def entry(task: tuple[str, int]) -> dict[str, Any] | None:
    """One expansion as it stands in the table, or None where there is no minimum."""
    shell, count = task
    try:
        found = fit(orbitals(shell), count)
    except ValueError:
        return None
    return {
        "shell": shell,
        "exponents": [float(f"{a:.11g}") for a in found.exponents],
        "functions": {
            f"{n}{'spdf'[l]}": {
                "coefficients": [float(f"{c:.11g}") for c in found.coefficients[n, l]],
                "overlap": round(found.overlaps[n, l], 11),
            }
            for n, l in found.coefficients
        },
    }


def main() -> None:
    tasks = [(shell, count) for count in range(6, 0, -1) for shell in SHELLS]
    with ProcessPoolExecutor() as pool:
        made = dict(zip(tasks, pool.map(entry, tasks), strict=True))
    blocks = []
    for count in range(1, 7):
        rows = [json.dumps(made[shell, count]) for shell in SHELLS if made[shell, count]]
        blocks.append(f'    "{count}": [\n      ' + ",\n      ".join(rows) + "\n    ]")
    what = (
        "least-squares expansions of Slater functions (zeta = 1) in 1 to 6 Gaussians; "
        "exponents in bohr**-2, coefficients over normalised primitives"
    )
    source = "computed by fit in rules/physics/slater.py; remade by tests/bench/expansions.py"
    head = f'  "what": {json.dumps(what)},\n  "source": {json.dumps(source)},\n'
    body = ",\n".join(blocks)
    TARGET.write_text(f'{{\n{head}  "expansions": {{\n{body}\n  }}\n}}\n', "utf-8")


if __name__ == "__main__":
    main()
