"""Elements of the layout `slashes`: their tokens sorted, their parts held against each other."""

from collections.abc import Iterator
from dataclasses import dataclass, field
from itertools import pairwise, zip_longest

from lark import Token

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, index_of, integer
from overlapse.grammar.elements import number_of, symbol_of
from overlapse.grammar.model import Potential, letter_of
from overlapse.grammar.numbers import NUMBER, read_number
from overlapse.grammar.pieces.channels import joined_channels
from overlapse.grammar.pieces.tables import Tables


def highest_of(words: list[str]) -> int | None:
    """The highest angular momentum on a charge line."""
    value = read_number(words[1]).value if len(words) > 1 else None
    return int(value) if value is not None and 0 <= value < 100 and value % 1 == 0 else None


@dataclass
class Sorter:
    """Sorts the tokens of a text element by element; ``tails`` keeps what is passed over."""

    build: Build
    tables: Tables
    tails: dict[str, list[Token]] = field(default_factory=dict)

    def settled(self, tokens: list[Token]) -> Iterator[Token]:
        """The tokens element by element, with all told apart that only its place tells."""
        starts = [at for at, token in enumerate(tokens) if token.type == "HEADING"]
        for start, end in pairwise([*starts, len(tokens)]):
            below = next((at for at in range(start, end) if tokens[at].type in ("PP", "TAIL")), end)
            yield from self.settled_tables(tokens[start:below])
            yield from self.settled_tail(tokens[below:end])

    def settled_tables(self, tokens: list[Token]) -> Iterator[Token]:
        """Heading, charge and tables; what follows a complete element is somebody else's."""
        numeric = [at for at, t in enumerate(tokens) if t.type in ("HEAD", "COUNT", "ROWS")]
        if not numeric:
            yield from tokens
            return
        yield from tokens[: numeric[0]]
        charge, tokens = self.split_charge(tokens[numeric[0] :])
        yield from charge
        highest = highest_of(charge[0].split()) if charge else None
        tables = 0
        tokens = self.tables.joined(tokens)
        for at, token in enumerate(tokens):
            if token.type == "TEXT" and highest is not None and tables > highest:
                self.check_foreign(tokens[at:])
                return
            tables += token.type in ("HEAD", "LOST")
            yield token

    def split_charge(self, tokens: list[Token]) -> tuple[list[Token], list[Token]]:
        """The line of charge and highest l, if the first numbers are that, and what follows."""
        first, following = tokens[0], tokens[1].type if len(tokens) > 1 else ""
        run = self.tables.run(first)
        if first.type == "ROWS":
            row = run.rows[0]
            fits = len(row) == 2 and integer(row[1]) is not None
            fits = fits or (len(run.rows) == 1 and following == "HEAD")
        else:
            fits = following != "ROWS"
        if not fits:
            return [], tokens
        index, rest = index_of(first), tokens[1:]
        if len(run.rows) > 1:
            rest.insert(0, Token("ROWS", "", line=run.lines[1], end_line=first.end_line))
        return [Token("CHARGE", self.build.bodies[index], line=index, end_line=index + 1)], rest

    def settled_tail(self, tokens: list[Token]) -> Iterator[Token]:
        """A potential's channels, and one token for whatever else stands there."""
        at = 0
        if tokens and tokens[0].type == "PP":
            yield tokens[0]
            channels, at = joined_channels(self.tables, tokens, 1)
            yield from channels
        tails = []
        for token, following in zip_longest(tokens[at:], tokens[at + 1 :]):
            empty = following is None or following.type not in ("HEAD", "COUNT", "ROWS")
            if token.type == "TAIL" and not (empty and token.upper().startswith("SPECTRAL")):
                tails.append(token)
                self.tails.setdefault(token.split()[0].upper(), []).append(token)
        yield from tails[:1]
        self.check_foreign(tokens[at:])

    def check_foreign(self, tokens: list[Token]) -> None:
        """Charge and tables below a complete element have lost their heading."""
        named = [at for at, t in enumerate(tokens) if t.type == "TEXT" and t[:3].upper() != "END"]
        for at in named:
            below = next((k for k in range(at, len(tokens)) if tokens[k].type != "TEXT"), None)
            if below is None or tokens[below].type not in ("HEAD", "COUNT", "ROWS"):
                continue
            _, rest = self.split_charge(tokens[below:])
            if [token.type for token in rest[:2]] == ["HEAD", "ROWS"]:
                self.say_lost_heading(tokens[at])
                return

    def say_lost_heading(self, line: Token) -> None:
        self.build.fault_line(
            "form.syntax",
            index_of(line),
            f"{str(line)!r} stands where the heading of an element belongs, since tables follow",
            expected="a heading such as `/C.name.author.9s4p1d.3s2p1d.`",
            remedy="restore the heading: a slash, the symbol, and fields with points between",
        )


