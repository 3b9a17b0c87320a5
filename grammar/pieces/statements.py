"""Statements parted by commas and semicolons as tokens, and where their fields stand."""

import re
from collections.abc import Iterator
from typing import Any

from lark import Token

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import Run, index_of
from overlapse.grammar.numbers import looks_numeric
from overlapse.grammar.pieces.soundstatements import Plain, SoundRun

# A field is what stands between these signs; fields of a line are counted from 0.
FIELD = r"[^\s,;{}=]+"

_PIECE = re.compile(r"([^;{}]*)([;{}]|$)")
_REFER = re.compile(r"\w+\s*=\s*[^\s,=]+")
_IN_TEXT = frozenset("spdfghik")  # letters that head a statement without braces around it


def fields_of(statement: str) -> list[str]:
    return statement.replace(",", " ").replace("=", " ").split()


def as_numbers(statement: str) -> list[str]:
    """The fields of a statement on a line of its own, letter, symbol and range as zeros."""
    return ["0", "0", *fields_of(statement.rstrip(";"))[2:]]


class Statements:
    """Tells the statements of a text.

    Token columns are the number of fields before the statement on its line, end columns the number
    of those behind it.
    """

    def __init__(self, build: Build) -> None:
        self.bodies = bodies = build.bodies
        self.plain = Plain(build)
        self.runs: dict[int, SoundRun] = {}  # by their first line
        self.inside = False  # the braces of the basis
        self.foreign = False  # the braces of something else, such as a geometry
        self.counting = -2  # line of the last number that belongs to a core potential
        self.last = -2  # line of the last statement
        closing = (at for at in range(len(bodies) - 1, -1, -1) if "}" in bodies[at])
        self.last_closing = next(closing, -1)

    def tokens(self) -> Iterator[Token]:
        index = 0
        while index < len(self.bodies):
            past, body = index + 1, self.bodies[index]
            if body and not self.foreign and (run := self.plain.run(index, self.inside)):
                self.runs[index] = run
                past = run.shells[-1][1]
                self.last = past - 1
                yield Token("SHELLS", "", line=index, end_line=past)
            elif body:
                yield from self.line(body, index)
            index = past

    def line(self, body: str, index: int) -> Iterator[Token]:
        before = 0
        single = body.find(";") in (-1, len(body) - 1) and "{" not in body and "}" not in body
        pieces = [(body.rstrip(";"), "")] if single else _PIECE.findall(body)
        total = 0 if single else len(re.findall(FIELD, body))
        for piece, sign in pieces:
            count = 0 if single else len(fields_of(piece))
            if sign == "{":
                yield from self.opened(piece, index)
            elif not self.foreign and (kind := self.kind(piece.strip(), index)):
                self.last = index
                if kind in ("ECP", "NUMBERS"):
                    self.counting = index
                yield Token(
                    kind,
                    piece.strip(),
                    line=index,
                    column=before,
                    end_line=index + 1,
                    end_column=0 if single else total - before - count,
                )
            if sign == "}":
                if self.inside:
                    yield Token("CLOSE", "}", line=index, end_line=index + 1)
                self.inside = self.foreign = False
            before += count

    def opened(self, piece: str, index: int) -> Iterator[Token]:
        name = fields_of(piece)[-1:] if piece.rstrip().endswith("=") else []
        if [word.lower() for word in name] == ["basis"]:
            self.inside = True
            yield Token("OPEN", "basis={", line=index, end_line=index + 1)
        elif name and not self.inside:
            self.foreign = index < self.last_closing

    def kind(self, statement: str, index: int) -> str | None:
        """The token that a statement is, or None for a text that is none of ours."""
        if not statement:
            return None
        if (kind := self.known(statement, index)) is not None:
            return kind
        if self.inside:
            return None if statement.lower() == "c" else "TEXT"
        # Outside of braces a text is a slip only where it stands right between statements.
        is_between = self.last == index - 1 and index + 1 < len(self.bodies)
        if is_between and statement == self.bodies[index].rstrip(";"):
            following = self.bodies[index + 1].partition(";")[0].strip()
            return "TEXT" if following and self.known(following, index + 1) else None
        return None

    def known(self, statement: str, index: int) -> str | None:
        name, comma, rest = statement.partition(",")
        name = name.strip().lower()
        if not comma:
            return self.without_comma(statement, index)
        if name == "c":
            return "COLUMN" if self.inside or looks_numeric(rest.split(",")[0].strip()) else None
        if name == "ecp":
            return "ECP"
        if name == "set" and self.inside:
            return "SET"
        if name[:1].isdigit() or name[:1] in ("-", "+", "."):
            return self.numbers(index)
        return self.shell(name, rest)

    def without_comma(self, statement: str, index: int) -> str | None:
        if statement[0].isdigit():
            return self.numbers(index)
        return "REFER" if self.inside and _REFER.fullmatch(statement) else None

    def numbers(self, index: int) -> str | None:
        """Numbers belong to the potential above, if they follow it without a gap."""
        return "NUMBERS" if self.inside or index - self.counting < 2 else None

    def shell(self, name: str, rest: str) -> str | None:
        symbol, *exponents = (field.strip() for field in rest.split(",", 3)[:3])
        if not (name.isalpha() and symbol.isalpha() and len(name) < 8 and len(symbol) < 4):
            return None
        if exponents and not looks_numeric(exponents[0].split(" ")[0]) and _is_name(exponents):
            return "REFER" if self.inside else None
        return "SHELL" if self.inside or (name in _IN_TEXT and exponents) else None


def _is_name(fields: list[str]) -> bool:
    """Whether what follows a symbol names a set, such as cc-pvdz or 6-31g, rather than numbers."""
    first = fields[0]
    is_word = first[:1].isalpha() or ("-" in first and any(map(str.isalpha, first)))
    return is_word and not any(map(looks_numeric, fields[1:]))


def run_of(statements: list[Token], bodies: list[str]) -> tuple[Run, list[int]]:
    """The fields of statements as words, and the place of the first of each statement.

    Letter, symbol and range come as zeros, for they are no numbers; so do the fields of any text
    between the statements, so that the words of the run are those of its lines.
    """
    rows: list[list[str]] = []
    before: list[int] = []
    places: list[int] = []
    total = 0
    for at, statement in enumerate(statements):
        gap = _between(statements[at - 1], statement, bodies) if at else 0
        fields = fields_of(statement)
        rows.append(["0"] * (gap + min(2, len(fields))) + fields[2:])
        before.append((statement.column or 0) - gap)
        places.append(total + gap)
        total += len(rows[-1])
    return Run(rows, [index_of(statement) for statement in statements], before), places


def _between(one: Token, other: Token, bodies: list[str]) -> int:
    """How many fields stand between two statements."""
    first, last = index_of(one), index_of(other)
    if first == last:
        return (other.column or 0) - (one.column or 0) - len(fields_of(one))
    passed = sum(len(re.findall(FIELD, body)) for body in bodies[first + 1 : last] if body)
    return (one.end_column or 0) + passed + (other.column or 0)


def terms_of(statements: list[Token]) -> Run:
    """The fields of statements as rows."""
    return Run(
        [fields_of(statement) for statement in statements],
        [index_of(statement) for statement in statements],
        [statement.column or 0 for statement in statements],
    )


def fault_field(
    build: Build, statement: Token, field: int, rule: str, message: str, **details: Any
) -> None:
    """A fault at a field of a statement (0-based)."""
    build.fault_word(rule, index_of(statement), (statement.column or 0) + field, message, **details)
