"""Plots through Matplotlib, which is an extra of this package: pictures are rarely wanted, and it
brings a dozen others along.

Drawn without its global state, in a font it ships, so that equal data make equal bytes.
"""

from __future__ import annotations

import io
from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum
from typing import Any

from retune.errors import OutputError

INSTALL = "Install it with pip install 'retune-choir[pictures]'"


class PictureFormat(StrEnum):
    """What a plot can be written as."""

    SVG = "svg"
    PNG = "png"
    PDF = "pdf"


@dataclass(frozen=True, slots=True)
class Stem:
    """A partial: where, how high, of which series, and whether it is marked as shared."""

    hz: float
    level: float
    series: int
    marked: bool


@dataclass(frozen=True, slots=True)
class Panel:
    """A spectrum: title and stems."""

    title: str
    stems: tuple[Stem, ...]


@dataclass(frozen=True, slots=True)
class Zoom:
    """A place seen near: a title, stems of an upper and a lower spectrum as (cents from the
    middle, level, series), and words under each."""

    title: str
    upper: tuple[tuple[float, float, int], ...]
    lower: tuple[tuple[float, float, int], ...]
    upper_words: str
    lower_words: str


@dataclass(frozen=True, slots=True)
class SpectrumPlot:
    """Two spectra one above the other, and places of them seen near.

    `series` are names in the order of their numbers; `ticks` are (Hz, label) on the axis below;
    levels go from `floor` to 0 dB.
    """

    title: str
    series: tuple[str, ...]
    panels: tuple[Panel, Panel]
    zooms: tuple[Zoom, ...]
    ticks: tuple[tuple[float, str], ...]
    lowest_hz: float
    highest_hz: float
    floor: float
    zoom_cents: float
    note: str


# Colours that people with any colour vision tell apart (M. Okabe and K. Ito, Color Universal
# Design, 2008), with a shape for each as well.
_COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#000000", "#E69F00", "#56B4E9")
_SHAPES = ("o", "s", "^", "D", "v", "P", "X", "h", "<", ">", "*", "d")
_INK, _SOFT, _BAND = "#1b2433", "#5a6472", "#f0e442"
_DPI = 160
_LARGEST, _SMALLEST = 9.0, 3.0
"""Points across of the shapes in a place seen near."""


def _style(series: int) -> tuple[str, str]:
    return _COLOURS[series % len(_COLOURS)], _SHAPES[series % len(_SHAPES)]


def draw(plot: SpectrumPlot, kind: PictureFormat) -> bytes:
    """The picture as bytes of a file.

    Raises
    ------
    OutputError
        Matplotlib is not installed.
    """
    try:
        import matplotlib
        from matplotlib.figure import Figure
    except ImportError:
        raise OutputError(
            "the package matplotlib, which draws pictures, is not installed", hint=INSTALL
        ) from None
    settings: Any = {
        "svg.hashsalt": "retune",
        "svg.fonttype": "path",
        "pdf.fonttype": 42,
        "font.family": "DejaVu Sans",
        "font.size": 9.0,
        "axes.edgecolor": _SOFT,
        "text.color": _INK,
        "axes.labelcolor": _INK,
        "xtick.color": _INK,
        "ytick.color": _INK,
    }
    with matplotlib.rc_context(settings):
        height = 9.0 if plot.zooms else 6.4
        figure = Figure(figsize=(9.6, height), layout="constrained")
        ratios = [3, 3, 2.6] if plot.zooms else [3, 3]
        grid = figure.add_gridspec(len(ratios), 1, height_ratios=ratios)
        upper = figure.add_subplot(grid[0])
        lower = figure.add_subplot(grid[1], sharex=upper)
        for axes, panel in zip((upper, lower), plot.panels, strict=True):
            _panel(axes, panel, plot)
        upper.tick_params(labelbottom=False)
        lower.set_xlabel("frequency (logarithmic), as pitches in equal temperament and in Hz")
        if plot.zooms:
            inner = grid[2].subgridspec(1, len(plot.zooms))
            for index, zoom in enumerate(plot.zooms):
                _zoom(figure.add_subplot(inner[index]), zoom, plot)
        _legend(figure, plot)
        figure.supxlabel(plot.note, fontsize=7.5, color=_SOFT)
        stream = io.BytesIO()
        metadata = {
            PictureFormat.SVG: {"Date": None, "Creator": "retune"},
            PictureFormat.PDF: {"CreationDate": None, "Creator": "retune", "Producer": None},
            PictureFormat.PNG: {"Software": "retune"},
        }[kind]
        figure.savefig(stream, format=str(kind), dpi=_DPI, metadata=metadata)
    return stream.getvalue()


