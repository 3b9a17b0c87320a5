"""Atoms: is each block's energy possible, does contraction cost what it should, is it stationary?

These rules compute Hartree-Fock atoms, so they run only where energies are wanted; what they need
is imported no sooner.
"""

from collections.abc import Iterator

from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rule


@rule("energy.bound")
def bound(case: Case, *, above: float = 0.03) -> Iterator[Finding]:
    """An atom's energy is one that no set of functions for that atom gives.

    No functions whatever bring the energy below the Hartree-Fock limit; an energy below it means
    that the functions are so nearly dependent that rounding has taken over, here and in any
    program.  An energy far above it is worse than that of the poorest published set: a number is
    grossly wrong, or the block belongs to another element.

    Formula: (E - E_limit) / |E_limit| of the ground term, restricted open shells with equivalent
    orbitals; negative, or larger than `above` + 0.07 / Z**2.

    Source: limits: C. F. Bunge, J. A. Barrientos, A. V. Bunge, At. Data Nucl. Data Tables 53, 113
    (1993); of some 3000 published blocks, H to Kr, the poorest, STO-3G, lie 0.067 (H) and 0.019
    (He) above them.

    Limits: above: the share of its limit by which the energy of a heavy atom may lie above it.

    Remedy: look at the numbers of the innermost functions, and whose block it is.

    Bad::

        He 0
        S 3 1.00
          38.355   0.023814
          57.689   0.154913
          1.2399   0.469986
        S 1 1.00
          0.29758  1.0
        ****

    Good::

        He 0
        S 3 1.00
          38.355   0.023814
          5.7689   0.154913
          1.2399   0.469986
        S 1 1.00
          0.29758  1.0
        ****
    """
    if case.energies:
        from overlapse.rules.atomic.energy_judged import bounded

        yield from bounded(case, above)


@rule("energy.loss")
def loss(
    case: Case, *, gap: float = 2.5, contracted: float = 3.0, clear: float = 10.0
) -> Iterator[Finding]:
    """Suspect: contraction, or the set as a whole, costs an atom much more than its neighbours.

    Elements of one row are described equally well: what the energy lies above the Hartree-Fock
    limit, and what it would fall if all primitives were let loose, changes smoothly along the row.
    A lost function or a wrong number raises one of both for one element.  Of 2400 published blocks
    with neighbours in their row 4 exceed the first limit, 6 the second.  An element without
    neighbours is held against the published set of its label: three times as far from the limit as
    any element of the period is a note.

    Formula: (E - E_limit) / |E_limit| and (E - E_uncontracted) / |E_limit|, over the largest of
    the neighbours up to three places away in the row.

    Source: common practice, no source; limits as in energy.bound.

    Limits: gap: how many times that of the neighbours the first may be.  contracted: the same of
    the second.  clear: from how many times on it is a warning.

    Remedy: look for a lost function or a wrong number in this element's block.

    Bad::

        B 0
        S 3 1.00
          49.209  0.154329
          8.9635  0.535328
          2.4259  0.444635
        S 1 1.00
          1.014  1.0
        S 1 1.00
          0.2197  1.0
        P 1 1.00
          1.521  1.0
        P 1 1.00
          0.2873  1.0
        ****
        C 0
        S 3 1.00
          72.377  0.154329
          13.183  0.535328
          3.568  -0.444635
        S 1 1.00
          1.584  1.0
        S 1 1.00
          0.3433  1.0
        P 1 1.00
          2.377  1.0
        P 1 1.00
          0.4489  1.0
        ****
        N 0
        S 3 1.00
          100  0.154329
          18.215  0.535328
          4.9297  0.444635
        S 1 1.00
          2.281  1.0
        S 1 1.00
          0.4943  1.0
        P 1 1.00
          3.422  1.0
        P 1 1.00
          0.6464  1.0
        ****

    Good::

        B 0
        S 3 1.00
          49.209  0.154329
          8.9635  0.535328
          2.4259  0.444635
        S 1 1.00
          1.014  1.0
        S 1 1.00
          0.2197  1.0
        P 1 1.00
          1.521  1.0
        P 1 1.00
          0.2873  1.0
        ****
        C 0
        S 3 1.00
          72.377  0.154329
          13.183  0.535328
          3.568  0.444635
        S 1 1.00
          1.584  1.0
        S 1 1.00
          0.3433  1.0
        P 1 1.00
          2.377  1.0
        P 1 1.00
          0.4489  1.0
        ****
        N 0
        S 3 1.00
          100  0.154329
          18.215  0.535328
          4.9297  0.444635
        S 1 1.00
          2.281  1.0
        S 1 1.00
          0.4943  1.0
        P 1 1.00
          3.422  1.0
        P 1 1.00
          0.6464  1.0
        ****
    """
    if case.energies:
        from overlapse.rules.atomic.energy_judged import losing

        yield from losing(case, gap, contracted, clear)


@rule("energy.stationary", last=True)
def stationary(
    case: Case,
    *,
    times: float = 6.0,
    clear: float = 13.0,
    alone: float = 10.0,
    least: float = 2e-3,
    far: float = 40.0,
) -> Iterator[Finding]:
    """Suspect: the energy of an atom would fall if one number were another.

    Sets are made for the energy of atoms: exponents and coefficients are varied until it is least,
    or columns are the atom's own orbitals.  So at the true numbers the first derivatives vanish, or
    are what they are for the neighbours in the row, often to a hundredth of a per cent.  A wrong
    number moves them all, in a pattern of its own; the number whose correction alone explains the
    pattern is named, with the value that it should have.  Functions that hold no electrons do not
    show, and loose ones show little.  Sets recontracted for relativistic atoms are compared with
    their neighbours only.  Where all functions would have to shrink or grow as those of
    another element would, its block has come to stand here.  Of chromium and copper the
    configuration is taken, 4s1 or 4s2, in which the block goes with its row.  Notes of
    `primitive.trend`, `primitive.gap` and `contraction.trend` on numbers that the energy finds in
    order are taken back.

    Formula: step of a number x: -(dE/dx) / (d2E/dx2), orbitals relaxed, in units of the scatter of
    the same place in the neighbours; chi**2 is their sum of squares.  A correction's standard error
    is that of the scatter, or of what it leaves unexplained if that is more.  All lengths at once:
    f = -V / 2T, near Z / Z' for the block of Z'.

    Source: P. Pulay, Mol. Phys. 17, 197 (1969) (derivatives of the energy by the functions); S.
    Huzinaga, J. Chem. Phys. 42, 1293 (1965) (exponents by the energy of atoms).

    Limits: times: how many standard errors a correction must be to be told, beside three
    neighbours or more.  clear: how many make it a warning without another witness, two and a
    half times as many without neighbours.  alone: how many an element without neighbours needs.
    least: the smallest relative change that is told.  far: root of chi**2 from which a gradient
    that no number explains well is told as well; half as much again without neighbours.

    Remedy: compare the number with the original publication.

    Bad::

        He 0
        S 3 1.00
          38.355   0.023814
          57.689   0.154913
          1.2399   0.469986
        S 1 1.00
          0.29758  1.0
        ****

    Good::

        He 0
        S 3 1.00
          38.355   0.023814
          5.7689   0.154913
          1.2399   0.469986
        S 1 1.00
          0.29758  1.0
        ****
    """
    if case.energies:
        from overlapse.rules.atomic.energy_judged import unsteady

        yield from unsteady(case, times, clear, alone, least, far)
