"""A list of elements written in numbers alone: which line heads an element, which a shell."""

import re
from collections.abc import Iterator

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import integer
from overlapse.grammar.numbers import NUMBER, looks_numeric

# An element's number from here on announces a core potential; the atomic number is its remainder.
WITH_POTENTIAL = 200

# An absurd number of rows is not looked at ahead.
_MANY = 100
# A row that nobody could take for a heading, for its exponent has a point.
_ROW = re.compile(r"[-+]?(?:[0-9]+\.[0-9]*|\.[0-9]+)(?:[EeDd][-+]?[0-9]+)?\s")


class Lines:
    """Names the lines of a text.

    Two whole numbers may be a heading or a row, so it keeps count of what is still to come.
    """

    def __init__(self, build: Build) -> None:
        self.build = build
        self.bodies = build.bodies
        self.headings: dict[str, int] = {}  # of sound shells, with their number of rows
        self.inside = False  # a list has begun and has not ended
        self.ended = False  # some list has ended: what follows is most likely no basis
        self.rows = self.shells = 0  # announced and still to come
        self.last = ""

    def lines(self) -> Iterator[tuple[str, int, int]]:
        """Kind, first line and past the last line of each heading and of each run of rows."""
        first: int | None = None
        index = end = 0
        while index < len(self.bodies):
            body = self.bodies[index]
            index += 1
            if not body or (kind := self.kind(body, index - 1)) is None:
                continue
            if kind != "ROWS":
                if first is not None:
                    yield "ROWS", first, end
                    first = None
                yield kind, index - 1, index
            elif first is None:
                first = index - 1
            end, self.last = index, kind
            if kind == "SHELL" and self.are_rows(index, index + self.rows):
                first, end = index, index + self.rows
                index, self.rows, self.last = end, 0, "ROWS"
        if first is not None:
            yield "ROWS", first, end

    def are_rows(self, first: int, last: int) -> bool:
        """Whether lines are plain rows, as many as announced, so that none needs a closer look."""
        if not 0 < last - first < _MANY:
            return False
        widths = self.build.widths[first:last]
        fitting = widths.count(2) + widths.count(3) == last - first
        return fitting and all(map(_ROW.match, self.bodies[first:last]))

    def kind(self, body: str, index: int) -> str | None:
        """The token that a line is, or None for a line outside any list."""
        if self.inside and (count := self.headings.get(body)) is not None:
            self.shells, self.rows = self.shells - 1, count
            return "SHELL"
        words = body.split()
        if self.inside and "." in words[0] and len(words) < 4 and self.last != "NAME":
            return self.row(words, body)
        if self.inside and words[0] == "99" and words[1:] in ([], ["0"]) and self.rows < 1:
            self.inside, self.ended, self.shells = False, True, 0
            return "END"
        if (len(words) < 4 or words[2][0].isalpha()) and self.is_block(words, index):
            self.inside, self.rows = True, 0
            self.shells = integer(words[1]) or 0 if len(words) > 1 else 0
            return "BLOCK"
        if _is_shell(words) if self.inside else self.is_lost_shell(words, index):
            self.inside, self.shells = True, self.shells - 1
            self.rows = 0 if words[0] in ("1", "2") else integer(words[2]) or 0
            if words[0] == "0" and _is_shell(words, strict=True):
                self.headings[body] = self.rows
            return "SHELL"
        if not self.inside:
            return None
        if self.last == "BLOCK" and words[0].isalpha():
            return "NAME"
        if self.last == "NAME" and len(words) > 3 and looks_numeric(words[0]):
            return "CHARGES"
        return self.row(words, body)

    def row(self, words: list[str], body: str) -> str:
        if NUMBER.fullmatch(words[0]) or Build.is_damaged_row(body, self.rows > 0):
            self.rows -= 1
            return "ROWS"
        # A text below a whole block may as well be the end of the list.
        self.inside = self.rows > 0 or self.shells > 0
        return "TEXT"

    def is_block(self, words: list[str], index: int) -> bool:
        """Whether whole numbers head an element: by what follows, and by what is still to come."""
        number = integer(words[0])
        if number is None or len(words[0]) > 3 or (len(words) > 1 and integer(words[1]) is None):
            return False
        if len(words) > 2 and looks_numeric(words[2]):
            return False
        if self.inside and self.rows > 0 and self.shells > 0 and len(words) == 2:
            return False
        following, then = self.after(index)
        if following == ["INPUT"] or _is_shell(following, strict=self.ended):
            return self.inside or len(following) != 3
        if number >= WITH_POTENTIAL and len(following) == 1 and following[0].isalpha():
            return _is_shell(then) or len(then) == 7
        whole = self.inside and self.rows < 1 and self.shells < 1
        return whole and (not following or following[0] == "99" or words[1:2] == ["0"])

    def is_lost_shell(self, words: list[str], index: int) -> bool:
        """Whether a shell stands here whose element's heading is not there."""
        following = self.after(index)[0]
        return (
            not self.ended
            and _is_shell(words, strict=True)
            and len(following) in (2, 3)
            and all("." in word and looks_numeric(word) for word in following)
        )

    def after(self, index: int) -> tuple[list[str], list[str]]:
        """The words of the next two lines that are not blank; a name in capitals."""
        found = [body.split() for body in self.bodies[index + 1 : index + 9] if body][:2]
        found += [[]] * (2 - len(found))
        return [w.upper() if w.isalpha() else w for w in found[0]], found[1]


def _is_shell(words: list[str], strict: bool = False) -> bool:
    """Whether a line has the form of a shell heading, which no row has."""
    if strict:
        return (
            len(words) > 4
            and words[0] in ("0", "1", "2")
            and words[1] in ("0", "1", "2", "3", "4", "5")
            and integer(words[2]) is not None
            and all(NUMBER.fullmatch(word) for word in words[3:5])
        )
    # Four whole or nearly whole numbers are no row; three are one, unless its exponent would be 0.
    whole = [word.isdigit() or word in ("O", "o") for word in words[:3]]
    if len(words) > 4:  # far from a row: two of the three will do
        return sum(whole) > 1 and len(words[0]) == 1 and len(words[1]) < 3
    enough = len(words) == 4 or (len(words) == 3 and words[0] == "0")
    return enough and all(whole) and len(words[0]) == 1 and len(words[1]) < 3
