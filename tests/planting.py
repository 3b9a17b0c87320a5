"""Slips planted one at a time in published sets, as people and programs make them.

Published sets are the files in the keyworded layout that are bundled with PySCF, cut down to
H-Kr.  A slip is an edit of the text; whoever judges the text afterwards sees nothing else.
"""

import random
import re
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache, cached_property
from itertools import pairwise
from pathlib import Path

from overlapse.grammar.elements import number_of, row_of
from overlapse.grammar.model import Block, Document, Shell, Span
from overlapse.grammar.reading import read_text
from overlapse.lint.engine import FileAudit, judge
from overlapse.lint.settings import Settings
from overlapse.rules.finding import Finding

LAST = 36  # krypton


@dataclass(frozen=True)
class Planted:
    """A text with one slip.

    elements: symbols of the elements at fault.  shell: name of the shell ("s-1") where it is about
    one shell.  true, wrong: the number that stood there and the one that stands there now, where
    it is about one number.
    """

    text: str
    elements: tuple[str, ...]
    shell: str | None = None
    true: float | None = None
    wrong: float | None = None
    told: str = ""


class Published:
    """A published set: its name (a file below the folder of bundled sets), text, and document."""

    def __init__(self, name: str, text: str) -> None:
        self.name = name
        self.text = cut(text)
        self.lines = self.text.split("\n")

    @cached_property
    def document(self) -> Document:
        return read_text(self.text, self.path)

    @property
    def path(self) -> str:
        return self.name.rpartition("/")[2]

    @cached_property
    def blocks(self) -> dict[int, Block]:
        """The blocks by atomic number; of an element given twice the first."""
        found: dict[int, Block] = {}
        for block in self.document.blocks:
            if block.shells and block.potential is None:
                found.setdefault(block.atomic_number, block)
        return found

    def judged(self, text: str | None = None, **options: bool) -> FileAudit:
        document = self.document if text is None else read_text(text, self.path)
        return judge(document, settings=Settings(), **options)

    def without(self, first: int, last: int) -> str:
        """The text without the lines from ``first`` to before ``last`` (0-based)."""
        return "\n".join(self.lines[:first] + self.lines[last:])


def cut(text: str) -> str:
    """The text without the elements behind krypton and without core potentials."""
    kept: list[str] = []
    inside, is_heavy = True, False
    for line in text.split("\n"):
        words = line.split()
        first = words[0] if words else ""
        if first.upper() in ("ECP", "SO"):
            inside = False
        elif first.upper() == "BASIS":
            inside = True
        elif re.fullmatch("[A-Za-z]+", first) and len(words) > 1:
            number = number_of(first)
            is_heavy = number is not None and number > LAST
        elif first.startswith("#BASIS"):
            kept.append(line)
            continue
        is_dropped = is_heavy and first and not first.startswith("#") and first.upper() != "END"
        if inside and not is_dropped:
            kept.append(line)
    # The comment on the composition of a heavy element stands before its block.
    tidy = [
        line
        for line, after in zip(kept, [*kept[1:], ""], strict=True)
        if not (line.startswith("#BASIS") and (not after.strip() or after[0] in "#E"))
    ]
    return "\n".join(tidy)


# ---- numbers


def respelled(word: str, value: float) -> str:
    """The value in the style of the word: its decimals and its power of ten, if it has one."""
    mantissa, mark, _ = re.fullmatch(r"([-+]?[0-9.]+)([EeDd]?)(.*)", word).groups()  # type: ignore[union-attr]
    decimals = len(mantissa.partition(".")[2])
    if mark:
        text, _, power = f"{value:.{max(decimals, 4)}E}".partition("E")
        return f"{text}{mark}{power}"
    size = len(f"{abs(value):e}".partition("e")[0])
    while decimals < 12 and abs(float(f"{value:.{decimals}f}") / value - 1.0) > 2e-4:
        decimals += 1
    return f"{value:.{min(decimals, size + 12)}f}"


def exchanged_digits(word: str, dice: random.Random) -> str | None:
    """Two neighbouring digits among the first three significant ones change places."""
    body = re.split("[EeDd]", word)[0]
    digits = [at for at, sign in enumerate(body) if sign.isdigit()]
    while digits and body[digits[0]] == "0":
        digits.pop(0)
    pairs = [(a, b) for a, b in pairwise(digits[:3]) if body[a] != body[b]]
    if not pairs:
        return None
    a, b = dice.choice(pairs)
    signs = list(word)
    signs[a], signs[b] = signs[b], signs[a]
    return "".join(signs)


Change = Callable[[str, random.Random], str | None]


def times(*factors: float) -> Change:
    return lambda word, dice: respelled(word, value_of(word) * dice.choice(factors))


def negated(word: str, _: random.Random) -> str:
    return word[1:] if word.startswith("-") else f"-{word}"


def value_of(word: str) -> float:
    return float(word.upper().replace("D", "E"))


