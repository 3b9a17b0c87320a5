"""Rows that begin with their own number, 1, 2, 3 ...: is it there, and does it run on?"""

from itertools import pairwise

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Run, integer, shorten


def numbers_in_front(
    build: Build, block: BlockDraft, name: str, run: Run, needed: int, announced: int | None
) -> int | None:
    """How many row numbers stand before each exponent: 1, or 0 if all rows of a shell lost theirs.

    ``needed``: the numbers of a row without it.  None, and a fault, if the rows are not alike.
    """
    numbers = [integer(row[0]) for row in run.rows]
    widths = [len(row) for row in run.rows]
    count = len(widths)
    if numbers == list(range(1, count + 1)) and widths == [needed + 1] * count:
        return 1
    lost = [at for at in range(count) if widths[at] == needed and numbers[at] != at + 1]
    for at in lost[:1] if len(lost) == count else lost:
        others = ", as have all rows of this shell" if len(lost) == count > 1 else ""
        _say(build, block, name, run, at, at + 1, f"this row has lost its number {at + 1}{others}")
    if len(lost) == count:
        return 0
    if not _explained(numbers, announced):
        _check_order(build, block, name, run, numbers, set(lost))
    return 1 if _check_widths(build, block, name, run, needed, set(lost)) and not lost else None


def _explained(numbers: list[int | None], announced: int | None) -> bool:
    """Whether the numbers jump only over rows that the heading announces and that are not there."""
    known = [number for number in numbers if number is not None]
    rising = all(a < b for a, b in pairwise(known))
    return rising and len(known) == len(numbers) < (announced or 0) >= known[-1]


def _check_order(
    build: Build,
    block: BlockDraft,
    name: str,
    run: Run,
    numbers: list[int | None],
    lost: set[int],
) -> None:
    """Each place where the numbers break off is said once; they may run on from there."""
    expected = 1
    for at, number in enumerate(numbers):
        if at not in lost and number not in (expected, at + 1):
            found = shorten(run.rows[at][0])
            message = f"row number {expected} is expected here, {found} stands here"
            _say(build, block, name, run, at, expected, message)
        expected = (expected if number is None or at in lost else number) + 1


def _check_widths(
    build: Build, block: BlockDraft, name: str, run: Run, needed: int, lost: set[int]
) -> bool:
    kept = [at for at in range(len(run.rows)) if at not in lost]
    rows = Run([run.rows[at] for at in kept], [run.lines[at] for at in kept])
    coefficients = f"{needed - 1} coefficient{'s' * (needed > 2)}"
    return build.check_rows(
        block,
        name,
        rows,
        needed + 1,
        f"the shell has {needed + 1} (its own number, an exponent and {coefficients})",
        "; perhaps an L shell was meant" if needed == 2 else "",
    )


def _say(
    build: Build, block: BlockDraft, name: str, run: Run, at: int, expected: int, message: str
) -> None:
    build.fault_word(
        "form.index-column",
        run.lines[at],
        0,
        message,
        element=block.symbol,
        shell=name,
        measured=shorten(run.rows[at][0]),
        expected=expected,
        remedy="number the rows of a shell 1, 2, 3 ...; a row may have been lost or moved",
    )
