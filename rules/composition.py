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


def notation(block: Block) -> str:
    """Composition in the usual notation: (10s,4p) -> [3s,2p]."""
    distinct, _ = primitives(block)

    def join(counts: dict[int, int]) -> str:
        return ",".join(f"{count}{letter_of(l)}" for l, count in counts.items())

    return f"({join(distinct)}) -> [{join(block.counts)}]"
