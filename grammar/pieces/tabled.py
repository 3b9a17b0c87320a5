"""What the readers of counted tables share: an element's tables stand in the order s, p, d ...

The place of a table gives its l.  A lost table or heading would silently change the l of all that
follow, so comments such as "p-type functions" are held against the place.  Where the next comment
fits the place again, only the comment was wrong.
"""

from collections import deque
from typing import ClassVar

from lark import Token, Tree

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import BlockDraft, Node, index_of, leading
from overlapse.grammar.model import Remark, Severity, letter_of
from overlapse.grammar.numbers import looks_numeric
from overlapse.grammar.pieces.tables import Tables


class TabledReader:
    """Walks the tables of one element after the other; the layouts' readers build on it."""

    heading_example: ClassVar[str]

    def __init__(self, build: Build, tables: Tables) -> None:
        self.build = build
        self.tables = tables
        self.l = 0  # angular momentum of the next table
        self.found = 0  # tables of the element so far
        self.in_doubt = False  # whether tables are known to be missing or too many
        self.stated: deque[int | None] = deque()  # what comments say of the tables to come

    def begin(self, pieces: list[Token | Node]) -> None:
        """A new element begins, with these pieces of the tree."""
        self.l = self.found = 0
        self.in_doubt = False
        headings = [
            piece.children[0]
            for piece in pieces
            if isinstance(piece, Tree) and piece.data in ("table", "interrupted")
        ]
        self.stated = deque(
            self.tables.stated_above(index_of(heading))
            for heading in headings
            if isinstance(heading, Token)
        )

    def next_table(self) -> None:
        self.l += 1
        self.found += 1

    def in_order(self, block: BlockDraft, node: Node) -> BlockDraft:
        """The block a table belongs to: its own unless a comment shows that a heading is lost."""
        heading, stated = node.children[0], self.stated.popleft()
        assert isinstance(heading, Token)
        if stated is None or stated == self.l:
            return block
        following = self.stated[0] if self.stated else None
        if following == self.l + 1 or (following is None and 0 < stated < self.l):
            self.say_order(block, heading, stated, "the comment or the order is wrong", "warning")
            return block
        if stated == 0:
            lack = "the heading of an element is missing above it"
        elif stated > self.l:
            lack = "a table is missing above it, where an empty one would be `0 0`"
        else:
            lack = "there is a table too many above it"
        self.say_order(block, heading, stated, lack, "error")
        block.complete = False
        self.in_doubt = True
        self.l = stated
        if stated == 0:
            block = BlockDraft("unknown", None, index_of(heading), "", end=index_of(heading))
            self.build.blocks.append(block)
        return block

    def say_order(
        self, block: BlockDraft, heading: Token, stated: int, lack: str, severity: Severity
    ) -> None:
        here, there = letter_of(self.l), letter_of(stated)
        self.build.fault_line(
            "form.syntax",
            index_of(heading),
            f"the comment above speaks of {there}, but by its place this table of "
            f"{block.symbol} is {here}: {lack}",
            severity=severity,
            element=block.symbol,
            measured=here,
            expected=there,
            remedy="the tables of an element stand in the order s, p, d ... without a gap: restore "
            "what is missing, or correct the comment",
        )

    def interrupted(self, block: BlockDraft, node: Node) -> None:
        """Lines among the rows of a table."""
        block.complete = False
        for line in node.children[1:]:
            assert isinstance(line, Token)
            self.build.fault_line(
                "form.syntax",
                index_of(line),
                f"{str(line)!r} stands among the rows of a table and is no row of numbers",
                element=block.symbol,
                shell=f"{letter_of(self.l)}-1",
                remedy="make it a comment, or mend the row",
            )
        self.next_table()

    def headless(self, block: BlockDraft, node: Node) -> None:
        first = leading(node)
        self.without_heading(block, first, "rows of numbers without a heading above them")

    def unheaded(self, block: BlockDraft, node: Node) -> None:
        first = leading(node)
        what = (
            "rows of numbers without a heading above them"
            if first.type == "ROWS"
            else f"{str(first)!r} stands where the heading of a table belongs"
        )
        self.without_heading(block, first, what)

    def without_heading(self, block: BlockDraft, first: Token, what: str) -> None:
        block.complete = False
        self.build.fault_line(
            "form.syntax",
            index_of(first),
            what,
            element=block.symbol,
            shell=f"{letter_of(self.l)}-1",
            expected=f"the numbers of primitives and contractions, such as {self.heading_example}",
            remedy="write the heading of the table that these rows belong to",
        )
        self.next_table()


def take_out_comments(build: Build, signs: str) -> None:
    """Make comments of the lines that one of the signs leads."""
    for index, body in enumerate(build.bodies):
        if body and body[0] in signs and not _is_overflowed_row(body):
            build.remarks.append(Remark(body.strip(signs + " "), index + 1))
            build.bodies[index] = ""
    build.remarks.sort(key=lambda remark: remark.line)


def _is_overflowed_row(body: str) -> bool:
    """Stars for a number that did not fit its columns, with other numbers behind them."""
    first, *others = body.split()
    return bool(others) and set(first) == {"*"} and all(map(looks_numeric, others))