def _panel(axes: Any, panel: Panel, plot: SpectrumPlot) -> None:
    axes.set_xscale("log")
    axes.set_xlim(plot.lowest_hz, plot.highest_hz)
    axes.set_ylim(plot.floor, 6.0)
    axes.set_ylabel("level, dB")
    axes.set_title(panel.title, loc="left", fontsize=10)
    for stem in panel.stems:
        if stem.marked:
            axes.axvspan(stem.hz * 0.988, stem.hz * 1.012, color=_BAND, alpha=0.55, lw=0, zorder=0)
    for series in range(len(plot.series)):
        colour, shape = _style(series)
        own = [stem for stem in panel.stems if stem.series == series]
        axes.vlines([s.hz for s in own], plot.floor, [s.level for s in own], color=colour, lw=1.3)
        axes.plot([s.hz for s in own], [s.level for s in own], shape, color=colour, ms=4.5)
    axes.xaxis.set_major_locator(_fixed([hz for hz, _ in plot.ticks]))
    axes.xaxis.set_major_formatter(_labels([label for _, label in plot.ticks]))
    axes.xaxis.set_minor_locator(_fixed([]))
    axes.spines[["top", "right"]].set_visible(False)


def _fixed(places: Sequence[float]) -> Any:
    from matplotlib.ticker import FixedLocator

    return FixedLocator(list(places))


def _labels(labels: Sequence[str]) -> Any:
    from matplotlib.ticker import FixedFormatter

    return FixedFormatter(list(labels))


def _zoom(axes: Any, zoom: Zoom, plot: SpectrumPlot) -> None:
    """Equal temperament upwards, the other tuning downwards, from one line."""
    reach = -plot.floor
    for stems, way in ((zoom.upper, 1.0), (zoom.lower, -1.0)):
        for cents, level, series in stems:
            colour, shape = _style(series)
            top = way * (level - plot.floor)
            axes.vlines([cents], 0.0, [top], color=colour, lw=1.6)
            # Those that meet stand in one place: the later ones are smaller, so that all show.
            size = max(_LARGEST - 1.5 * series, _SMALLEST)
            axes.plot([cents], [top], shape, color=colour, ms=size)
    axes.axhline(0.0, color=_SOFT, lw=0.8)
    axes.set_xlim(-plot.zoom_cents, plot.zoom_cents)
    axes.set_ylim(-1.45 * reach, 1.45 * reach)
    axes.set_title(zoom.title, fontsize=8.5)
    axes.set_yticks([])
    axes.set_xlabel("cents", fontsize=8)
    axes.tick_params(labelsize=8)
    axes.text(0.5, 0.98, zoom.upper_words, transform=axes.transAxes, ha="center", va="top",
              fontsize=8)  # fmt: skip
    axes.text(0.5, 0.02, zoom.lower_words, transform=axes.transAxes, ha="center", va="bottom",
              fontsize=8)  # fmt: skip
    axes.spines[["top", "right", "left"]].set_visible(False)


def _legend(figure: Any, plot: SpectrumPlot) -> None:
    from matplotlib.lines import Line2D
    from matplotlib.patches import Patch

    handles: list[Any] = []
    for series, name in enumerate(plot.series):
        colour, shape = _style(series)
        handles.append(Line2D([], [], color=colour, marker=shape, lw=1.3, ms=5, label=name))
    handles.append(Patch(color=_BAND, alpha=0.55, label="partials that meet"))
    legend = figure.legend(
        handles=handles,
        loc="outside upper center",
        ncols=min(len(handles), 5),
        frameon=False,
        title=plot.title,
    )
    legend.get_title().set(fontsize=12, fontweight="bold")
