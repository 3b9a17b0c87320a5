"""Numbers that fall out of their row or ladder: gathered once for several rules, and told."""

from collections.abc import Iterator

from overlapse.grammar.model import Block, Severity
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.rowwise.alongside import Step, odd_steps
from overlapse.rules.rowwise.norms import is_vouched
from overlapse.rules.rowwise.progressions import (
    Oddity,
    odd_coefficients,
    odd_exponents,
    oddest_of_shells,
)
from overlapse.rules.slips import Slip, copied, is_size_of_a_slip, likeliest, turned

_LEAST = 4.0  # surprise below which a number is not looked at
REMEDY = "compare with the original publication: digits, sign or point may have slipped"


def oddities(case: Case) -> list[Oddity]:
    """Odd numbers of all sets, of each shell the oddest exponent or coefficient.

    Left out: where the form is at fault, which has been reported; elements that go their own way;
    what no slip could have made; numbers that a norm vouches for.
    """
    return case.shared("oddities", lambda: oddest_of_shells(list(_oddities(case))))


def _oddities(case: Case) -> Iterator[Oddity]:
    for members, norms in zip(case.sets, case.norms, strict=True):
        for odd in (*odd_exponents(members, _LEAST), *odd_coefficients(members, _LEAST)):
            value = odd.value
            if (
                odd.is_alone
                and is_size_of_a_slip(value, odd.expected)
                and not case.is_faulty(odd.block, odd.shell)
                and not is_vouched(norms, odd.block, odd.shell, odd.row, odd.column, odd.expected)
            ):
                yield odd


def steps(case: Case, least: float) -> list[Step]:
    """Exponents of all sets that fall out of their ladder, of each ladder one at most."""

    def found() -> Iterator[Step]:
        for members, norms in zip(case.sets, case.norms, strict=True):
            for step in odd_steps(members, least):
                if not case.is_faulty(step.block, step.shell) and not is_vouched(
                    norms, step.block, step.shell, step.row, None, step.expected
                ):
                    yield step

    return case.shared(f"steps {least}", lambda: list(found()))


def told(
    case: Case,
    odd: Oddity,
    severity: Severity,
    limit: float,
    witnesses: tuple[str, ...] = (),
) -> Finding:
    """The finding for a number that falls out of its row."""
    what = "exponent" if odd.column is None else "coefficient"
    shell = odd.block.shells[odd.shell]
    word = shell.spelling(odd.row, odd.column)
    slip = slip_of(odd)
    message = (
        f"suspect: {what} {word} falls out of its row, where {odd.others} other elements suggest "
        f"{odd.expected:.4g} ({odd.low:.4g} to {odd.high:.4g})"
    )
    if place := borrowed(case, odd.block, odd.shell, odd.row, odd.column):
        message += f"; it is the number of {place}"
    elif slip is not None:
        message += f"; {slip.told}: {slip.word} would fit"
    value = odd.value
    return case.at_shell(
        odd.block,
        odd.shell,
        severity,
        message,
        row=odd.row,
        column=odd.column,
        measured=value,
        limit=odd.high if value > odd.high else odd.low,
        expected=slip.value if slip is not None else float(f"{odd.expected:.4g}"),
        witnesses=(
            f"off the row by {odd.surprise:.1f} times the spread; "
            f"{limit * odd.strictness:.1f} are noted in this set",
            *witnesses,
        ),
        remedy=REMEDY,
    )


def slip_of(odd: Oddity) -> Slip | None:
    """The slip that explains a departure; a wrong sign goes before all others."""
    word = odd.block.shells[odd.shell].spelling(odd.row, odd.column)
    number = likeliest(word, odd.low, odd.high, odd.expected)
    if odd.column is not None:
        value = -odd.value
        if odd.low <= value <= odd.high:
            return Slip(turned(word), value, "sign lost or added")
    return number


def borrowed(case: Case, block: Block, index: int, row: int, column: int | None) -> str:
    """Where a number also stands that an eye may have slipped to; "" where it stands alone."""
    shell = block.shells[index]
    others = [
        (shell.spelling(at, column), place)
        for at, place in ((row - 1, "the row above"), (row + 1, "the row below"))
        if 0 <= at < len(shell.exponents)
    ]
    name = block.names[index]
    for members in case.sets:
        if not any(other is block for other in members.blocks):
            continue
        for other in members.blocks:
            if abs(other.atomic_number - block.atomic_number) == 1 and name in other.names:
                same = other.shells[other.names.index(name)]
                if same.coefficients.shape == shell.coefficients.shape:
                    others.append((same.spelling(row, column), f"this place in {other.symbol}"))
    return copied(shell.spelling(row, column), others)
