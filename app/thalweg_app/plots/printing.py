"""Pictures for paper and slides: the same data drawn by matplotlib as PNG, SVG or PDF. Runs in a worker process; no Qt."""

from __future__ import annotations

import io
from pathlib import Path
from typing import Any

import numpy as np

from thalweg.errors import StudyError
from thalweg.paths import data_folder
from thalweg.storage.files import write_atomically
from thalweg_app.colours import LIGHT, style_of
from thalweg_app.presenters.chart import Chart, Panel

FORMATS = ("png", "svg", "pdf")
RESOLUTION = 200  # dots an inch of a PNG
#: Fonts are kept as text.
SETTINGS: dict[str, Any] = {
    "font.family": ["Inter", "DejaVu Sans"],
    "font.size": 9,
    "svg.fonttype": "none",
    "pdf.fonttype": 42,
    "axes.unicode_minus": True,
}
_DASHES: dict[str, Any] = {"solid": "-", "dash": (0, (5, 2.5)), "dot": (0, (1.2, 1.8)), "dashdot": (0, (5, 2, 1.2, 2)), "longdash": (0, (9, 3))}
#: More marks than this would melt into one another.
MAX_MARKS = 120


def picture_format(path: Path) -> str:
    """`png`, `svg` or `pdf`, told by the ending; StudyError for any other."""
    kind = path.suffix.lower().lstrip(".")
    if kind not in FORMATS:
        raise StudyError(f"Cannot save a picture as '{path.name}'", "its ending is not png, svg or pdf", "Give the file one of these endings")
    return kind


def draw_chart(chart: Chart, path: Path) -> None:
    """Writes the chart to `path`; StudyError when the ending is unknown or the file cannot be written."""
    import matplotlib

    kind = picture_format(path)
    content = io.BytesIO()
    with matplotlib.rc_context(SETTINGS):  # some settings count when the figure is made, others when it is written
        make_figure(chart).savefig(content, format=kind, dpi=RESOLUTION, bbox_inches="tight")
    write_atomically(path, content.getvalue())


def make_figure(chart: Chart) -> Any:
    """A matplotlib figure on white, with fonts kept as text."""
    import matplotlib
    from matplotlib.figure import Figure

    _use_own_font()
    with matplotlib.rc_context(SETTINGS):
        height = 2.4 + 1.9 * max(0, len(chart.panels) - 1) + 0.6
        figure = Figure(figsize=(6.4, height), layout="constrained")
        shares = [p.share for p in chart.panels] or [1.0]
        axes = figure.subplots(len(shares), 1, sharex=True, squeeze=False, height_ratios=shares)[:, 0]
        known: set[str] = set()
        for panel, ax in zip(chart.panels, axes, strict=False):
            _draw_panel(panel, ax, known)
        axes[-1].set_xlabel(chart.x_title)
        if not chart.panels:
            axes[0].text(0.5, 0.5, chart.empty, ha="center", va="center", transform=axes[0].transAxes)
    return figure


def _use_own_font() -> None:
    from matplotlib import font_manager

    for file in sorted((data_folder("resources") / "fonts").glob("*.otf")):
        font_manager.fontManager.addfont(str(file))


def _draw_panel(panel: Panel, ax: Any, known: set[str]) -> None:
    """`known`: names that a panel above explains already."""
    ax.set_ylabel(panel.y_title)
    ax.grid(True, color=LIGHT.grid, linewidth=0.6)
    ax.set_axisbelow(True)
    for spine in ("top", "right"):
        ax.spines[spine].set_visible(False)
    if panel.log:
        ax.set_yscale("log")
    for series in panel.series:
        style = style_of(series.role, series.rank, LIGHT)
        ax.plot(
            series.x,
            series.y,
            color=style.colour,
            linestyle=_DASHES[style.dash] if series.line else "none",
            linewidth=style.width * 0.8,
            marker=style.mark if series.marks and style.mark and series.x.size <= MAX_MARKS else None,
            markersize=4,
            markerfacecolor=style.colour if style.filled else "white",
            label=series.name if series.legend else None,
        )
        if series.spread is not None:
            ax.errorbar(series.x, series.y, series.spread, fmt="none", ecolor=style.colour, elinewidth=0.8, capsize=1.5, alpha=0.7)
    for level in panel.levels:
        style = style_of(level.role, level.rank, LIGHT)
        ax.axhline(level.value, color=style.colour, linestyle=_DASHES[style.dash], linewidth=style.width * 0.8, label=level.name)
    _draw_bars(panel, ax)
    if panel.band is not None:
        _draw_band(panel, ax)
    named = {text: handle for handle, text in zip(*ax.get_legend_handles_labels(), strict=True) if text not in known}
    if named:
        ax.legend(list(named.values()), list(named), frameon=False, fontsize=8)
    known.update(named)


def _draw_bars(panel: Panel, ax: Any) -> None:
    stacked = all(np.isnan(a.values * b.values).all() for i, a in enumerate(panel.bars) for b in panel.bars[:i])
    width = 0.8 if stacked else 0.8 / max(1, len(panel.bars))
    for i, bars in enumerate(panel.bars):
        style = style_of(bars.role, bars.rank, LIGHT)
        shift = 0.0 if stacked else (i - (len(panel.bars) - 1) / 2) * width
        fill = style.colour if style.filled else "none"
        hatch = None if style.filled else "////"
        ax.bar(
            np.arange(bars.values.size) + shift, bars.values, width, color=fill, edgecolor=style.colour, hatch=hatch, linewidth=0.8, label=bars.name
        )
    if panel.categories:
        ax.set_xlim(-0.6, len(panel.categories) - 0.4)
        ax.set_xticks(range(len(panel.categories)), panel.categories, rotation=60 if len(panel.categories) > 6 else 0, fontsize=7)


def _draw_band(panel: Panel, ax: Any) -> None:
    band = panel.band
    assert band is not None
    low, high = ax.get_ylim()
    low = min(low, band.upper / 10 if panel.log else band.upper - 0.1 * (high - low))
    ax.set_ylim(low, max(high, band.upper * (3 if panel.log else 1)))
    ax.axhspan(low if band.lower is None else band.lower, band.upper, color=LIGHT.band, zorder=0)
    ax.axhline(band.upper, color=LIGHT.good, linewidth=0.8)
    ax.annotate(
        band.text,
        (0.99, band.upper),
        xycoords=("axes fraction", "data"),
        xytext=(0, -3),
        textcoords="offset points",
        ha="right",
        va="top",
        fontsize=7.5,
    )
