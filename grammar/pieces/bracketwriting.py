"""Writer of a file of bracket sections with a `[GTO]` section."""

from collections.abc import Iterator

from overlapse.grammar.convention import count_normalised
from overlapse.grammar.layout import Written
from overlapse.grammar.model import Block, Document, Shell, letter_of
from overlapse.grammar.writing import Losses, columns, is_general, segments

_ROUND = str.maketrans("[]", "()")


def write(document: Document) -> Written:
    """Each block as an atom; the atoms stand in a row, ten bohr apart."""
    losses = Losses()
    blocks = [block for block in document.blocks if block.shells]
    title = next((members.label for members in document.sets if members.label), "unnamed")
    title = " ".join(title.split()).translate(_ROUND)  # a bracket would open a section
    lines = ["[Title]", f" {title}", "[Atoms] AU"]
    losses.say("the layout lists the atoms of a molecule: their positions are made up")
    losses.say("the name of the set stands in the title only")
    if len(document.sets) > 1:
        losses.say("names that keep several sets of one file apart are not written")
    for atom, block in enumerate(blocks, 1):
        lines.append(
            f"{block.symbol:<2} {atom:4} {block.atomic_number:4}    0.0   0.0   {10.0 * atom}"
        )
    lines += [*_flag_lines(blocks, losses), "[GTO]"]
    for atom, block in enumerate(blocks, 1):
        lines.append(f"{atom:4} 0")
        for shell in block.shells:
            lines += _shell_lines(shell, block.symbol, losses)
        lines.append("")
    for block in document.blocks:
        if block.potential is not None:
            losses.say("core potentials are left out", block.symbol)
    _say_convention(document, losses)
    return Written("\n".join(lines) + "\n", losses.lines())


def _flag_lines(blocks: list[Block], losses: Losses) -> list[str]:
    kinds = {block.functions for block in blocks}
    if kinds - {"spherical", "cartesian"}:
        losses.say("spherical or Cartesian functions were not stated: the layout says Cartesian")
    if "spherical" not in kinds:
        return []
    if len(kinds) > 1:
        losses.say("flags for spherical functions hold for the whole file: all become spherical")
    return ["[5D]", "[9G]"]


def _shell_lines(shell: Shell, element: str, losses: Losses) -> Iterator[str]:
    if is_general(shell):
        losses.say("general contractions are written as separate shells", element)
    for angular, rows in segments(shell):
        letters = "".join(map(letter_of, angular))
        yield f" {letters:<2} {len(rows):4} 1.00"
        yield from columns(rows, 6)


def _say_convention(document: Document, losses: Losses) -> None:
    """Readers tell the convention of the coefficients by what is normalised."""
    count = count_normalised(shell for block in document.blocks for shell in block.shells)
    if (count.raw > count.normalised) != document.raw_primitives:
        meant = "raw" if document.raw_primitives else "normalised"
        losses.say(f"coefficients over {meant} primitives will be taken for the other kind")
