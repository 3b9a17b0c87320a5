"""What a block is made of: contraction lengths, counts of primitives, the usual notation."""

from overlapse.grammar.model import Block, letter_of


def lengths_of(block: Block) -> dict[int, tuple[int, ...]]:
    """Contraction lengths of a block for each l, longest first."""
    found: dict[int, list[int]] = {}
    for _, function in block.contracted:
        found.setdefault(function.l, []).append(len(function.exponents))
    return {l: tuple(sorted(n, reverse=True)) for l, n in sorted(found.items())}


def primitives(block: Block) -> tuple[dict[int, int], dict[int, int]]:
    """Primitives per l, counted as distinct exponents and as rows of all contractions."""
    distinct: dict[int, set[float]] = {}
    written: dict[int, int] = {}
    for shell in block.shells:
        for l in shell.angular:
            distinct.setdefault(l, set()).update(shell.exponents.tolist())
            written[l] = written.get(l, 0) + len(shell.exponents)
    return {l: len(e) for l, e in sorted(distinct.items())}, dict(sorted(written.items()))


def notation(block: Block, between: str = ",") -> str:
    """Composition in the usual notation: (10s,4p) -> [3s,2p], or (10s4p) -> [3s2p]."""
    distinct, _ = primitives(block)

    def join(counts: dict[int, int]) -> str:
        return between.join(f"{count}{letter_of(l)}" for l, count in counts.items())

    return f"({join(distinct)}) -> [{join(block.counts)}]"


def show(lengths: dict[int, tuple[int, ...]], which: tuple[int, ...] | None = None) -> str:
    """Contraction lengths in words, of all l or of those in ``which``: s (6,3,1), p (3,1)."""
    shown = [
        f"{letter_of(l)} ({','.join(map(str, n))})"
        for l, n in lengths.items()
        if which is None or l in which
    ]
    missing = [f"no {letter_of(l)}" for l in which or () if l not in lengths]
    return ", ".join([*shown, *missing]) or "nothing"


def function_counts(block: Block) -> tuple[int, int]:
    """Number of basis functions of one atom: with spherical, and with Cartesian d and above."""
    counts = block.counts.items()
    spherical = sum((2 * l + 1) * count for l, count in counts)
    return spherical, sum((l + 1) * (l + 2) // 2 * count for l, count in counts)


def exponent_limits(block: Block) -> dict[int, tuple[float, float]]:
    """Highest and lowest exponent of each l, bohr**-2."""
    found: dict[int, tuple[float, float]] = {}
    for shell in block.shells:
        exponents = shell.exponents.tolist()
        for l in shell.angular:
            high, low = found.get(l, (exponents[0], exponents[0]))
            found[l] = max(high, *exponents), min(low, *exponents)
    return dict(sorted(found.items()))
