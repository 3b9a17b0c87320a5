"""Shells below five numbers: kind, shell type, number of rows, formal charge, scale factor.

Kind 0 has rows; 1 and 2 are built into the program that reads them and have none.
"""

from contextlib import suppress

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Run
from overlapse.grammar.numbers import plain
from overlapse.grammar.pieces.slips import check_scale, is_sensible, say_not_whole

# Shell types by their number, each with the electrons that it can hold.
TYPES = (("s", 2), ("sp", 8), ("p", 6), ("d", 10), ("f", 14), ("g", 18))
FIVE = "0 and the shell type, the number of rows, the formal charge, the scale factor"

_TYPE_LIST = "0 s, 1 sp, 2 p, 3 d, 4 f, 5 g"
_WHOLE = frozenset("0123456789")


class Fives:
    """Reads the shells of one text."""

    def __init__(self, build: Build) -> None:
        self.build = build
        self.known: dict[str, tuple[str, str, float] | None] = {}  # what headings say, if plain

    def shell(self, block: BlockDraft, index: int, first: int, last: int) -> None:
        """A shell whose heading is line ``index``, its rows lines ``first`` up to ``last``."""
        body = self.build.bodies[index]
        if body not in self.known:
            self.known[body] = _spelt(body.split())
        if (spelt := self.known[body]) is not None and first < last:
            letters, announced, scale = spelt
            if self.build.sound_shell(block, letters, index, first, last, announced, scale=scale):
                return
        self.doubtful(block, index, self.build.rows_between(first, last))

    def doubtful(self, block: BlockDraft, index: int, run: Run) -> None:
        kind, shape, count, charge, scale = self.numbers(block, index)
        if kind in (1.0, 2.0) and not run.rows:
            self.built_in(block, index)
            return
        if kind != 0.0 or shape is None or not 0 <= shape < len(TYPES):
            self.unknown(block, index, kind, shape)
            self.build.check_words(block, None, run)
            return
        letters, capacity = TYPES[int(shape)]
        if all(len(row) == len(letters) + 1 for row in run.rows):
            self.check_charge(block, index, letters, capacity, charge or 0.0)
        self.build.shell(
            block,
            letters,
            index,
            run,
            announced=None if count is None else f"{count:.0f}",
            announced_word=2,
            scale=1.0 if scale is None else check_scale(self.build, block, index, 4, scale),
        )

    def numbers(self, block: BlockDraft, index: int) -> list[float | None]:
        """The five numbers of a heading; None for one that is lost or cannot be read."""
        words = self.build.bodies[index].split()[:5]
        values = [self.build.number(w, index, k, block.symbol, None) for k, w in enumerate(words)]
        if len(words) < 5:
            self.build.fault_line(
                "form.count",
                index,
                f"{len(words)} numbers in a shell heading; it has five: {FIVE}",
                element=block.symbol,
                measured=len(words),
                expected=5,
                remedy="restore the missing number from the source",
            )
        for at, value in enumerate(values[:3]):
            if value is not None and not value.is_integer():
                before = "perhaps a number before it was lost"
                say_not_whole(self.build, block, index, at, words[at], before)
                values[at] = None
        return values + [None] * (5 - len(values))

    def unknown(
        self, block: BlockDraft, index: int, kind: float | None, shape: float | None
    ) -> None:
        """A shell that cannot be read for what its first two numbers say, or do not say."""
        words = self.build.bodies[index].split()
        block.complete = False
        block.end = max(block.end, index)
        if kind is not None and kind != 0.0:
            built_in = kind in (1.0, 2.0)
            message = (
                f"kind {words[0]} is a built-in shell, which has no rows, but rows follow"
                if built_in
                else f"{words[0]} is no kind of shell: 0 has rows, 1 and 2 are built in"
            )
            self.build.fault_word(
                "form.syntax",
                index,
                0,
                message,
                element=block.symbol,
                measured=words[0],
                expected=0,
                remedy="write 0 for a shell whose rows follow",
            )
        elif shape is not None and kind is not None:
            self.build.fault_word(
                "form.letter",
                index,
                1,
                f"{words[1]} is no shell type: {_TYPE_LIST}",
                element=block.symbol,
                measured=words[1],
                expected=_TYPE_LIST,
                remedy="write the number of the shell's type",
            )

    def built_in(self, block: BlockDraft, index: int) -> None:
        """A shell whose numbers are known to the program alone: said once for each element."""
        if block.complete:
            self.build.fault_line(
                "form.syntax",
                index,
                f"this shell of {block.symbol} is built into the program that reads the list: its "
                "numbers stand nowhere in the text, and it is not judged",
                severity="note",
                element=block.symbol,
                remedy="write the shells out, with kind 0 and their rows, to have them judged",
            )
        block.complete = False
        block.end = max(block.end, index)

    def check_charge(
        self, block: BlockDraft, index: int, letters: str, capacity: int, charge: float
    ) -> None:
        if not 0.0 <= charge <= capacity:
            self.build.fault_word(
                "form.number",
                index,
                3,
                f"a formal charge of {charge:g} electrons; one {letters} shell holds 0 to "
                f"{capacity}",
                severity="warning",
                element=block.symbol,
                measured=charge,
                expected=capacity,
                remedy="mend the formal charge, or the shell type before it",
            )


def _spelt(words: list[str]) -> tuple[str, str, float] | None:
    """Letters, number of rows and scale factor of a plain shell heading."""
    if len(words) != 5 or words[0] != "0" or not _WHOLE.issuperset(words[1] + words[2]):
        return None
    with suppress(ValueError):
        shape, charge, scale = int(words[1]), plain(words[3]), plain(words[4])
        if shape < len(TYPES) and 0.0 <= charge <= TYPES[shape][1]:
            return (TYPES[shape][0], words[2], scale) if is_sensible(scale) else None
    return None