@dataclass
class Element:
    """What the lines of one element said besides its tables."""

    block: BlockDraft
    fields: list[str]
    charge: float | None = None
    highest: int | None = None
    charge_line: int | None = None
    tail: Token | None = None
    options: set[str] = field(default_factory=set)
    cartesian: set[str] = field(default_factory=set)

    @property
    def has_core(self) -> bool:
        return self.tail is not None or "ecp" in (name.strip().lower() for name in self.fields)

    def read_charge(self, build: Build, line: Token) -> None:
        index, words = index_of(line), line.split()
        self.charge_line = index
        symbol = self.block.symbol
        charge = build.number(words[0], index, 0, symbol, None)
        surplus = any(map(NUMBER.fullmatch, words[2:]))
        self.highest = None if surplus else highest_of(words)
        if self.highest is not None:
            if NUMBER.fullmatch(words[0]):
                self.charge = charge  # a misspelt one is not held against others
            if words[1] != str(self.highest):
                build.number(words[1], index, 1, symbol, None)
            return
        build.fault_line(
            "form.syntax",
            index,
            f"{str(line)!r} should give the charge and the highest angular momentum",
            element=symbol,
            expected="two numbers such as `6.0   2`",
            remedy="write both numbers",
        )

    def check_owner(self, build: Build, index: int, symbol: str, electrons: int) -> None:
        """A potential and the element it stands with must agree."""
        block = self.block
        number = number_of(symbol)
        if number != block.number:
            build.fault_word(
                "form.element",
                index,
                1,
                f"this potential of {symbol} stands with {block.symbol}",
                element=block.symbol,
                measured=symbol,
                expected=block.symbol,
                remedy="write the symbol of the element, or exchange the potential",
            )
        elif number and self.charge is not None and electrons + self.charge != number:
            build.fault_word(
                "form.count",
                index,
                2,
                f"{electrons} electrons replaced and a charge of {self.charge:g} do not make "
                f"the {number} of {block.symbol}",
                element=block.symbol,
                measured=electrons,
                expected=number - self.charge,
                remedy="correct the number of electrons or the charge above the tables",
            )

    def check_tables(self, build: Build, heading: Token, found: int | None) -> None:
        symbol, highest = self.block.symbol, self.highest
        if self.charge_line is None:
            build.fault_line(
                "form.syntax",
                index_of(heading),
                f"below the title of {symbol} the line of the charge and the highest angular "
                "momentum is missing",
                element=symbol,
                expected="two numbers such as `6.0   2`",
                remedy="write both numbers on a line below the title",
            )
        elif highest is not None and found is not None and found != highest + 1:
            self.block.complete = False
            build.fault_word(
                "form.count",
                self.charge_line,
                1,
                f"highest angular momentum {highest} ({letter_of(highest)}) makes {highest + 1} "
                f"tables; {found} follow",
                element=symbol,
                measured=found,
                expected=highest + 1,
                remedy="a table or its heading was lost or added, or the number is wrong",
            )

    def check_charge(self, build: Build) -> None:
        """Without a potential the charge is that of the nucleus, with one it is less."""
        charge, number = self.charge, self.block.number
        if not charge or number is None or self.charge_line is None:
            return
        core = self.has_core or self.block.potential is not None
        if charge == number or (core and charge < number):
            return
        other = int(charge) if charge == int(charge) and 1 <= charge <= 118 else None
        build.fault_word(
            "form.element",
            self.charge_line,
            0,
            f"the heading speaks of {self.block.symbol}, whose charge is {number}, this line "
            f"of {charge:g}" + (f", which is {symbol_of(other)}" if other else ""),
            severity="warning",
            element=self.block.symbol,
            measured=charge,
            expected=number,
            remedy="correct the symbol or the charge, or add the core potential that is missing",
        )

    def settle_core(self) -> None:
        """Of a potential whose terms are not modelled at least the electrons are known."""
        block, charge = self.block, self.charge
        if block.potential is None and self.has_core and block.number and charge is not None:
            electrons = block.number - int(charge)
            if electrons >= 0:
                line = index_of(self.tail) if self.tail is not None else block.line
                block.potential = Potential(electrons, (), line + 1)

    def settle_functions(self, build: Build) -> None:
        """Cartesian functions can be meant for some l only, which the model cannot hold."""
        block = self.block
        momenta = {letter_of(l) for shell in block.shells for l in shell.angular if l > 1}
        if "all" in self.cartesian or (momenta and momenta <= self.cartesian):
            block.functions = "cartesian"
        elif momenta & self.cartesian:
            build.fault_line(
                "form.syntax",
                block.line,
                f"only some functions of {block.symbol} are Cartesian "
                f"({', '.join(sorted(self.cartesian))}); this is not looked at further",
                severity="note",
                element=block.symbol,
                remedy="none is needed where this is meant",
            )
