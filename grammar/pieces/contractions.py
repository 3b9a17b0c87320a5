"""Contractions below a statement of exponents: do fields, ranges and exponents fit together?"""

from typing import NamedTuple

from lark import Token

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, shorten
from overlapse.grammar.pieces.soundstatements import RANGE
from overlapse.grammar.pieces.statements import fault_field, fields_of


class Contraction(NamedTuple):
    """A contraction: which exponents it covers, and where its first coefficient stands.

    ``first`` and ``last`` count from 0, ``last`` past the end; ``at`` is a place in the run.
    """

    first: int
    last: int
    at: int
    statement: Token


def has_fields(build: Build, block: BlockDraft, token: Token) -> bool:
    """Whether a comma stands between any two fields, and a field between any two commas."""
    parts = token.split(",")
    whole, field = True, 0
    if len(parts) == len(fields_of(token)):
        return True
    for part in parts:
        words = part.split()
        if len(words) == 1:
            field += 1
            continue
        fault_field(
            build,
            token,
            max(field - 1, 0) if not words else field + 1,
            "form.syntax",
            f"a comma is missing before {shorten(words[1])!r}"
            if words
            else "nothing stands between the comma behind this and the next",
            element=block.symbol,
            remedy="put the comma in" if words else "restore the number that was lost",
        )
        whole = whole and bool(words)
        field += len(words)
    return whole


def contractions(
    build: Build, block: BlockDraft, heading: Token, tokens: list[Token], places: list[int]
) -> list[Contraction]:
    """The contractions that fit their ranges, and these the exponents; faults for the rest."""
    count = len(fields_of(heading)) - 2
    found = [
        Contraction(*covered, place + 2, token)
        for token, place in zip(tokens, places, strict=True)
        if (covered := _range(build, block, token)) is not None
    ]
    highest = max((column.last for column in found), default=0)
    if highest > count and all(column.last != count for column in found):
        fault_field(
            build,
            heading,
            count + 1,
            "form.count",
            f"{count} exponents stand here, the contractions below cover {highest}",
            element=block.symbol,
            measured=count,
            expected=highest,
            remedy="an exponent was lost, or the ranges of the contractions are wrong",
        )
        return []
    for column in found:
        if column.last > count:
            fault_field(
                build,
                column.statement,
                1,
                "form.count",
                f"the range goes up to exponent {column.last}, but the statement above has {count}",
                element=block.symbol,
                measured=column.last,
                expected=count,
                remedy="mend the range: first and last exponent, with a point between them",
            )
    return [column for column in found if column.last <= count]


def _range(build: Build, block: BlockDraft, token: Token) -> tuple[int, int] | None:
    """First exponent and the one past the last, from 0, if as many coefficients follow."""
    word, *coefficients = fields_of(token)[1:] or [""]
    match = RANGE.fullmatch(word)
    first, last = (int(match[1]), int(match[2])) if match else (0, 0)
    if not 0 < first <= last:
        fault_field(
            build,
            token,
            1 if word else 0,
            "form.number",
            f"{shorten(word)!r} is no range: first and last exponent, with a point between",
            element=block.symbol,
            measured=shorten(word),
            expected=f"1.{len(coefficients) or 1}",
            remedy="write the range, such as 1.3 for the first three exponents",
        )
        return None
    if last - first + 1 == len(coefficients):
        return first - 1, last
    fault_field(
        build,
        token,
        1,
        "form.count",
        f"the range {word} announces {last - first + 1} coefficients, {len(coefficients)} follow",
        element=block.symbol,
        measured=len(coefficients),
        expected=last - first + 1,
        remedy="a coefficient was lost or added, or the range is wrong",
    )
    return None
