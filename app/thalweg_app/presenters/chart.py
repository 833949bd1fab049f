"""A picture as data: what the screen, the printed figure and the table of numbers all draw from."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from dataclasses import asdict, dataclass, field
from typing import Any, Literal

import numpy as np

from thalweg.arrays import FloatArray

#: What a curve, a line or a bar stands for; `colours.STYLES` says how each looks.
Role = Literal["variational", "exact", "reference", "classical", "overlay", "faint"]


@dataclass(frozen=True)
class Series:
    """One curve. `rank` numbers curves of the same role. x, y and spread have equal length; NaN leaves a gap.

    `spread`: half heights of error bars, two standard errors each; None where there are none.
    """

    name: str
    x: FloatArray
    y: FloatArray
    role: Role = "variational"
    rank: int = 0
    legend: bool = True
    marks: bool = True
    line: bool = True
    spread: FloatArray | None = None


@dataclass(frozen=True)
class Level:
    """A horizontal line with its name."""

    name: str
    value: float
    role: Role
    rank: int = 0


@dataclass(frozen=True)
class Band:
    """A wash between two heights, whose border is labelled in words. None: to the edge of the panel."""

    upper: float
    text: str
    lower: float | None = None


@dataclass(frozen=True)
class Bars:
    """One bar for each category; `values` in the order of the panel's categories, NaN for none."""

    name: str
    values: FloatArray
    role: Role = "variational"
    rank: int = 0


@dataclass(frozen=True)
class Panel:
    """One pair of axes. Bars stand at 0, 1, 2 ... and take their names from `categories`."""

    y_title: str
    series: tuple[Series, ...] = ()
    levels: tuple[Level, ...] = ()
    band: Band | None = None
    bars: tuple[Bars, ...] = ()
    categories: tuple[str, ...] = ()
    log: bool = False
    share: float = 1.0  # of the picture's height


@dataclass(frozen=True)
class Chart:
    """A picture: panels above one another that share x. `empty` says what to do when there is nothing to draw."""

    title: str
    x_title: str = ""
    panels: tuple[Panel, ...] = ()
    empty: str = ""
    description: str = field(default="", compare=False)

    @property
    def is_empty(self) -> bool:
        return not any(p.series or p.bars for p in self.panels)


def table_of(chart: Chart) -> tuple[list[str], list[list[Any]]]:
    """Header and rows of the numbers behind a picture, one row a point, long form."""
    rows: list[list[Any]] = []
    for panel in chart.panels:
        for series in panel.series:
            rows += [[panel.y_title, series.name, x, y] for x, y in zip(series.x.tolist(), series.y.tolist(), strict=True)]
        for level in panel.levels:
            rows.append([panel.y_title, level.name, "", level.value])
        for bars in panel.bars:
            rows += [[panel.y_title, bars.name, c, v] for c, v in zip(panel.categories, bars.values.tolist(), strict=True)]
        if panel.band is not None:
            rows.append([panel.y_title, panel.band.text, "", panel.band.upper])
    return ["quantity", "series", chart.x_title or "category", "value"], rows


def csv_of(header: list[str], rows: list[list[Any]]) -> str:
    """Comma-separated text with a decimal point and full precision."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(header)
    for row in rows:
        writer.writerow([repr(v) if isinstance(v, float) else v for v in row])
    return out.getvalue()


def chart_data(chart: Chart) -> dict[str, Any]:
    """Plain JSON data, NaN as None, for the process that draws the printed figure."""
    plain: dict[str, Any] = _plain(asdict(chart))
    return plain


def chart_from_data(data: dict[str, Any]) -> Chart:
    """The chart of `chart_data`."""
    panels = []
    for panel in data["panels"]:
        series = tuple(Series(**{**s, **{k: column(s[k]) for k in ("x", "y", "spread") if s[k] is not None}}) for s in panel["series"])
        bars = tuple(Bars(**{**b, "values": column(b["values"])}) for b in panel["bars"])
        levels = tuple(Level(**level) for level in panel["levels"])
        band = None if panel["band"] is None else Band(**panel["band"])
        kept = {"y_title": panel["y_title"], "log": panel["log"], "share": panel["share"], "categories": tuple(panel["categories"])}
        panels.append(Panel(series=series, levels=levels, band=band, bars=bars, **kept))
    return Chart(data["title"], data["x_title"], tuple(panels), data["empty"], data["description"])


def column(values: Sequence[float | None]) -> FloatArray:
    """The values as an array, NaN where there is none."""
    return np.array([np.nan if v is None else v for v in values], dtype=np.float64)


def _plain(node: Any) -> Any:
    if isinstance(node, np.ndarray):
        return [None if np.isnan(v) else float(v) for v in node]
    if isinstance(node, dict):
        return {k: _plain(v) for k, v in node.items()}
    if isinstance(node, list | tuple):
        return [_plain(v) for v in node]
    return node
