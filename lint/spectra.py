"""The eigenvalues of overlap matrices as a picture, and who is to blame for the small ones.

Needs the plotting library of the extra ``report``, which is imported only here.
"""

from collections.abc import Sequence
from pathlib import PurePath
from typing import TYPE_CHECKING, Any

from overlapse.lint.picture import COLOURS, GREY, PictureError, painted, plain
from overlapse.rules.measured.overlap_words import plain as in_words
from overlapse.rules.measured.probe import Probe, Small
from overlapse.rules.physics.spectrum import LADDER

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_BARS = 8  # eigenvalues whose shares are drawn
_KINDS = 6  # functions with a colour of their own; the others share grey
_FLOOR = 1e-17  # where eigenvalues that are not positive are drawn
_ALARM = "#B00020"


def spectra(probes: Sequence[Probe], kind: str) -> bytes:
    """The picture as the bytes of a file; ``kind`` is svg, png or pdf.

    The frame with the smallest eigenvalue is drawn in full, of several also the smallest eigenvalue
    of each.  Raises PictureError without the extra ``report``, and where nothing was measured.
    """
    if not probes:
        raise PictureError("no frame was measured: there is nothing to draw")
    return painted(kind, lambda figure: _draw(figure, probes))


def _draw(figure: "Figure", probes: Sequence[Probe]) -> None:
    worst = min(probes, key=lambda probe: probe.smallest)
    rows = 2 if len(probes) > 1 else 1
    figure.set_size_inches(10.0, 4.6 * rows)
    grid = figure.add_gridspec(
        rows, 2, width_ratios=(1.1, 1.0), wspace=0.3, hspace=0.36, left=0.08, right=0.97,
        top=1.0 - 0.45 / (4.6 * rows), bottom=0.8 / (4.6 * rows),
    )  # fmt: skip
    if rows == 2:
        _scan(figure.add_subplot(grid[0, :]), probes)
    _spectrum(figure.add_subplot(grid[rows - 1, 0]), worst)
    _shares(figure.add_subplot(grid[rows - 1, 1]), worst)


def _name(probe: Probe) -> str:
    return plain(f"{PurePath(probe.geometry).name}, frame {probe.frame}: {probe.formula}")


def _scale(axes: "Axes", low: float, high: float) -> None:
    from matplotlib.ticker import LogLocator, NullLocator

    axes.set_yscale("log")
    axes.set_ylim(low, high)
    axes.yaxis.set_major_locator(LogLocator(numticks=12))
    axes.yaxis.set_minor_locator(NullLocator())
    axes.grid(axis="y", color="#E6E6E6", linewidth=0.6)
    axes.set_axisbelow(True)
    axes.set_ylabel("eigenvalue of the overlap matrix")


def _threshold(axes: "Axes", probe: Probe) -> None:
    axes.axhline(probe.threshold, color=_ALARM, linewidth=1.0, linestyle=(0, (4, 2)))


def _spectrum(axes: "Axes", probe: Probe) -> None:
    """All eigenvalues in falling order, with the number of those below each step of the ladder."""
    values = [max(value, _FLOOR) for value in sorted(probe.values, reverse=True)]
    low = min(min(values) / 3.0, LADDER[-1] / 3.0)
    _scale(axes, low, max(values) * 3.0)
    place = range(1, len(values) + 1)
    axes.plot(place, values, color=COLOURS[0], marker="o", markersize=2.6, linewidth=0.8)
    lost = [(x, y) for x, y in zip(place, values, strict=True) if y < probe.threshold]
    if lost:
        axes.plot(*zip(*lost, strict=True), color=_ALARM, marker="o", markersize=3.0, linewidth=0)
    _threshold(axes, probe)
    for step, count in probe.spectrum.below.items():
        axes.axhline(step, color=GREY, linewidth=0.5, linestyle=(0, (1, 2)))
        axes.annotate(
            f"{count} below {in_words(step)}", (0.015, step), (0, -2),
            xycoords=("axes fraction", "data"), textcoords="offset points", va="top", fontsize=7,
        )  # fmt: skip
    axes.set_xlim(0, len(values) + 1)
    axes.set_xlabel(f"eigenvalues of {len(values)} functions, in falling order")
    axes.set_title(_name(probe), fontsize=9.5, loc="left")


def _shares(axes: "Axes", probe: Probe) -> None:
    """What the combinations of the smallest eigenvalues are made of."""
    shown = list(probe.blame[:_BARS])
    axes.set_title("shares in the smallest ones", fontsize=9.5, loc="left")
    if not shown:
        axes.set_axis_off()
        axes.text(0.0, 0.9, "no eigenvalue is small enough to ask who is to blame", va="top")
        return
    colours = _colours(shown)
    for down, small in enumerate(shown):
        left = 0.0
        for name, weight in _parts(small, colours):
            axes.barh(
                down, weight, left=left, height=0.7, color=colours.get(name, GREY),
                edgecolor="white", linewidth=0.5,
            )  # fmt: skip
            left += weight
    axes.set_yticks(range(len(shown)), [f"{small.value:.1e}" for small in shown])
    axes.set_ylim(len(shown) - 0.4, -0.6)
    axes.set_xlim(0.0, 1.0)
    axes.set_xticks([0, 0.25, 0.5, 0.75, 1.0], ["0", "25 %", "50 %", "75 %", "100 %"])
    _legend(axes, colours)


def _colours(shown: Sequence[Small]) -> dict[str, str]:
    """Colours of the weightiest functions."""
    weights: dict[str, float] = {}
    for small in shown:
        for share in small.kinds:
            name = str(share.function)
            weights[name] = weights.get(name, 0.0) + share.weight
    order = sorted(weights, key=lambda name: -weights[name])[:_KINDS]
    return dict(zip(order, COLOURS, strict=False))


def _parts(small: Small, colours: dict[str, str]) -> list[tuple[str, float]]:
    found: dict[str, float] = {}
    for share in small.kinds:
        name = str(share.function)
        found[name] = found.get(name, 0.0) + share.weight
    parts = [(name, found[name]) for name in colours if name in found]
    return [*parts, ("", max(0.0, 1.0 - sum(weight for _, weight in parts)))]


def _legend(axes: "Axes", colours: dict[str, str]) -> None:
    from matplotlib.patches import Patch

    handles: list[Any] = [Patch(color=colour, label=name) for name, colour in colours.items()]
    handles.append(Patch(color=GREY, label="others"))
    axes.legend(
        handles=handles, loc="upper center", bbox_to_anchor=(0.5, -0.07), ncols=3, frameon=False,
        fontsize=7.5, handlelength=1.0, columnspacing=1.2,
    )  # fmt: skip


def _scan(axes: "Axes", probes: Sequence[Probe]) -> None:
    """The smallest eigenvalue of each frame."""
    values = [max(probe.smallest, _FLOOR) for probe in probes]
    _scale(axes, min(*values, LADDER[-1]) / 3.0, max(*values, LADDER[0]) * 3.0)
    axes.plot(
        range(1, len(values) + 1), values, color=COLOURS[0], marker="o", markersize=3,
        linewidth=0.8,
    )  # fmt: skip
    for step in LADDER:
        axes.axhline(step, color=GREY, linewidth=0.5, linestyle=(0, (1, 2)))
    _threshold(axes, probes[0])
    axes.set_xlim(0.5, len(values) + 0.5)
    axes.set_xlabel("frames, in the order of the files")
    axes.set_ylabel("smallest eigenvalue")
    axes.set_title(
        f"dashed: removal threshold {in_words(probes[0].threshold)}",
        fontsize=8.5, loc="right", color=_ALARM,
    )  # fmt: skip
