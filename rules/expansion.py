"""Minimal sets STO-nG: are their numbers expansions of Slater functions, and of what zeta?"""

from collections.abc import Iterator
from typing import NamedTuple

from overlapse.grammar.elements import symbol_of
from overlapse.grammar.model import BasisSet, Block, letter_of
from overlapse.rules.case import Case
from overlapse.rules.families.counted import table, within
from overlapse.rules.finding import Finding
from overlapse.rules.labels.claims import Claim
from overlapse.rules.labels.expanded import Departure, Limits, Match, departure, exchanged, matches
from overlapse.rules.registry import rule


def screening(z: int) -> float:
    """How much the 1s electrons of an atom screen its nucleus: Z less the best zeta.

    A straight line through the published values, 0.31 for Li to 0.95 for I, met within 0.15.
    """
    return 0.3 + 0.012 * z


class _Odd(NamedTuple):
    """The functions of one shell that are no expansions, and what is wrong with them."""

    matches: list[Match]
    departures: list[Departure]
    told: str

    @property
    def place(self) -> str:
        n = self.matches[0].orbital[0]
        return f"{n}{''.join(letter_of(m.orbital[1]) for m in self.matches)}"


def _odd_shells(block: Block, found: list[Match]) -> Iterator[_Odd]:
    bad = [m for m in found if not m.fits]
    for shell in dict.fromkeys(m.shell for m in bad):
        group = [m for m in bad if m.shell == shell]
        departures = [departure(m) for m in group]
        parts = dict.fromkeys(d.words for d in departures)
        told = "; ".join(parts) + exchanged(group[0], bad)
        yield _Odd(group, departures, told)


@rule("label.expansion")
def expansion(
    case: Case, *, ratio: float = 1e-3, coefficient: float = 2e-4, nucleus: float = 0.35
) -> Iterator[Finding]:
    """The numbers of a set called STO-nG are not expansions of Slater functions.

    In STO-nG each function is the least-squares expansion of one Slater function: for a given
    shell the ratios of the exponents and the coefficients are the same for all elements, and only
    the Slater exponent zeta differs, with whose square all exponents of the shell scale.  So every
    single number can be checked, and the numbers tell which zeta they correspond to.  A shell
    whose exponents belong to one expansion and whose coefficients belong to another is neither
    normalised nor a good Slater function.  The zeta of 1s is close to the nuclear charge and
    tells when a block holds another element's numbers.

    Formula: alpha_i = zeta**2 alpha_i(1), c_i = c_i(1), with the expansion for zeta = 1 that is
    best by least squares; s, p (and d from Sc on) of one shell share their exponents.

    Source: W. J. Hehre, R. F. Stewart, J. A. Pople, J. Chem. Phys. 51, 2657 (1969); W. J. Hehre, R.
    Ditchfield, R. F. Stewart, J. A. Pople, J. Chem. Phys. 52, 2769 (1970); W. J. Pietro, B. A.
    Levy, W. J. Hehre, R. F. Stewart, Inorg. Chem. 19, 2225 (1980).  The expansions are computed.

    Limits: ratio: of ln(ratio of exponents) against the expansion.  coefficient: of a coefficient
    against the expansion.  nucleus: how far the zeta of 1s may be from that of the element.

    Remedy: restore the numbers from the original publication, or correct the label.

    Bad::

        ! label: STO-3G
        H 0
        S 3 1.00
          3.42525091 0.15432897
          0.62391373 0.55532814
          0.16885540 0.44463454
        ****

    Good::

        ! label: STO-3G
        H 0
        S 3 1.00
          2.22766058 0.15432897
          0.40577116 0.53532814
          0.10981751 0.44463454
        ****
    """
    for index, members in enumerate(case.sets):
        for claim in case.claims[index]:
            label = claim.designation
            if label is not None and label.family == "STO-nG":
                limits = Limits(ratio, coefficient)
                found = [
                    matches(block, label.core, limits) for block in members.blocks if block.complete
                ]
                yield from _judge(case, members, claim, [f for f in found if f])
                yield from _strangers(case, [f for f in found if f], nucleus)
                break


def _judge(
    case: Case, members: BasisSet, claim: Claim, found: list[list[Match]]
) -> Iterator[Finding]:
    everything = [m for block in found for m in block]
    strange = [m for m in everything if not m.exponents and not m.coefficients]
    if len(strange) * 2 > len(everything):
        yield case.at_line(
            claim.line,
            "warning",
            f"{claim.label!r} ({claim.where}) promises expansions of Slater functions; "
            f"{len(strange)} of {len(everything)} functions of this length are none",
            element=strange[0].block.symbol,
            measured=len(strange),
            limit=0,
            remedy="correct the label",
        )
        return
    groups: dict[tuple[str, str], list[_Odd]] = {}
    for block_matches in found:
        for odd in _odd_shells(block_matches[0].block, block_matches):
            # Where one element says "exchanged" the numbers in the words are its own.
            key = (odd.place, "; ".join(d.words for d in odd.departures))
            groups.setdefault(key, []).append(odd)
    for (place, _), group in groups.items():
        yield _finding(case, place, group)


def _finding(case: Case, place: str, group: list[_Odd]) -> Finding:
    first = group[0]
    match = first.matches[0]
    exact = next((d for d in first.departures if d.row is not None), Departure(""))
    zetas = ", ".join(f"{o.matches[0].block.symbol} {o.matches[0].zeta:.3f}" for o in group)
    known = all(_is_passed_on(odd.matches[0]) for odd in group)
    return case.at_shell(
        match.block,
        match.shell,
        "note" if known else "warning",
        f"{place} of {_count(group)} is no expansion of a Slater function: {first.told} "
        f"(zeta by its exponents: {zetas})" + "; every known copy has it so" * known,
        row=exact.row,
        column=exact.column,
        measured=round(match.zeta, 6),
        expected=None if exact.expected is None else float(f"{exact.expected:.9g}"),
        witnesses=(f"least-squares expansion {match.nearest.name}",),
        remedy="restore the numbers of the expansion that was meant",
    )


def _is_passed_on(match: Match) -> bool:
    """Whether every known copy of the set has this shell so, exponents and coefficients mixed."""
    data = table("slater")["passed_on"].get(str(len(match.order)))
    return bool(
        data
        and match.exponents
        and match.coefficients
        and match.orbital[0] == data["n"]
        and within(data["elements"], match.block.atomic_number)
    )


def _count(group: list[_Odd]) -> str:
    symbols = [odd.matches[0].block.symbol for odd in group]
    return ", ".join(symbols) if len(symbols) < 5 else f"{len(symbols)} elements"


def _strangers(case: Case, found: list[list[Match]], nucleus: float) -> Iterator[Finding]:
    """Blocks whose 1s function has the zeta of another element."""
    for match in (m for block in found for m in block if m.orbital == (1, 0) and m.fits):
        z = match.block.atomic_number
        # The zeta of H and He is that of molecules, and anybody may choose another.
        if z < 3 or abs(z - screening(z) - match.zeta) <= nucleus:
            continue
        other = round((match.zeta + 0.3) / (1.0 - 0.012))
        told = f", as {symbol_of(other)} has it" if 2 < other < 119 and other != z else ""
        yield case.at_shell(
            match.block,
            match.shell,
            "warning",
            f"the 1s function of {match.block.symbol} has zeta {match.zeta:.3f}{told}; about "
            f"{z - screening(z):.1f} belongs to a nucleus of charge {z}",
            measured=round(match.zeta, 6),
            limit=round(z - screening(z), 2),
            remedy=f"put the numbers of {match.block.symbol} in the place of those of another "
            "element",
        )
