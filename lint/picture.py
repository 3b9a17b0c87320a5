"""The exponent ladder of each element as a picture.

Needs the plotting library of the extra ``report``, which is imported only here.
"""

from collections.abc import Callable, Iterator, Sequence
from io import BytesIO
from itertools import groupby
from math import ceil
from pathlib import PurePath
from textwrap import shorten
from typing import TYPE_CHECKING, Any, NamedTuple

from overlapse.grammar.elements import period_of, row_of
from overlapse.grammar.model import Block, Function, letter_of
from overlapse.lint.describe import Description, SetPortrait
from overlapse.lint.reports.lines import one_line

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

KINDS = ("svg", "png", "pdf")

# Told apart by colour-blind eyes and dark enough on white; the marks differ as well.
COLOURS = ("#0072B2", "#C04A00", "#00795B", "#A0428A", "#7A5C00", "#3B3B98", "#222222")
_MARKS = "osD^vPX"
GREY = "#A6A6A6"
INK = "#303030"
_SHIFT = 0.32  # how far beside an element's own function its neighbours' stand
_WIDEST, _NARROWEST = 27.0, 5.8  # of the whole picture, inches
_LEFT = 0.75  # room for the scale, inches
_GAP = 0.9  # between the lanes of two l, in functions
# The library's own defaults are restored first: with a dark style the colours would be illegible.
STYLE: dict[Any, Any] = {
    "font.family": "DejaVu Sans",
    "font.size": 8.5,
    "axes.edgecolor": "#808080",
    "axes.linewidth": 0.6,
    "text.color": INK,
    "axes.labelcolor": INK,
    "xtick.color": INK,
    "ytick.color": INK,
    "svg.fonttype": "none",
    "svg.hashsalt": "overlapse",
}


class PictureError(Exception):
    """Why there is no picture, in words for the user."""


class _Panel(NamedTuple):
    """One element with its neighbours in the row: next lighter, next heavier (None for none).

    line: set and period; panels of another one begin a new line.
    """

    title: str
    line: tuple[int, int]
    block: Block
    lighter: Block | None
    heavier: Block | None


class _Sizes(NamedTuple):
    """In inches: one panel, the room for one function in it; and how many stand side by side."""

    width: float
    height: float
    unit: float
    columns: int


def picture(description: Description, kind: str) -> bytes:
    """The picture as the bytes of a file; ``kind`` is svg, png or pdf.

    Raises PictureError without the extra ``report``, and for a file without functions.
    """
    several = len(description.document.sets) > 1
    panels = [panel for each in description.sets for panel in _panels(each, several)]
    if not panels:
        raise PictureError("no element of this file has a function with a positive exponent")
    sizes, title = _sizes(panels), _title(description)
    return painted(kind, lambda figure: _draw(figure, panels, sizes, title))


def painted(kind: str, draw: "Callable[[Figure], None]") -> bytes:
    """What ``draw`` puts on an empty figure, as the bytes of a file of this kind.

    Raises PictureError without the extra ``report``.
    """
    try:
        import matplotlib
        from matplotlib.backends.backend_agg import FigureCanvasAgg
        from matplotlib.figure import Figure
    except ImportError as problem:
        raise PictureError(
            "a picture needs the plotting library: pip install 'overlapse[report]'"
        ) from problem
    out = BytesIO()
    with matplotlib.rc_context():
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(STYLE)
        figure = Figure(facecolor="white")
        FigureCanvasAgg(figure)
        draw(figure)
        metadata = {"svg": {"Date": None}, "pdf": {"CreationDate": None}}.get(kind, {})
        figure.savefig(out, format=kind, dpi=150, metadata=metadata)
    return out.getvalue()


