"""The order in which things are listed."""

from collections.abc import Iterator

import numpy as np

from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
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
    for block in case.document.blocks:
        for index, shell in enumerate(block.shells):
            steps = np.diff(shell.exponents)
            if len(steps) < 2 or (steps <= 0.0).all() or (steps >= 0.0).all():
                continue
            if all(len(function.exponents) < 2 for function in shell.functions()):
                continue  # a list of single functions, not a contraction
            row = int(np.argmax(steps > 0.0)) + 1
            yield case.at_shell(
                block,
                index,
                "note",
                "the exponents of this contraction neither fall nor rise throughout: "
                f"{shell.spelling(row)} follows {shell.spelling(row - 1)}",
                row=row,
                measured=float(shell.exponents[row]),
                limit=float(shell.exponents[row - 1]),
                remedy="compare it with its source; if it is right, sort the rows",
                edits=reordered(shell, np.argsort(-shell.exponents, kind="stable").tolist()),
            )
