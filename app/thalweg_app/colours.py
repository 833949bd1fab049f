"""Colours and line styles, for the screen and for print alike. Series colours: Okabe and Ito (2008), safe for colour-blind readers."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from thalweg_app.presenters.chart import Role

Dash = Literal["solid", "dash", "dot", "dashdot", "longdash"]


@dataclass(frozen=True)
class Palette:
    """Colours of one appearance, as #rrggbb."""

    name: str
    paper: str  # behind everything
    raised: str  # fields, tables, pictures
    sunken: str  # headers of sections and tables
    border: str
    ink: str
    muted: str  # secondary text; stale figures
    accent: str
    accent_wash: str  # selections
    on_accent: str
    good: str
    warning: str
    bad: str
    band: str  # the accuracy wash
    grid: str


LIGHT = Palette(
    name="light",
    paper="#FBFAF7",
    raised="#FFFFFF",
    sunken="#F1EFE8",
    border="#D8D4C8",
    ink="#1F2933",
    muted="#65707A",
    accent="#1F6F8B",
    accent_wash="#DCEBF0",
    on_accent="#FFFFFF",
    good="#2B7A4B",
    warning="#8A5A00",
    bad="#B3261E",
    band="#DDEFE0",
    grid="#E8E5DC",
)
DARK = Palette(
    name="dark",
    paper="#1B222A",
    raised="#222B34",
    sunken="#27313B",
    border="#3A4651",
    ink="#E6E2D8",
    muted="#98A3AC",
    accent="#5FB3CE",
    accent_wash="#27495A",
    on_accent="#10202A",
    good="#7CC79A",
    warning="#E2B55B",
    bad="#F28B82",
    band="#21362C",
    grid="#303B45",
)


@dataclass(frozen=True)
class Style:
    """How a role looks: colour, dash and mark all differ, so that grey print stays readable. Marks are matplotlib's letters."""

    colour: str
    dash: Dash
    mark: str
    width: float
    filled: bool = True  # bars: filled or hatched


#: The palette in an order in which neighbours differ most, for classes of things that have no role of their own.
OKABE_ITO = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9")

_OVERLAYS = (
    ("#E69F00", "solid", "s"),
    ("#009E73", "dash", "^"),
    ("#D55E00", "dashdot", "D"),
    ("#CC79A7", "solid", "v"),
    ("#56B4E9", "dash", "p"),
    ("#0072B2", "dashdot", "*"),
)
_CLASSICAL: tuple[tuple[str, Dash], ...] = (("#CC79A7", "dashdot"), ("#009E73", "longdash"), ("#D55E00", "dot"))


def style_of(role: Role, rank: int, palette: Palette) -> Style:
    """The look of a curve, line or bar."""
    if role == "exact":
        return Style(palette.ink, "dash", "", 1.6, filled=False)
    if role == "reference":
        return Style(palette.muted, "dot", "", 1.8)
    if role == "classical":
        colour, dash = _CLASSICAL[rank % len(_CLASSICAL)]
        return Style(colour, dash, "", 1.4)
    if role == "faint":
        return Style(palette.border if palette.name == "light" else "#55636F", "solid", "", 1.2)
    if role == "overlay":
        colour, overlay_dash, mark = _OVERLAYS[rank % len(_OVERLAYS)]
        return Style(colour, overlay_dash, mark, 1.6, filled=False)  # type: ignore[arg-type]
    return Style(palette.accent, "solid", "o", 2.0)