def _panels(each: SetPortrait, several: bool) -> Iterator[_Panel]:
    drawn = {b.atomic_number: b for b in each.members.blocks if _has_ladder(b)}
    for portrait in each.elements:
        z = portrait.block.atomic_number
        if not _has_ladder(portrait.block):
            continue
        row = [other for other in drawn if row_of(other) == row_of(z)]
        lighter = max((other for other in row if other < z), default=0)
        heavier = min((other for other in row if other > z), default=0)
        title = portrait.block.symbol
        if several:
            title += f", {shorten(each.claimed, 20)}" if each.claimed else f", set {each.ordinal}"
        place = (each.ordinal, period_of(z))
        yield _Panel(title, place, portrait.block, drawn.get(lighter), drawn.get(heavier))


def _has_ladder(block: Block) -> bool:
    return any((function.exponents > 0).any() for _, function in block.contracted)


def _title(description: Description) -> str:
    names = {
        each.claimed or (str(each.best.label) if each.best else "") for each in description.sets
    }
    name = names.pop() if len(names) == 1 else ""
    name = name or PurePath(description.document.path).name
    return f"{name}: exponents of the primitives"


def plain(text: str) -> str:
    """Text that is shown as it stands: a dollar sign would start a formula."""
    return one_line(text).replace("$", r"\$")


def _sizes(panels: Sequence[_Panel]) -> _Sizes:
    """Few elements get large panels, many small ones; more functions need more width."""
    least, unit, height = (3.6, 0.26, 4.4) if len(panels) <= 3 else (1.8, 0.17, 2.8)
    room = max(len(p.block.contracted) + _GAP * len(p.block.counts) for p in panels)
    width = max(least, 0.3 + unit * room)
    return _Sizes(width, height, unit, max(1, int(_WIDEST / width)))


def _lines(panels: Sequence[_Panel], columns: int) -> list[list[_Panel]]:
    """Panels line by line: a period begins a new line, unless all fit on one."""
    if len(panels) <= columns:
        return [list(panels)]
    lines = []
    for _, run in groupby(panels, key=lambda panel: panel.line):
        members = list(run)
        # Lines of one period are equally full: 18 elements make 9 and 9, not 10 and 8.
        full = ceil(len(members) / ceil(len(members) / columns))
        lines += [members[start : start + full] for start in range(0, len(members), full)]
    return lines


def _draw(figure: "Figure", panels: Sequence[_Panel], sizes: _Sizes, title: str) -> None:
    lines = _lines(panels, sizes.columns)
    columns = max(map(len, lines))
    step = max(sizes.width, (_NARROWEST - _LEFT) / columns)
    width = _LEFT + columns * step
    legend = 1 if width > 8.5 else 3  # lines
    below = 0.65 + 0.18 * legend
    height = 0.35 + len(lines) * (sizes.height + 0.5) + below
    figure.set_size_inches(width, height)
    limits = _limits(panels)
    for down, line in enumerate(lines):
        bottom = height - 0.35 - (down + 1) * (sizes.height + 0.5)
        for across, panel in enumerate(line):
            left = _LEFT + across * step
            inside = step - 0.12
            axes = figure.add_axes(
                (left / width, (bottom + 0.2) / height, inside / width, sizes.height / height)
            )
            _ladder(axes, panel, sizes.unit)
            _scale(axes, limits, across == 0)
    figure.suptitle(plain(title), x=0.5, y=1 - 0.1 / height, va="top", fontsize=11)
    figure.supxlabel("contracted functions of each angular momentum", y=(below - 0.3) / height)
    _legend(figure, panels, legend)


def _limits(panels: Sequence[_Panel]) -> tuple[float, float]:
    """One scale for all panels, bohr**-2, with a little room at both ends."""
    shells = [
        shell
        for panel in panels
        for block in (panel.block, panel.lighter, panel.heavier)
        if block
        for shell in block.shells
    ]
    exponents = [e for shell in shells for e in shell.exponents.tolist() if e > 0]
    low, high = min(exponents), max(exponents)
    room = max(2.0, 10 / (high / low) ** 0.5)  # two decades at least, for two marks on the scale
    return low / room, high * room


