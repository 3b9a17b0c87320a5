"""Core potentials: is each term sound, and is every channel there once?"""

from collections.abc import Iterator

from overlapse.grammar.elements import replaced_by
from overlapse.grammar.model import Block, Channel, Severity, letter_of
from overlapse.rules.case import Case, gathered
from overlapse.rules.finding import Finding
from overlapse.rules.labels.cores import Carrier, carriers_of, neighbours, scalar_channels
from overlapse.rules.registry import rule


@rule("potential.terms")
def terms(case: Case, *, highest: float = 4) -> Iterator[Finding]:
    """A term of a core potential cannot be right.

    A term is c r**(n-2) exp(-a r**2).  With an exponent that is not positive it never dies away;
    powers n other than 0 to 4 are in use nowhere, and stand where two columns were exchanged; the
    same power and exponent twice, with the same coefficient, is a row pasted twice.

    Formula: a > 0; 0 <= n <= 4; no (n, a, c) twice in a channel.

    Source: L. R. Kahn, P. Baybutt, D. G. Truhlar, J. Chem. Phys. 65, 3826 (1976); powers counted in
    published files (0, 1, 2, 3).

    Limits: highest: power n up to which a term is taken for sound.

    Remedy: compare the row with the original publication.

    Bad::

        NA 0
        NA-ECP 2 10
        d potential
        1
        1 175.0 -10.0
        s-d potential
        1
        2 -20.0 40.0
        p-d potential
        1
        2 10.0 20.0

    Good::

        NA 0
        NA-ECP 2 10
        d potential
        1
        1 175.0 -10.0
        s-d potential
        1
        2 20.0 40.0
        p-d potential
        1
        2 10.0 20.0
    """
    for members in case.sets:
        found = [
            finding
            for block, potential in carriers_of(members)
            for channel in potential.channels
            for finding in _odd_terms(case, block, channel, highest)
        ]
        yield from gathered(found)


def _odd_terms(case: Case, block: Block, channel: Channel, highest: float) -> Iterator[Finding]:
    where = f"of the {_title(channel)} part of the potential of {block.symbol}"
    details = {"element": block.symbol, "shell": letter_of(channel.l)}
    rows = list(
        zip(channel.powers, channel.exponents.tolist(), channel.coefficients.tolist(), strict=True)
    )
    for at, (power, exponent, _) in enumerate(rows):
        if exponent <= 0.0:
            yield case.at_line(
                channel.line,
                "error",
                f"exponent {exponent:g} in term {at + 1} {where} is not positive, so the term "
                "never dies away",
                measured=exponent,
                limit=0.0,
                remedy="restore the exponent; perhaps it changed places with the coefficient",
                **details,
            )
        elif not 0 <= power <= highest:
            yield case.at_line(
                channel.line,
                "warning",
                f"term {at + 1} {where} has the power {power} (r**{power - 2}); 0 to {highest:g} "
                "are in use",
                measured=power,
                limit=highest,
                remedy="perhaps the columns power, exponent, coefficient changed places",
                **details,
            )
    again = [row for at, row in enumerate(rows) if row[2] and row in rows[:at]]
    if again:
        yield case.at_line(
            channel.line,
            "warning",
            f"{len(again)} of {len(rows)} terms {where} repeat{'s' * (len(again) == 1)} another, "
            f"first the one with exponent {again[0][1]:g} and coefficient {again[0][2]:g}, and "
            "so counts double",
            measured=again[0][1],
            remedy="take the second of the two out, or restore the row that it replaced",
            **details,
        )


def _title(channel: Channel) -> str:
    kind = "" if channel.kind == "scalar" else " spin-orbit"
    return f"local ({letter_of(channel.l)})" if channel.local else f"{letter_of(channel.l)}{kind}"


