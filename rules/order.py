"""The order in which things are listed."""

from collections.abc import Iterator

import numpy as np

from overlapse.grammar.model import Function
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.gap import spacing_oddities
from overlapse.rules.registry import rule
from overlapse.rules.repair import reordered


@rule("primitive.order")
def order(case: Case) -> Iterator[Finding]:
    """The primitives of a contraction stand in no order.

    The order means nothing to a program, and nearly all published contractions list their
    exponents from the largest to the smallest. Where one stands out of line the number may have
    lost a digit or its power of ten, and whoever compares two files by eye will miss it.

    Source: common practice, no source.

    Remedy: compare the number with its neighbours; if it is right, sort the rows.

    Bad::

        C 0
        S 3 1.00
          4.0 0.6
          0.3 0.3
          0.5 0.3
        ****

    Good::

        C 0
        S 3 1.00
          4.0 0.6
          0.5 0.3
          0.3 0.3
        ****
    """
    # A set that keeps an order everywhere else says more about the one that breaks it.
    told = {odd.shell for odd in spacing_oddities(case) if odd.is_order}
    for block in case.document.blocks:
        for index, shell in enumerate(block.shells):
            row = next(filter(None, map(_out_of_line, shell.functions())), None)
            # A sign that slipped is a finding of its own; sorting would carry it elsewhere.
            if row is None or (id(block), index) in told or (shell.exponents <= 0.0).any():
                continue
            yield case.at_shell(
                block,
                index,
                "note",
                "the exponents of this contraction neither fall nor rise throughout: "
                f"{shell.spelling(row)} stands after a smaller one",
                row=row,
                measured=float(shell.exponents[row]),
                remedy="compare it with its source; if it is right, sort the rows",
                edits=reordered(shell, np.argsort(-shell.exponents, kind="stable").tolist()),
            )


def _out_of_line(function: Function) -> int | None:
    """The row (of the shell) of the first exponent above its forerunner, if others fall."""
    steps = np.diff(function.exponents)
    if (steps <= 0.0).all() or (steps >= 0.0).all():
        return None
    return int(function.rows[np.argmax(steps > 0.0) + 1])