def _written(published: Published, span: Span, change: Change, dice: random.Random,
             block: Block, shell: int) -> Planted | None:  # fmt: skip
    text = published.text
    word = text[span[0] : span[1]]
    new = change(word, dice)
    if new is None or value_of(new) == value_of(word):
        return None
    name = block.names[shell]
    return Planted(
        text[: span[0]] + new + text[span[1] :],
        (block.symbol,),
        name,
        value_of(word),
        value_of(new),
        f"{block.symbol} {name}: {word} -> {new}",
    )


def _any_block(published: Published, dice: random.Random) -> Block:
    return dice.choice(list(published.blocks.values()))


def exponent(change: Change) -> "Slip":
    """A slip of one exponent, drawn from all exponents of a block."""

    def plant(published: Published, dice: random.Random) -> Planted | None:
        block = _any_block(published, dice)
        places = [(at, r) for at, s in enumerate(block.shells) for r in range(len(s.exponents))]
        at, row = dice.choice(places)
        cells = block.shells[at].cells
        assert cells is not None
        return _written(published, cells.span(row), change, dice, block, at)

    return plant


def coefficient(change: Change) -> "Slip":
    """A slip of one coefficient, drawn from all contractions of several primitives of a block."""

    def plant(published: Published, dice: random.Random) -> Planted | None:
        block = _any_block(published, dice)
        places = [
            (at, int(row), function.column)
            for at, function in block.contracted
            if len(function.exponents) > 1
            for row in function.rows
        ]
        if not places:
            return None
        at, row, column = dice.choice(places)
        cells = block.shells[at].cells
        assert cells is not None
        return _written(published, cells.span(row, column), change, dice, block, at)

    return plant


Slip = Callable[[Published, random.Random], Planted | None]

# ---- rows and shells


def _lines(shell: Shell) -> tuple[int, int]:
    """First line of a shell (its heading) and the line past its last row, 0-based."""
    assert shell.cells is not None
    return shell.line - 1, shell.cells.last


def row_lost(published: Published, dice: random.Random) -> Planted | None:
    block = _any_block(published, dice)
    long = [at for at, shell in enumerate(block.shells) if len(shell.exponents) > 1]
    if not long:
        return None
    at = dice.choice(long)
    shell = block.shells[at]
    row = dice.randrange(len(shell.exponents))
    line = shell.place(row).line - 1
    return Planted(
        published.without(line, line + 1), (block.symbol,), told=f"{block.symbol} "
        f"{block.names[at]} row {row + 1} of {len(shell.exponents)}",
    )  # fmt: skip


def shell_lost(published: Published, dice: random.Random) -> Planted | None:
    block = _any_block(published, dice)
    at = dice.randrange(len(block.shells))
    told = f"{block.symbol} {block.names[at]}"
    return Planted(published.without(*_lines(block.shells[at])), (block.symbol,), told=told)


def shell_twice(published: Published, dice: random.Random) -> Planted | None:
    block = _any_block(published, dice)
    at = dice.randrange(len(block.shells))
    first, last = _lines(block.shells[at])
    lines = [*published.lines[:last], *published.lines[first:last], *published.lines[last:]]
    return Planted("\n".join(lines), (block.symbol,), told=f"{block.symbol} {block.names[at]}")


def near_twin(published: Published, dice: random.Random) -> Planted | None:
    """An exponent becomes nearly that of its neighbour: of the shell, or of the lone functions."""
    block = _any_block(published, dice)
    pairs = [
        ((at, row), (at, row + step))
        for at, shell in enumerate(block.shells)
        for row in range(len(shell.exponents))
        for step in (-1, 1)
        if 0 <= row + step < len(shell.exponents)
    ]
    lone = [at for at, shell in enumerate(block.shells) if len(shell.exponents) == 1]
    pairs += [
        ((one, 0), (two, 0))
        for one in lone
        for two in lone
        if abs(one - two) == 1 and block.shells[one].angular == block.shells[two].angular
    ]
    if not pairs:
        return None
    (at, row), (other, twin) = dice.choice(pairs)
    value = float(block.shells[other].exponents[twin])
    near = value * (1.0 + dice.choice((-1.0, 1.0)) * dice.uniform(0.003, 0.02))
    cells = block.shells[at].cells
    assert cells is not None
    return _written(
        published, cells.span(row), lambda word, _: respelled(word, near), dice, block, at
    )


def columns_exchanged(published: Published, dice: random.Random) -> Planted | None:
    """Two columns of coefficients change places; where there is one, it and the exponents do."""
    block = _any_block(published, dice)
    wide = [at for at, shell in enumerate(block.shells) if shell.coefficients.shape[1] > 1]
    one = [at for at, shell in enumerate(block.shells) if len(shell.exponents) > 1]
    if not wide and not one:
        return None
    at = dice.choice(wide or one)
    shell = block.shells[at]
    assert shell.cells is not None
    columns: tuple[int | None, int]
    columns = tuple(dice.sample(range(shell.coefficients.shape[1]), 2)) if wide else (None, 0)  # type: ignore[assignment]
    edits: list[tuple[Span, str]] = []
    for row in range(len(shell.exponents)):
        left, right = (shell.cells.span(row, column) for column in columns)
        edits.append((left, published.text[right[0] : right[1]]))
        edits.append((right, published.text[left[0] : left[1]]))
    text = replaced(published.text, edits)
    if text == published.text:
        return None
    told = f"{block.symbol} {block.names[at]} columns {columns}"
    return Planted(text, (block.symbol,), told=told)


