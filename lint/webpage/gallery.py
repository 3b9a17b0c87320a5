"""Which drawings a page gets.

A drawing takes some hundredths of a second, and a page of thousands of files should stay small: so
the worst findings get theirs, a few for each file.
"""

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from heapq import heappush, heappushpop
from math import isfinite
from typing import NamedTuple

from overlapse.grammar.convention import over_normalised
from overlapse.grammar.elements import row_of
from overlapse.grammar.model import Block, Document, letter_of
from overlapse.lint.engine import LEVELS, FileAudit
from overlapse.lint.reports.lines import one_line
from overlapse.lint.webpage import drawings
from overlapse.lint.webpage.drawings import Spot
from overlapse.rules.finding import Finding
from overlapse.rules.measured.probe import Probe

MOST_SCENES = 100  # of a page
_MOST_OF_A_FILE = 6
_MOST_PROBES = 12  # in one drawing


class Drawn(NamedTuple):
    """A drawing for the page: its name, what it shows, the ``svg`` element."""

    name: str
    caption: str
    svg: str


class Scene(NamedTuple):
    """One element of one file with what was found there.

    beside: the next lighter and next heavier element of the row, as far as the file has them.
    """

    name: str
    block: Block
    beside: tuple[Block, ...]
    findings: tuple[Finding, ...]
    probes: tuple[Probe, ...]


@dataclass
class Gallery:
    """The scenes of a page.  ``most``: how many are kept; ``left_out``: how many are not."""

    most: int = MOST_SCENES
    left_out: int = 0
    _kept: list[tuple[tuple[int, int, int], Scene]] = field(default_factory=list)

    def add(self, file: int, audit: FileAudit) -> dict[int, str]:
        """Take in the scenes of a file; returns the scene's name by the id of each finding.

        Where an audit carries ``probes``, their eigenvalues are drawn beside what was found about
        overlap.
        """
        assert audit.document is not None
        document = over_normalised(audit.document)
        probed = (p for p in audit.probes if p.values and audit.path in p.files)
        worst = sorted(probed, key=lambda p: p.values[0])
        names: dict[int, str] = {}
        found = sorted(_by_block(document, audit.findings), key=lambda pair: -_rank(pair[1]))
        for order, (block, findings) in enumerate(found):
            if not any(drawings.on_scale(shell.exponents).any() for shell in block.shells):
                continue
            if order >= _MOST_OF_A_FILE:
                self.left_out += 1
                continue
            name = f"p{file}-{order}"
            names |= {id(finding): name for finding in findings}
            scene = Scene(
                name, block, _beside(document, block), tuple(findings), tuple(worst[:_MOST_PROBES])
            )
            item = ((_rank(findings), -order, -file), scene)
            if len(self._kept) < self.most:
                heappush(self._kept, item)
            else:
                heappushpop(self._kept, item)
                self.left_out += 1
        return names

    def drawn(self) -> Iterator[tuple[str, list[Drawn]]]:
        """Each scene's name and drawings, in the order of the files."""
        with drawings.styled():
            for _, scene in sorted(self._kept, key=lambda item: (-item[0][2], -item[0][1])):
                yield scene.name, list(_drawings(scene))


def _rank(findings: Sequence[Finding]) -> int:
    return max(LEVELS.index(finding.severity) for finding in findings)


def _by_block(
    document: Document, findings: Sequence[Finding]
) -> Iterator[tuple[Block, list[Finding]]]:
    """Blocks with what was found in them, about the element as a whole or about a shell."""
    blocks = document.blocks
    found: dict[int, list[Finding]] = defaultdict(list)
    for finding in findings:
        same = [k for k, block in enumerate(blocks) if block.symbol == finding.element]
        if same:
            inside = (k for k in same if blocks[k].line <= finding.line <= blocks[k].end)
            found[next(inside, same[0])].append(finding)
    return ((blocks[k], found[k]) for k in sorted(found))


def _beside(document: Document, block: Block) -> tuple[Block, ...]:
    z = block.atomic_number
    members = next(members for members in document.sets if any(b is block for b in members.blocks))
    row = [b for b in members.blocks if row_of(b.atomic_number) == row_of(z)]
    lighter = [b for b in row if b.atomic_number < z]
    heavier = [b for b in row if b.atomic_number > z]
    return (
        *sorted(lighter, key=lambda b: -b.atomic_number)[:1],
        *sorted(heavier, key=lambda b: b.atomic_number)[:1],
    )


