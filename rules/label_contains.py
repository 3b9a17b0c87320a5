"""Labels: does a decorated set hold the set that it decorates?

What comparing takes is imported where it is done, because most audits compare with nothing.
"""

from collections.abc import Iterator
from dataclasses import replace
from typing import TYPE_CHECKING

from overlapse.rules.case import Case, gathered
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rule

if TYPE_CHECKING:
    from overlapse.rules.compare.beside import Kin
    from overlapse.rules.compare.kinship import Lack


@rule("label.contains")
def contains(case: Case) -> Iterator[Finding]:
    """A decorated set lacks functions of the set that it decorates, which lies beside it.

    Stars, plus signs and aug- add functions and leave the set itself as it is: all functions of
    6-31G stand unchanged in 6-31+G*, all of cc-pVDZ in aug-cc-pVDZ.  So where both are audited
    together, each is a copy of the numbers of the other, and a function of the smaller one that the
    larger one does not hold is a wrong number, or a lost shell, in one of the two.  What spans the
    same is the same here: a contraction without a primitive that also stands alone, or another
    normalisation.  Elements that are known to have been optimised anew are left out.  A set is
    known by its label; in audits of many files, by the name of its file.

    Formula: exponents to 2e-6, coefficients to 1e-4 of themselves; else the sine of the angle
    between the function and the space of the other set's functions of its l, against what the
    printed digits allow.

    Source: P. C. Hariharan, J. A. Pople, Theor. Chim. Acta 28, 213 (1973); R. A. Kendall, T. H.
    Dunning, R. J. Harrison, J. Chem. Phys. 96, 6796 (1992); E. Papajak, D. G. Truhlar, J. Chem.
    Theory Comput. 7, 10 (2011); F. Jensen, J. Chem. Phys. 117, 9234 (2002); D. Rappoport, F.
    Furche, J. Chem. Phys. 133, 134105 (2010).

    Remedy: see which of the two files has the published numbers, and restore the other.

    Beside::

        ! label: 6-31G
        H 0
        S 3 1.00
          18.0 0.03
          2.8 0.23
          0.6 0.81
        S 1 1.00
          0.16 1.0
        ****

    Bad::

        ! label: 6-31G**
        H 0
        S 3 1.00
          18.0 0.03
          2.8 0.32
          0.6 0.81
        S 1 1.00
          0.16 1.0
        P 1 1.00
          1.1 1.0
        ****

    Good::

        ! label: 6-31G**
        H 0
        S 3 1.00
          18.0 0.03
          2.8 0.23
          0.6 0.81
        S 1 1.00
          0.16 1.0
        P 1 1.00
          1.1 1.0
        ****
    """
    if not case.kin:
        return
    from overlapse.rules.compare.kinship import lacks

    told: set[tuple[str | None, str | None, int, int]] = set()
    for kin in case.kin:
        found = [_finding(case, kin, lack) for lack in lacks(case.document, kin)]
        new = [f for f in found if (f.element, f.shell, f.line, f.column) not in told]
        told.update((f.element, f.shell, f.line, f.column) for f in new)
        yield from gathered(new)


def _finding(case: Case, kin: "Kin", lack: "Lack") -> Finding:
    from overlapse.rules.compare.compared import nearest_difference

    first = lack.missing[0]
    names = [lack.parent.name(member) for member in lack.missing]
    block = lack.own.block
    path = kin.source.path
    place = lack.parent.spot(first)
    told = ", ".join(names[:6]) + (" ..." if len(names) > 6 else "")
    what = f"{len(names)} functions" if len(names) > 1 else "a function"
    message = (
        f"{block.symbol} lacks {what} of {kin.parent}, which {kin.label} contains: {told} "
        f"({path}:{place.line})"
    )
    finding = case.at_line(
        block.line,
        "warning",
        message,
        element=block.symbol,
        measured=len(names),
        limit=0,
        remedy="see which of the two files has the published numbers, and restore the other",
    )
    near = nearest_difference(lack.own, lack.parent, first)
    if near is None or near.left is None or near.right is None:
        return finding
    return replace(
        finding,
        message=f"{message}; nearest here is {near.left.shell}: {near.what} {near.left.spelling} "
        f"here, {near.right.spelling} there",
        line=near.left.line,
        column=near.left.column,
        length=len(near.left.spelling),
        shell=near.left.shell,
        expected=near.right.value,
    )
