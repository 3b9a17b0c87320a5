"""Sets out of a list of atoms, for layouts that give every atom of a molecule its own basis."""

from dataclasses import replace

from overlapse.grammar.model import BasisSet, Block, Document, Fault, Severity

_Key = tuple[object, ...]


def gather(document: Document, severity: Severity = "note") -> Document:
    """The document with each basis once, however many atoms carry it.

    A second basis for an element is a basis of its own: the n-th of every element make the n-th
    set.  Sets of different names stay apart.  A block that had to leave something out gives way to
    a whole one of its element.  ``severity``: of the remark on a second basis.
    """
    variants: dict[tuple[str | None, int], dict[_Key | None, Block]] = {}
    faults = list(document.faults)
    for members in document.sets:
        for block in members.blocks:
            known = variants.setdefault((members.label, block.atomic_number), {})
            if not known:
                known[()] = block  # most elements come once, and then no key is wanted
                continue
            if first := known.pop((), None):
                known[_key(first)] = first
            if (key := _key(block)) in known or not block.complete:
                continue
            if len(known) == 1 and not next(iter(known.values())).complete:
                known.clear()
            else:
                faults.append(_another(document, block, next(iter(known.values())), severity))
            known[key] = block
    faults.sort(key=lambda fault: fault.span)
    return replace(document, sets=_sets(document, variants), faults=tuple(faults))


def _sets(
    document: Document, variants: dict[tuple[str | None, int], dict[_Key | None, Block]]
) -> tuple[BasisSet, ...]:
    heads: dict[str | None, BasisSet] = {}
    for members in document.sets:
        heads.setdefault(members.label, members)
    found = []
    for label, head in heads.items():
        bases = [list(known.values()) for (name, _), known in variants.items() if name == label]
        for level in range(max(map(len, bases))):
            blocks = [known[level] for known in bases if level < len(known)]
            blocks.sort(key=lambda block: block.line)
            found.append(replace(head, blocks=tuple(blocks)))
    return tuple(found)


def _key(block: Block) -> _Key:
    """Equal for blocks that say the same, bit for bit."""
    shells = tuple(
        (shell.angular, shell.coefficients.tobytes(), shell.exponents.tobytes())
        for shell in block.shells
    )
    if block.potential is None:
        return (block.functions, shells)
    channels = tuple(
        (c.l, c.local, c.kind, c.powers, c.exponents.tobytes(), c.coefficients.tobytes())
        for c in block.potential.channels
    )
    return (block.functions, shells, block.potential.electrons, channels)


def _another(document: Document, block: Block, first: Block, severity: Severity) -> Fault:
    return Fault(
        "form.repeat",
        f"{block.symbol} has another basis here than on line {first.line}: judged as a second set",
        document.source.span_of_line(block.line - 1),
        severity=severity,
        element=block.symbol,
        remedy="give all atoms of an element one basis, unless the mixture is meant",
    )