def _scale(axes: "Axes", limits: tuple[float, float], named: bool) -> None:
    from matplotlib.ticker import LogLocator, NullLocator

    axes.set_yscale("log")
    axes.set_ylim(limits)
    axes.yaxis.set_major_locator(LogLocator(numticks=8))
    axes.yaxis.set_minor_locator(NullLocator())
    axes.tick_params(axis="y", labelsize=7.5, width=0.5, length=3 if named else 0, labelleft=named)
    axes.tick_params(axis="x", length=0)
    axes.grid(axis="y", color="#E6E6E6", linewidth=0.6)
    axes.set_axisbelow(True)
    if named:
        axes.set_ylabel("exponent (bohr⁻²)")


def _ladder(axes: "Axes", panel: _Panel, unit: float) -> None:
    """Lanes of the angular momenta side by side; a place only neighbours fill stays grey."""
    axes.set_title(plain(panel.title), fontsize=10, fontweight="bold", pad=4)
    beside = [
        (block, x) for block, x in ((panel.lighter, -_SHIFT), (panel.heavier, _SHIFT)) if block
    ]
    letters = sorted({l for block in (panel.block, *(b for b, _ in beside)) for l in block.counts})
    start = 0.0
    ticks = []
    for l in letters:
        mark, colour = _MARKS[min(l, 6)], COLOURS[min(l, 6)]
        ladders = [(_ordered(block, l), shift, GREY) for block, shift in beside]
        ladders.append((_ordered(panel.block, l), 0.0, colour))
        for functions, shift, paint in ladders:
            for place, function in enumerate(functions):
                _rungs(axes, start + place + shift, function, paint, mark, 1.5 + 11 * unit)
        breadth = max(len(functions) for functions, _, _ in ladders)
        ticks.append((start + (breadth - 1) / 2, letter_of(l)))
        start += breadth + _GAP
        if l != letters[-1]:
            axes.axvline(start - _GAP / 2 - 0.5, color="#D0D0D0", linewidth=0.6)
    axes.set_xticks([x for x, _ in ticks], [letter for _, letter in ticks])
    axes.set_xlim(-0.9, start - _GAP - 0.1)


def _ordered(block: Block, l: int) -> list[Function]:
    """Functions of one l, lone primitives last, tight before loose: so neighbours correspond."""
    found = [f for _, f in block.functions_of(l) if (f.exponents > 0).any()]
    return sorted(found, key=lambda f: (len(f.exponents) == 1, -float(max(f.exponents))))


def _rungs(axes: "Axes", x: float, function: Function, colour: str, mark: str, size: float) -> None:
    """One contracted function: its primitives joined; a lone primitive as an open mark."""
    exponents = sorted(e for e in function.exponents.tolist() if e > 0)
    grey = colour == GREY
    axes.plot(
        [x] * len(exponents),
        exponents,
        color=colour,
        linewidth=0.6 if grey else 1.0,
        marker=mark,
        markersize=size * (0.6 if grey else 1.0),
        markerfacecolor="white" if len(exponents) == 1 else colour,
        markeredgewidth=0.6 if grey else 0.9,
        zorder=2 if grey else 3,
    )


def _legend(figure: "Figure", panels: Sequence[_Panel], lines: int) -> None:
    from matplotlib.lines import Line2D

    def sample(colour: str, size: float, lone: bool) -> Line2D:
        face = "white" if lone else colour
        line = Line2D([], [], color=colour, marker="o", markersize=size, markerfacecolor=face)
        line.set_linewidth(0 if lone else 1.0)
        return line

    samples = [
        (sample(INK, 4.0, False), "contracted function: primitives joined"),
        (sample(INK, 4.0, True), "lone primitive"),
    ]
    if any(panel.lighter or panel.heavier for panel in panels):
        told = "neighbours in the row: lighter on the left, heavier on the right"
        samples.append((sample(GREY, 2.2, False), told))
    figure.legend(
        [handle for handle, _ in samples],
        [words for _, words in samples],
        loc="lower center",
        ncols=3 if lines == 1 else 1,
        frameon=False,
        fontsize=8,
        borderaxespad=0.4,
    )
