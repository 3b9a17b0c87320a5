"""Drawings for the page: exponent ladders, radial functions, eigenvalues."""

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from math import ceil, floor, lgamma, log, log10, nan
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
import numpy.typing as npt

from overlapse.grammar.model import Block, Floats, Function, Shell, letter_of
from overlapse.lint.webpage import vector as roles
from overlapse.lint.webpage.vector import vector
from overlapse.rules.physics.onecentre import contracted_overlap, eigenvalues

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_WIDTH = 4.7  # inches; a phone shows that in full size
_SIDE = 0.5  # for the names on the left, inches
_STYLE: dict[Any, Any] = {
    "font.size": 8.5,
    "svg.fonttype": "none",
    "svg.hashsalt": "overlapse",
    "axes.edgecolor": roles.SOFT,
    "axes.labelcolor": roles.INK,
    "axes.linewidth": 0.6,
    "text.color": roles.INK,
    "xtick.color": roles.SOFT,
    "xtick.labelcolor": roles.INK,
    "ytick.color": roles.SOFT,
    "ytick.labelcolor": roles.INK,
    "path.simplify_threshold": 0.3,
}
_MOST_LINES = 40  # of a ladder; more would not be told apart
# Levels at which programs drop functions, or a field fails.
LEVELS = (1e-4, 1e-5, 1e-6, 1e-7, 1e-8)


# Numbers beyond these are slips, and no scale could show them beside the others.
_LEAST, _MOST = 1e-12, 1e18


def on_scale(exponents: Floats) -> npt.NDArray[np.bool_]:
    """Which exponents can be drawn, same shape."""
    return (exponents >= _LEAST) & (exponents <= _MOST)


def drawable(function: Function) -> bool:
    """Whether a contracted function can be drawn over r."""
    sound = len(function.exponents) > 0 and bool(on_scale(function.exponents).all())
    return sound and float(np.abs(function.coefficients).max()) <= _MOST


class Spot(NamedTuple):
    """What is suspect: a shell, perhaps one column of it, perhaps one of its numbers.

    shell: index in the block.  column: coefficient column, None for all.  row: of the number
    pointed at, None for none.  exponent: whether that number is the exponent.  proposed: a number
    to stand there instead.
    """

    shell: int
    column: int | None = None
    row: int | None = None
    exponent: bool = False
    proposed: float | None = None


@contextmanager
def styled() -> Iterator[None]:
    """The library set up for our drawings, whatever the user's own settings are."""
    import matplotlib

    with matplotlib.rc_context():
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(_STYLE)
        yield


def ladder(
    block: Block, beside: Sequence[Block], spots: Sequence[Spot], name: str
) -> str:  # fmt: skip
    """The exponents of each shell of a block on one logarithmic scale.

    beside: the next lighter and the next heavier element of the row, as far as there are any;
    their exponents stand above and below, in grey.
    """
    kept = [k for k, shell in enumerate(block.shells) if on_scale(shell.exponents).any()]
    suspects = {spot.shell for spot in spots}
    if len(kept) > _MOST_LINES:
        kept = sorted({*(k for k in kept if k in suspects), *kept[:_MOST_LINES]})
    figure, axes = _figure(0.6 + 0.19 * len(kept))
    # All that looks alike is one line with gaps: the library takes its time for each.
    plain, whole, grey = _Dots(), _Dots(), _Dots()
    for line, k in enumerate(kept):
        shell = block.shells[k]
        here = [spot for spot in spots if spot.shell == k]
        if here:
            axes.axhspan(line - 0.5, line + 0.5, facecolor=roles.GROUND, edgecolor="none")
        for other in beside:
            if twin := _twin(other, block.names[k], shell):
                lighter = other.atomic_number < block.atomic_number
                grey.add(twin, line + (-0.3 if lighter else 0.3), False)
        suspect = bool(here) and all(spot.row is None for spot in here)
        joined = bool((np.count_nonzero(shell.coefficients, axis=0) > 1).any())
        (whole if suspect else plain).add(shell, line, joined)
        _point_at(axes, line, shell, here)
    if grey.marks[0]:
        axes.plot(*grey.marks, "|", color=roles.BESIDE, markersize=3)
    for dots, colour in ((plain, roles.MAIN), (whole, roles.SUSPECT)):
        if dots.marks[0]:
            axes.plot(*dots.marks, "o", color=colour, markersize=3.6)
            axes.plot(*dots.joints, "-", color=colour, linewidth=1.0)
    axes.set_xscale("log")
    _decades(axes)
    axes.set_yticks(range(len(kept)), [block.names[k] for k in kept])
    for label, k in zip(axes.get_yticklabels(), kept, strict=True):
        label.set_fontweight("bold" if k in suspects else "normal")
    axes.set_ylim(len(kept) - 0.4, -0.6)
    axes.set_xlabel("exponent (bohr⁻²)")
    return vector(figure, name, f"exponents of {block.symbol}, shell by shell")