@rule("potential.channels")
def channels(case: Case) -> Iterator[Finding]:
    """The channels of a core potential are not the local part and s, p, ... below it.

    A semilocal potential has one local part, which acts on all angular momenta from some l on, and
    one projected part for each l below.  A part that is lost, given twice or copied from another
    lets the valence electrons of that l see the wrong core.  The projected parts reach at least as
    far as the d shells of the core do.

    Formula: U = U_L + sum over l < L of (U_l - U_L) |l><l|, each l from 0 to L - 1 once; L is at
    least one more than the highest l in the core (f shells of the core may be left to U_L).

    Source: L. R. Kahn, P. Baybutt, D. G. Truhlar, J. Chem. Phys. 65, 3826 (1976); M. Dolg, X. Cao,
    Chem. Rev. 112, 403 (2012); channels counted in published files.

    Remedy: restore the part from the original publication.

    Bad::

        NA 0
        NA-ECP 1 10
        p potential
        1
        1 175.0 -10.0
        s-p potential
        1
        2 20.0 40.0

    Good::

        NA 0
        NA-ECP 2 10
        d potential
        1
        1 175.0 -10.0
        s-d potential
        1
        2 20.0 40.0
        p-d potential
        1
        2 10.0 20.0
    """
    for members in case.sets:
        carriers = carriers_of(members)
        found = []
        for carrier in carriers:
            # Potentials whose terms are not modelled have no channels, and faulty ones are told.
            if carrier.block.complete and scalar_channels(carrier.potential):
                for severity, words in _odd_channels(carrier, carriers):
                    found.append(
                        case.at_line(
                            carrier.potential.line,
                            severity,
                            f"the potential of {carrier.block.symbol} {words}",
                            element=carrier.block.symbol,
                            measured=len(scalar_channels(carrier.potential)),
                            remedy="restore the part from the publication of the potential",
                        )
                    )
        yield from gathered(found)


def _odd_channels(carrier: Carrier, carriers: list[Carrier]) -> Iterator[tuple[Severity, str]]:
    parts = scalar_channels(carrier.potential)
    local = [part for part in parts if part.local]
    below = sorted(part.l for part in parts if not part.local)
    if len(local) != 1:
        yield "error", f"has {len(local) or 'no'} local parts where one is needed"
        return
    top = local[0].l
    twice = sorted({l for l in below if below.count(l) > 1})
    absent = [l for l in range(top) if l not in below]
    beyond = [l for l in below if l >= top]
    if twice:
        yield "error", f"has the {_letters(twice)} part more than once"
    elif absent:
        yield "error", f"lacks the {_letters(absent)} part below its local part ({letter_of(top)})"
    elif beyond:
        yield (
            "error",
            f"has the {_letters(beyond)} part not below its local part ({letter_of(top)})",
        )
    elif (least := _least_local(carrier.potential.electrons)) > top:
        yield (
            "warning",
            f"is projected on {_letters(below) or 'no l'} only, but its core of "
            f"{carrier.potential.electrons} electrons has shells up to {letter_of(least - 1)}",
        )
    elif (shorter := _shorter(carrier, carriers, top)) is not None:
        yield "note", shorter
    else:
        yield from _copies(parts)


def _letters(momenta: list[int]) -> str:
    return ", ".join(letter_of(l) for l in momenta)


def _least_local(electrons: int) -> int:
    """The lowest l that the local part may have: above the s, p and d shells of the core."""
    replaced = replaced_by(electrons) or {}
    return min(max(replaced, default=-1), 2) + 1


def _shorter(carrier: Carrier, carriers: list[Carrier], top: int) -> str | None:
    """Fewer parts than both neighbours have for the same core."""
    near = neighbours(carrier, carriers)
    tops = {part.l for c in near for part in scalar_channels(c.potential) if part.local}
    same = all(c.potential.electrons == carrier.potential.electrons for c in near)
    if len(tops) == 1 and same and top < min(tops):
        names = " and ".join(c.block.symbol for c in near)
        return f"has its local part at {letter_of(top)}, its neighbours {names} at " + letter_of(
            min(tops)
        )
    return None


def _copies(parts: list[Channel]) -> Iterator[tuple[Severity, str]]:
    """Parts that are copies of others; lone terms of no weight are place holders."""
    seen: dict[tuple[object, ...], Channel] = {}
    for part in parts:
        if not part.coefficients.any():
            continue
        key = (part.powers, tuple(part.exponents.tolist()), tuple(part.coefficients.tolist()))
        if key in seen:
            yield (
                "warning",
                f"has the same terms in its {_title(seen[key])} and {_title(part)} parts",
            )
        seen.setdefault(key, part)