def _drawings(scene: Scene) -> Iterator[Drawn]:
    block = scene.block
    spots = [spot for finding in scene.findings if (spot := spot_of(block, finding)) is not None]
    svg = drawings.ladder(block, scene.beside, spots, f"{scene.name}-e")
    yield Drawn(f"{scene.name}-e", _ladder_caption(scene, spots), svg)
    letters = sorted({l for spot in spots for l in block.shells[spot.shell].angular})
    for l in letters:
        if any(drawings.drawable(function) for _, function in block.functions_of(l)):
            name = f"{scene.name}-r{l}"
            svg = drawings.radial(block, l, spots, name)
            yield Drawn(name, _radial_caption(block, l, spots), svg)
    crowded = [f for f in scene.findings if _about_overlap(f.rule)]
    if crowded and (lines := drawings.centre_spectra(block)):
        title = (
            f"Eigenvalues of the overlap of {block.symbol}'s functions on one centre, for each l"
        )
        yield _spectra(scene, "c", lines, title)
    if crowded and scene.probes:
        measured = [(str(k), probe.values) for k, probe in enumerate(scene.probes, 1)]
        names = "; ".join(f"{k}: {probe.where}" for k, probe in enumerate(scene.probes, 1))
        yield _spectra(
            scene, "m", measured, f"Eigenvalues of the overlap in geometries ({one_line(names)})"
        )


def _spectra(
    scene: Scene, suffix: str, lines: Sequence[tuple[str, Sequence[float]]], title: str
) -> Drawn:
    name = f"{scene.name}-{suffix}"
    caption = f"{title}. Dashed: 1e-8 to 1e-4, where programs drop functions."
    return Drawn(name, caption, drawings.spectra(lines, name, title))


def _about_overlap(rule: str) -> bool:
    group, _, name = rule.partition(".")
    return group == "overlap" or name == "crowded"


def _ladder_caption(scene: Scene, spots: Sequence[Spot]) -> str:
    words = [f"Exponents of {scene.block.symbol}, shell by shell; contracted primitives joined"]
    sides = {b.atomic_number < scene.block.atomic_number: b.symbol for b in scene.beside}
    told = [f"{sides[k]} {where}" for k, where in ((True, "above"), (False, "below")) if k in sides]
    if told:
        words.append(f"grey ticks: {' and '.join(told)}")
    if any(spot.row is not None for spot in spots):
        words.append("diamond: the number pointed at")
    if any(spot.exponent and spot.proposed is not None for spot in spots):
        words.append("cross: proposed instead")
    if not all(drawings.on_scale(shell.exponents).all() for shell in scene.block.shells):
        words.append("impossible exponents are left out")
    return "; ".join(words) + "."


def _radial_caption(block: Block, l: int, spots: Sequence[Spot]) -> str:
    words = [f"{letter_of(l)} functions of {block.symbol} as written; bold: suspect"]
    if any(spot.proposed is not None for spot in spots):
        words.append("dashed: with the proposed number")
    return "; ".join(words) + "."


def spot_of(block: Block, finding: Finding) -> Spot | None:
    """Where in a block a finding points; None where it names no shell of it."""
    name, _, column = (finding.shell or "").partition("/")
    if name not in block.names:
        return None
    index = block.names.index(name)
    shell = block.shells[index]
    chosen = int(column) - 1 if column.isdecimal() else None
    if chosen is not None and chosen >= shell.coefficients.shape[1]:
        chosen = None
    cell = None
    if shell.cells is not None:
        shape = (int(shell.coefficients.shape[0]), int(shell.coefficients.shape[1]))
        cell = shell.cells.at(finding.line, finding.column, shape)
    if cell is None:
        return Spot(index, chosen)
    row, at = cell
    read = shell.number(row, at)
    proposed = finding.expected
    # A slip that the reader saw through is drawn with the likely number anyway.
    if not isinstance(proposed, float) or proposed == read or not isfinite(proposed):
        proposed = None
    return Spot(index, chosen if at is None else at, row, at is None, proposed)