def _twin(block: Block, name: str, shell: Shell) -> Shell | None:
    """The shell of the same name and length in another block."""
    found = dict(zip(block.names, block.shells, strict=True)).get(name)
    return found if found is not None and len(found.exponents) == len(shell.exponents) else None


class _Dots:
    """Marks of many shells, and the lines that join the marks of one: x and y, with gaps."""

    def __init__(self) -> None:
        self.marks: tuple[list[float], list[float]] = [], []
        self.joints: tuple[list[float], list[float]] = [], []

    def add(self, shell: Shell, y: float, joined: bool) -> None:
        at = shell.exponents[on_scale(shell.exponents)].tolist()
        self.marks[0].extend(at)
        self.marks[1].extend([y] * len(at))
        if joined:
            self.joints[0].extend([*at, nan])
            self.joints[1].extend([y] * (len(at) + 1))


def _point_at(axes: "Axes", line: int, shell: Shell, spots: list[Spot]) -> None:
    """A diamond around each number pointed at, a cross where another one is proposed."""
    for spot in spots:
        if spot.row is None or not on_scale(shell.exponents)[spot.row]:
            continue
        axes.plot(
            [float(shell.exponents[spot.row])],
            [line],
            "D",
            color=roles.SUSPECT,
            markersize=7.5,
            markerfacecolor="none",
        )
        if spot.exponent and spot.proposed is not None and _LEAST <= spot.proposed <= _MOST:
            axes.plot([spot.proposed], [line], "x", color=roles.PROPOSED, markersize=6)


def radial(block: Block, l: int, spots: Sequence[Spot], name: str) -> str:
    """The contracted functions of one l, as r R(r) over r, each as the file writes it.

    A suspect one is bold; where a number is proposed, it is drawn once more with that number.
    """
    drawn = [(k, f) for k, f in block.functions_of(l) if drawable(f)]
    meant = [(k, f, s) for k, f in drawn for s in spots if _meant(s, k, f.column)]
    mended = [m for k, f, s in meant if (m := _mended(block.shells[k], f.column, s)) is not None]
    figure, axes = _figure(2.2)
    r = _reach([*(f.exponents for _, f in drawn), *(exponents for exponents, _ in mended)])
    axes.axhline(0.0, color=roles.SOFT, linewidth=0.6)
    for k, f in drawn:
        if not any(_meant(spot, k, f.column) for spot in spots):
            curve = radial_function(f.exponents, f.coefficients, l, r)
            axes.plot(r, curve, color=roles.BESIDE, linewidth=0.9)
    for _, f, _ in meant:
        curve = radial_function(f.exponents, f.coefficients, l, r)
        axes.plot(r, curve, color=roles.SUSPECT, linewidth=1.8)
    for exponents, coefficients in mended:
        curve = radial_function(exponents, coefficients, l, r)
        axes.plot(r, curve, color=roles.PROPOSED, linewidth=1.3, linestyle=(0, (4, 2)))
    axes.set_xscale("log")
    _decades(axes)
    axes.set_xlim(float(r[0]), float(r[-1]))
    axes.set_xlabel("r (bohr)")
    axes.set_ylabel("r R(r)  (bohr⁻¹ᐟ²)")
    axes.tick_params(axis="y", labelsize=7)
    title = f"radial functions of {block.symbol}, {letter_of(l)}"
    return vector(figure, name, title)


def _meant(spot: Spot, shell: int, column: int) -> bool:
    return spot.shell == shell and spot.column in (None, column)


def _mended(shell: Shell, column: int, spot: Spot) -> tuple[Floats, Floats] | None:
    """Exponents and coefficients of a column with the proposed number in its place."""
    if spot.row is None or spot.proposed is None:
        return None
    exponents, coefficients = np.array(shell.exponents), np.array(shell.coefficients[:, column])
    (exponents if spot.exponent else coefficients)[spot.row] = spot.proposed
    used = np.flatnonzero(coefficients)
    mended = Function(0, exponents[used], coefficients[used], used, column)
    return (mended.exponents, mended.coefficients) if drawable(mended) else None


