"""Shells of numbered rows, below a letter, the count of the rows and a scale factor."""

from itertools import pairwise

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Run, ShellDraft, integer, shorten
from overlapse.grammar.model import Grid, letter_of
from overlapse.grammar.numbers import Reading, read_number
from overlapse.grammar.pieces.rownumbers import numbers_in_front
from overlapse.grammar.pieces.slips import check_scale, is_sensible


class Numbered:
    """Reads the shells of one text."""

    def __init__(self, build: Build) -> None:
        self.build = build
        self.known: dict[str, tuple[str, str, float] | None] = {}  # what headings say, if plain

    def note(self, heading: str) -> None:
        """Keep what a shell heading says: letters, number of rows and scale factor."""
        letters, *words = heading.split()
        scale = read_number(words[1]) if len(words) > 1 else Reading(1.0)
        plain = words and not scale.slip and is_sensible(scale.value or 0.0)
        letters = "sp" if letters.lower() == "l" else letters
        self.known[heading] = (letters, words[0], scale.value or 1.0) if plain else None

    def shell(self, block: BlockDraft, index: int, first: int, last: int) -> None:
        """A shell whose heading is line ``index``, its rows lines ``first`` up to ``last``."""
        bodies = self.build.bodies
        sound = self.known[bodies[index]]
        if sound is not None and first == index + 1 < last and bodies[index - 1]:
            letters, announced, scale = sound
            if self.build.sound_shell(
                block, letters, index, first, last, announced, scale=scale, lead=1
            ):
                return
        self.doubtful(block, index, self.build.rows_between(first, last))

    def doubtful(self, block: BlockDraft, index: int, run: Run) -> None:
        words = self.build.bodies[index].split()
        self.check_blanks(block, [index, *run.lines])
        announced = self.announced(block, words, index)
        scale = self.build.number(words[2], index, 2, block.symbol, None) if words[2:] else None
        scale = check_scale(self.build, block, index, 2, scale) if scale is not None else 1.0
        letters = "sp" if words[0].lower() == "l" else words[0]
        angular = self.build.angular_of(letters, index)
        name = block.next_name("".join(map(letter_of, angular)) if angular else letters)
        block.end = max(block.end, index, *run.lines[-1:])
        if announced is not None or not run.rows:
            self.build.check_count(block, name, announced, 1, index, run)
        if not run.rows or angular is None:
            block.complete = False
            self.build.check_words(block, name, run)
            return
        lead = numbers_in_front(
            self.build, block, name, run, 1 + len(angular), integer(announced or "")
        )
        if lead is None:
            block.complete = False
            self.build.check_words(block, name, run)
            return
        width = lead + 1 + len(angular)
        shape, grid = (len(run.rows), len(angular)), Grid(lead, width, lead + 1, width, 1)
        self.build.keep(block, ShellDraft(name, angular, index, run, 0, shape, grid, scale))

    def announced(self, block: BlockDraft, words: list[str], index: int) -> str | None:
        """The number of rows as spelled, or None with a fault."""
        if len(words) > 1 and words[1].isascii() and words[1].isdigit():
            return words[1]
        count = read_number(words[1]) if len(words) > 1 else None
        self.build.fault_word(
            "form.number" if count else "form.count",
            index,
            1 if count else 0,
            f"{shorten(words[1])!r} stands where the number of rows belongs"
            if count
            else f"the number of rows is missing after {words[0]!r}",
            element=block.symbol,
            measured=shorten(words[1]) if count else None,
            expected=count.value if count else None,
            remedy="write the number of rows that follow",
        )
        return None

    def check_blanks(self, block: BlockDraft, lines: list[int]) -> None:
        """A blank line above or within a shell: it ends the atom."""
        source = self.build.source.lines
        gaps = [b for a, b in pairwise(lines) if b != a + 1]
        for index in [lines[0], *gaps]:
            if not source[index - 1].strip():
                self.build.fault_line(
                    "form.syntax",
                    index,
                    f"a blank line ends the atom {block.symbol}, but more of it follows here",
                    element=block.symbol,
                    remedy="take the blank line above out",
                )
