"""What headings and rows of a shell have to agree in: letters, counts, widths."""

from collections.abc import Iterable, Iterator

from lark import Token

from overlapse.grammar.drafts import BlockDraft, Run, index_of, integer
from overlapse.grammar.lines import Lines
from overlapse.grammar.numbers import read_number

# With a j shell present the letters run on without a gap; else j is left out, as in spectroscopy.
WITHOUT_J = "spdfghiklmnoqrtuv"
_WITH_J = "spdfghijklmnoqrtuv"
_ABOVE_I = frozenset("jJkK")


class Checks(Lines):
    """Letters, counts and widths of shells, each with the fault that tells what is wrong.

    What is only declared here and in `Making` is set where a `Build` begins.
    """

    letters: dict[str, tuple[int, ...]]  # of the shells seen so far
    _j_is_used = False

    def angular_of(self, letters: str, index: int, word: int = 0) -> tuple[int, ...] | None:
        """Angular momenta for the letters of a shell heading, or None with a fault.

        "sp" gives (0, 1); a shell "l" stays (8,) here and becomes s+p where its rows say so.
        """
        if (known := self.letters.get(letters)) is not None:
            return known
        angular = self._angular_of(letters, index, word)
        if angular is not None:
            self.letters[letters] = angular
        return angular

    def _angular_of(self, letters: str, index: int, word: int) -> tuple[int, ...] | None:
        low = letters.lower()
        if low == "sp":
            return (0, 1)
        if low.startswith("l=") and low[2:].isdigit() and int(low[2:]) < len(WITHOUT_J):
            return (int(low[2:]),)
        alphabet = _WITH_J if self._j_is_used else WITHOUT_J
        if len(low) == 1 and low in alphabet:
            return (alphabet.index(low),)
        self.fault_word(
            "form.letter",
            index,
            word,
            f"{letters!r} is no letter of an angular momentum",
            measured=letters,
            expected="one of S P D F G H I, or SP",
            remedy="write the letter of the shell's angular momentum",
        )
        return None

    def shell_letters(self, tokens: Iterable[Token], word: int = 0) -> Iterator[tuple[str, int]]:
        """Letters and line (0-based) of shell headings, for `note_letters`.

        ``word`` is the letters' place in a heading (0-based).
        """
        for token in tokens:
            if token.type == "SHELLS":
                for heading, _, _ in self.shells_in(token):
                    body = self.bodies[heading]
                    if word or body[0] in _ABOVE_I:  # others tell nothing
                        yield body.split(None, word + 1)[word], heading
            elif token.type == "SHELL":
                yield token.split()[word], index_of(token)

    def note_letters(self, headings: Iterable[tuple[str, int]]) -> None:
        """Look at all shell letters of a file first: whether j is used, and where k begins."""
        above = [(letters, index) for letters, index in headings if letters in _ABOVE_I]
        self._j_is_used = any(letters.lower() == "j" for letters, _ in above)
        if above:
            letters, index = above[0]
            alphabet = _WITH_J if self._j_is_used else WITHOUT_J
            order = "with" if self._j_is_used else "without"
            self.fault_line(
                "form.letter",
                index,
                f"letters above i are counted in two ways; read here {order} j, "
                f"so {letters.upper()} is l = {alphabet.index(letters.lower())}",
                severity="note",
                measured=letters,
                expected=f"L={alphabet.index(letters.lower())}",
                remedy="write the number (L=7) where the layout allows it",
            )

    def check_count(
        self, block: BlockDraft, name: str, announced: str | None, word: int, heading: int, run: Run
    ) -> None:
        found = len(run.rows)
        if announced is not None and found and integer(announced) != found:
            block.complete = False
            self.fault_word(
                "form.count",
                heading,
                word,
                f"the heading announces {announced} rows, {found} follow",
                element=block.symbol,
                shell=name,
                measured=found,
                expected=int(announced) if len(announced) < 16 else announced,
                remedy="a row was lost or added, or the count is wrong: compare with the source",
            )
        elif not found:
            self.fault_line(
                "form.count",
                heading,
                "no rows of numbers follow this heading"
                + (f", which announces {announced}" if announced else ""),
                element=block.symbol,
                shell=name,
                measured=0,
                expected=int(announced) if announced and len(announced) < 16 else None,
                remedy="restore the shell's rows or take its heading out",
            )

    def check_widths(
        self,
        block: BlockDraft,
        name: str,
        angular: tuple[int, ...],
        width: int,
        run: Run,
        general: bool,
    ) -> bool:
        """Whether all rows have one exponent and the same, fitting number of coefficients."""
        needed = 1 + len(angular)
        fits = width > 1 and (width - 1) % len(angular) == 0 if general else width == needed
        wanted = width if fits else needed
        what = "sp shell" if len(angular) == 2 else "shell"
        holds = f"the {what} has {wanted} (an exponent and {wanted - 1} coefficient" + (
            "s)" if wanted != 2 else ")"
        )
        hint = "; perhaps an SP shell was meant" if wanted == 2 else ""
        return self.check_rows(block, name, run, wanted, holds, hint)

    def check_rows(
        self, block: BlockDraft, name: str, run: Run, wanted: int, holds: str, hint: str = ""
    ) -> bool:
        """Whether all rows have ``wanted`` numbers.

        ``holds`` says who wants them and why, ``hint`` what a row with one more might be.
        """
        wrong = [at for at, row in enumerate(run.rows) if len(row) != wanted]
        if len(wrong) == len(run.rows):
            wrong = wrong[:1]
        for at in wrong:
            count = len(run.rows[at])
            if count + sum("together" in read_number(word).slip for word in run.rows[at]) == wanted:
                continue  # nothing is lost: the word itself is the fault
            self.fault_word(
                "form.count",
                run.lines[at],
                min(count, wanted) - (count < wanted),
                f"{count} number{'s' * (count != 1)} in this row where {holds}"
                + (hint if count == wanted + 1 else ""),
                element=block.symbol,
                shell=name,
                measured=count,
                expected=wanted,
                remedy="a number was lost, added or run together with its neighbour",
            )
        return not wrong

    def check_words(self, block: BlockDraft, name: str | None, run: Run) -> None:
        """Find misspelt numbers in rows that make no shell."""
        for word, index, ordinal in run.words():
            self.number(word, index, ordinal, block.symbol, name)

    @staticmethod
    def usual_width(run: Run) -> int:
        """The number of words that most rows have."""
        widths = [len(row) for row in run.rows]
        return max(set(widths), key=widths.count, default=0)