def radial_function(exponents: Floats, coefficients: Floats, l: int, r: Floats) -> Floats:
    """r R(r) of a contraction over normalised primitives, bohr**-1/2, shape of ``r`` (bohr).

    R(r) = sum_i c_i N_i r**l exp(-a_i r**2), N_i**2 = 2 (2 a_i)**(l+3/2) / Gamma(l+3/2), so that
    the integral of (r R)**2 over r is the self-overlap of the contraction.
    Source: T. Helgaker, P. Jorgensen, J. Olsen, Molecular Electronic-Structure Theory, Wiley 2000,
    chapter 6.
    """
    power = l + 1.5
    norms = 0.5 * (log(2.0) + power * np.log(2.0 * exponents) - lgamma(power))
    with np.errstate(under="ignore"):
        terms = np.exp(
            norms + (l + 1) * np.log(r)[:, None] - exponents * r[:, None] ** 2
        )  # in logarithms, because norm and fall-off can each leave the range of numbers
        curve: Floats = terms @ coefficients
    return curve


def _reach(exponents: list[Floats]) -> Floats:
    """Points on r at which the functions are of interest, evenly spaced in its logarithm."""
    values = np.concatenate(exponents)
    low, high = 0.03 / float(values.max()) ** 0.5, 4.0 / float(values.min()) ** 0.5
    return np.geomspace(low, high, 150)


def spectra(lines: Sequence[tuple[str, Sequence[float]]], name: str, title: str) -> str:
    """Eigenvalues of overlap matrices, one line for each, with the levels of danger marked.

    lines: what a line is called, and its eigenvalues; those that are not positive stand at the
    left edge as crosses.
    """
    figure, axes = _figure(0.72 + 0.2 * len(lines))
    positive = [v for _, values in lines for v in values if v > 0]
    low = min([*positive, 1e-8]) / 3.0
    for level in LEVELS:
        axes.axvline(level, color=roles.SUSPECT, linewidth=0.7, linestyle=(0, (2, 2)))
    for row, (_, values) in enumerate(lines):
        # Of eigenvalues too close to be seen apart one is drawn: a molecule has thousands.
        sound = list({round(50 * log10(v)): v for v in values if v > 0}.values())
        axes.plot(sound, [row] * len(sound), "|", color=roles.MAIN, markersize=8)
        lost = min(1, sum(v <= 0 for v in values))
        axes.plot([low] * lost, [row] * lost, "x", color=roles.SUSPECT, markersize=6)
    axes.set_xscale("log")
    axes.set_xlim(low / 1.5, max([*positive, 1.0]) * 3.0)
    _decades(axes)
    axes.set_yticks(range(len(lines)), [words for words, _ in lines])
    axes.set_ylim(len(lines) - 0.4, -0.6)
    axes.set_xlabel("eigenvalue of the overlap matrix")
    return vector(figure, name, title)


def centre_spectra(block: Block) -> list[tuple[str, list[float]]]:
    """Eigenvalues of the overlap of a block's contracted functions on one centre, by letter."""
    lines = []
    for l in block.counts:
        functions = [f for _, f in block.functions_of(l) if len(f.exponents)]
        if functions and all(map(drawable, functions)):
            overlap = contracted_overlap(functions)
            if np.isfinite(overlap).all():
                lines.append((letter_of(l), eigenvalues(overlap).tolist()))
    return lines


def _figure(height: float) -> tuple["Figure", "Axes"]:
    """A figure with one frame; ``height`` of all of it, inches."""
    from matplotlib.figure import Figure

    figure = Figure(figsize=(_WIDTH, height), facecolor="none")
    bottom = 0.42
    axes = figure.add_axes(
        (
            _SIDE / _WIDTH,
            bottom / height,
            (_WIDTH - _SIDE - 0.08) / _WIDTH,
            (height - bottom - 0.06) / height,
        )
    )
    axes.set_facecolor("none")
    axes.spines[["top", "right"]].set_visible(False)
    return figure, axes


def _decades(axes: "Axes") -> None:
    """Marks at powers of ten, few enough to be read, written as such."""
    from matplotlib.ticker import FixedFormatter, FixedLocator, NullLocator

    low, high = axes.get_xlim()
    first, last = ceil(log10(low) - 1e-9), floor(log10(high) + 1e-9)
    if first > last:  # all within one decade: the ends say where
        marks, words = [low, high], [f"{low:.2g}", f"{high:.2g}"]
    else:
        step = max(1, ceil((last - first) / 8))
        powers = range(first, last + 1, step)
        marks, words = [10.0**p for p in powers], [_power(p) for p in powers]
    axes.xaxis.set_major_locator(FixedLocator(marks))
    axes.xaxis.set_major_formatter(FixedFormatter(words))
    axes.xaxis.set_minor_locator(NullLocator())
    axes.set_xlim(low, high)
    axes.grid(axis="x", color=roles.GRID, linewidth=0.6)
    axes.set_axisbelow(True)


def _power(p: int) -> str:
    """A power of ten in words that need no formula setting."""
    if -2 <= p <= 3:
        return f"{10.0**p:g}"  # read faster than with a raised digit
    return "10" + str(p).translate(str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹"))