def replaced(text: str, edits: list[tuple[Span, str]]) -> str:
    for (start, end), new in sorted(edits, reverse=True):
        text = text[:start] + new + text[end:]
    return text


# ---- whole blocks


def _neighbours(published: Published, dice: random.Random) -> tuple[Block, Block] | None:
    """A block and the next one of its row, the order by chance."""
    blocks = published.blocks
    pairs = [
        (blocks[z], blocks[z + 1]) for z in blocks if z + 1 in blocks and row_of(z) == row_of(z + 1)
    ]
    if not pairs:
        return None
    left, right = dice.choice(pairs)
    return (left, right) if dice.random() < 0.5 else (right, left)


def _body(published: Published, block: Block, symbol: str) -> list[str]:
    """The lines of a block's shells, headed by another symbol."""
    found: list[str] = []
    for shell in block.shells:
        first, last = _lines(shell)
        heading, *rows = published.lines[first:last]
        found += [re.sub(r"^\s*\w+", symbol, heading), *rows]
    return found


def _extent(block: Block) -> tuple[int, int]:
    return _lines(block.shells[0])[0], _lines(block.shells[-1])[1]


def _with_bodies(published: Published, bodies: list[tuple[Block, list[str]]]) -> str:
    lines = list(published.lines)
    for block, body in sorted(bodies, key=lambda pair: -pair[0].line):
        first, last = _extent(block)
        lines[first:last] = body
    return "\n".join(lines)


def elements_exchanged(published: Published, dice: random.Random) -> Planted | None:
    if (pair := _neighbours(published, dice)) is None:
        return None
    left, right = pair
    text = _with_bodies(
        published,
        [
            (left, _body(published, right, left.symbol)),
            (right, _body(published, left, right.symbol)),
        ],
    )
    return Planted(text, (left.symbol, right.symbol), told=f"{left.symbol} {right.symbol}")


def block_copied(published: Published, dice: random.Random) -> Planted | None:
    """A block holds the numbers of its neighbour; either of the two may be named."""
    if (pair := _neighbours(published, dice)) is None:
        return None
    left, right = pair
    text = _with_bodies(published, [(left, _body(published, right, left.symbol))])
    return Planted(text, (left.symbol, right.symbol), told=f"{left.symbol} holds {right.symbol}")


SLIPS: dict[str, Slip] = {
    "exponent x10 or /10": exponent(times(10.0, 0.1)),
    "exponent 30 %": exponent(times(1.3, 0.7)),
    "exponent 10 %": exponent(times(1.1, 0.9)),
    "exponent digits exchanged": exponent(exchanged_digits),
    "coefficient sign": coefficient(negated),
    "coefficient 10 %": coefficient(times(1.1, 0.9)),
    "coefficient 3 %": coefficient(times(1.03, 0.97)),
    "coefficient 1 %": coefficient(times(1.01, 0.99)),
    "row lost": row_lost,
    "shell lost": shell_lost,
    "shell twice": shell_twice,
    "near-twin exponent": near_twin,
    "elements exchanged": elements_exchanged,
    "neighbour's block copied": block_copied,
    "columns exchanged": columns_exchanged,
}


def planted(published: Published, kind: str, seed: str) -> Planted | None:
    """A slip of a kind; the same for the same seed.  None where the set offers no place for it."""
    dice = random.Random(f"{seed} {kind} {published.name}")
    for _ in range(20):
        if (found := SLIPS[kind](published, dice)) is not None:
            return found
    return None


# ---- what was found


def new_findings(clean: FileAudit, after: FileAudit, slip: Planted) -> list[Finding]:
    """Findings at the right element (and shell) that the sound set does not have there."""
    before = [_key(f, slip) for f in clean.findings]
    found = []
    for finding in after.findings:
        key = _key(finding, slip)
        if key in before:
            before.remove(key)
        elif finding.element in slip.elements and (
            slip.shell is None or (finding.shell or "").partition("/")[0] == slip.shell
        ):
            found.append(finding)
    return found


def _key(finding: Finding, slip: Planted) -> tuple[object, ...]:
    # An edit of one number leaves all lines where they are; of others only the counts compare.
    line = finding.line if slip.shell else None
    return finding.rule, finding.severity, finding.element, finding.shell, line


@cache
def bundled(name: str) -> Published:
    """A set of those bundled with PySCF, by its path below their folder without the ending."""
    import pyscf  # not everywhere; whoever asks has made sure of it

    folder = Path(pyscf.__file__).parent / "gto" / "basis"
    return Published(name, (folder / f"{name}.dat").read_text("latin-1"))
