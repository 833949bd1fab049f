"""The look of the window on every desktop: fonts, palette, style sheet and icons, light or dark."""

from __future__ import annotations

import math
from functools import lru_cache
from typing import Literal

from PySide6.QtCore import QByteArray, QObject, QRectF, QSettings, QSize, Qt, Signal
from PySide6.QtGui import QColor, QFont, QFontDatabase, QGuiApplication, QIcon, QPainter, QPalette, QPixmap
from PySide6.QtSvg import QSvgRenderer
from PySide6.QtWidgets import QApplication, QLabel, QWidget

from thalweg.paths import data_folder
from thalweg_app.colours import DARK, LIGHT, Palette

Appearance = Literal["desktop", "light", "dark"]
FAMILY = "Inter"
POINT_SIZE = 9.5
#: Pixels of the grid that all distances follow.
SPACE = 8


def load_fonts() -> None:
    """Makes the bundled fonts known; without fonts of its own a bare system would show boxes."""
    for file in sorted((data_folder("resources") / "fonts").glob("*.otf")):
        QFontDatabase.addApplicationFont(str(file))


def base_font(factor: float = 1.0) -> QFont:
    """The window's font with digits of one width, so that figures stand under one another."""
    font = QFont(FAMILY)
    font.setPointSizeF(POINT_SIZE * factor)
    font.setFeature(QFont.Tag("tnum"), 1)
    return font


class Theme(QObject):
    """Holds the palette in force and tells when it changes. The style sheet comes with `dress`."""

    changed = Signal(object)

    def __init__(self, application: QApplication) -> None:
        super().__init__(application)
        self._application = application
        stored = str(QSettings().value("appearance", "desktop"))
        self.appearance: Appearance = "light" if stored == "light" else "dark" if stored == "dark" else "desktop"
        self._dressed: Palette | None = None  # of the style sheet in force
        application.setFont(base_font())
        application.styleHints().colorSchemeChanged.connect(lambda _: self._apply())
        self.palette = LIGHT
        self._apply()

    def choose(self, appearance: Appearance) -> None:
        self.appearance = appearance
        QSettings().setValue("appearance", appearance)
        self._apply()

    def dress(self) -> None:
        """Puts the style sheet in force; called once a window is built, since under a sheet Qt styles a widget anew with each move into another."""
        if self._dressed != self.palette:
            self._dressed = self.palette
            self._application.setStyleSheet(style_sheet(self.palette))

    def _apply(self) -> None:
        dark = self.appearance == "dark"
        if self.appearance == "desktop":
            dark = self._application.styleHints().colorScheme() == Qt.ColorScheme.Dark
        self.palette = DARK if dark else LIGHT
        self._application.setPalette(qt_palette(self.palette))
        if self._dressed is not None:
            self.dress()
        self.changed.emit(self.palette)


def qt_palette(p: Palette) -> QPalette:
    roles = QPalette.ColorRole
    made = QPalette()
    pairs = {
        roles.Window: p.paper,
        roles.WindowText: p.ink,
        roles.Base: p.raised,
        roles.AlternateBase: p.sunken,
        roles.Text: p.ink,
        roles.Button: p.sunken,
        roles.ButtonText: p.ink,
        roles.BrightText: p.bad,
        roles.Highlight: p.accent,
        roles.HighlightedText: p.on_accent,
        roles.Link: p.accent,
        roles.ToolTipBase: p.raised,
        roles.ToolTipText: p.ink,
        roles.PlaceholderText: p.muted,
        roles.Light: p.raised,
        roles.Midlight: p.sunken,
        roles.Mid: p.border,
        roles.Dark: p.border,
        roles.Shadow: p.border,
    }
    for role, colour in pairs.items():
        made.setColor(role, QColor(colour))
    for role in (roles.WindowText, roles.Text, roles.ButtonText):
        made.setColor(QPalette.ColorGroup.Disabled, role, QColor(p.muted))
    return made


def style_sheet(p: Palette) -> str:
    arrow, check = _mark_file("unfolded", p.muted, p.name), _mark_file("check", p.on_accent, p.name)
    return f"""
    QToolTip {{ background: {p.raised}; color: {p.ink}; border: 1px solid {p.border}; padding: 4px; }}
    QMainWindow::separator {{ width: 1px; height: 1px; background: {p.border}; }}
    QSplitter::handle {{ background: {p.border}; }}
    QSplitter::handle:horizontal {{ width: 5px; background: {p.paper}; border-left: 1px solid {p.border}; }}
    QSplitter::handle:vertical {{ height: 5px; background: {p.paper}; border-top: 1px solid {p.border}; }}
    QSplitter::handle:hover {{ border-color: {p.accent}; }}
    QMenuBar {{ background: {p.paper}; border-bottom: 1px solid {p.border}; }}
    QMenuBar::item {{ padding: 4px 9px; background: transparent; }}
    QMenuBar::item:selected {{ background: {p.accent_wash}; }}
    QMenu {{ background: {p.raised}; border: 1px solid {p.border}; padding: 4px 0; }}
    QMenu::item {{ padding: 5px 26px 5px 22px; }}
    QMenu::item:selected {{ background: {p.accent_wash}; color: {p.ink}; }}
    QMenu::item:disabled {{ color: {p.muted}; }}
    QMenu::separator {{ height: 1px; background: {p.border}; margin: 4px 0; }}
    QLineEdit, QComboBox, QPlainTextEdit {{ background: {p.raised}; color: {p.ink}; border: 1px solid {p.border}; border-radius: 3px;
        padding: 2px 6px; min-height: 20px; selection-background-color: {p.accent}; selection-color: {p.on_accent}; }}
    QLineEdit:focus, QComboBox:focus, QPlainTextEdit:focus {{ border: 1px solid {p.accent}; }}
    QLineEdit[bad="true"], QComboBox[bad="true"] {{ border: 1px solid {p.bad}; }}
    QLineEdit:disabled, QComboBox:disabled {{ color: {p.muted}; background: {p.paper}; }}
    QComboBox::drop-down {{ border: none; width: 20px; }}
    QComboBox::down-arrow {{ image: url({arrow}); width: 12px; height: 12px; }}
    QComboBox QLineEdit {{ border: none; padding: 0; min-height: 18px; }}
    QComboBox QAbstractItemView {{ background: {p.raised}; border: 1px solid {p.border}; selection-background-color: {p.accent_wash};
        selection-color: {p.ink}; }}
    QPushButton {{ background: {p.raised}; color: {p.ink}; border: 1px solid {p.border}; border-radius: 4px; padding: 4px 11px; min-height: 18px; }}
    QPushButton:hover {{ background: {p.accent_wash}; border-color: {p.accent}; }}
    QPushButton:focus {{ border-color: {p.accent}; }}
    QPushButton:pressed {{ background: {p.border}; }}
    QPushButton:disabled {{ color: {p.muted}; background: {p.paper}; border-color: {p.border}; }}
    QPushButton[role="primary"] {{ background: {p.accent}; color: {p.on_accent}; border-color: {p.accent}; font-weight: 600; padding: 5px 20px; }}
    QPushButton[role="primary"]:hover {{ background: {p.ink}; border-color: {p.ink}; color: {p.paper}; }}
    QPushButton[role="primary"]:disabled {{ background: {p.sunken}; border-color: {p.border}; color: {p.muted}; }}
    QPushButton::menu-indicator {{ image: url({arrow}); width: 11px; subcontrol-position: right center; right: 6px; }}
    QPushButton[menu="true"] {{ padding-right: 22px; }}
    QToolButton {{ background: transparent; color: {p.ink}; border: 1px solid transparent; border-radius: 4px; padding: 3px 6px; }}
    QToolButton:hover {{ background: {p.accent_wash}; }}
    QToolButton:focus {{ border-color: {p.accent}; }}
    QToolButton:disabled {{ color: {p.muted}; }}
    QToolButton[role="section"] {{ text-align: left; background: {p.sunken}; border: none; border-radius: 0; padding: 6px 8px; font-weight: 600; }}
    QToolButton[role="fold"] {{ text-align: left; padding: 2px 2px; color: {p.muted}; }}
    QCheckBox {{ spacing: 7px; }}
    QCheckBox::indicator, QTableView::indicator {{ width: 13px; height: 13px; border: 1px solid {p.muted}; border-radius: 3px;
        background: {p.raised}; }}
    QCheckBox::indicator:checked, QTableView::indicator:checked {{ background: {p.accent}; border-color: {p.accent}; image: url({check}); }}
    QCheckBox::indicator:focus {{ border-color: {p.accent}; }}
    QCheckBox::indicator:disabled {{ border-color: {p.border}; }}
    QCheckBox:focus {{ color: {p.accent}; }}
    QTabWidget::pane {{ border: none; border-top: 1px solid {p.border}; }}
    QTabBar::tab {{ background: transparent; color: {p.muted}; padding: 7px 14px 5px 14px; border: none; border-bottom: 2px solid transparent; }}
    QTabBar::tab:selected {{ color: {p.ink}; border-bottom: 2px solid {p.accent}; font-weight: 600; }}
    QTabBar::tab:hover {{ color: {p.ink}; }}
    QTabBar::tab:focus {{ color: {p.accent}; }}
    QTableView {{ background: {p.raised}; alternate-background-color: {p.paper}; border: none; gridline-color: {p.grid};
        selection-background-color: {p.accent_wash}; selection-color: {p.ink}; }}
    QHeaderView {{ background: {p.sunken}; }}
    QHeaderView::section {{ background: {p.sunken}; color: {p.muted}; border: none; border-bottom: 1px solid {p.border}; padding: 4px 8px; }}
    QTableCornerButton::section {{ background: {p.sunken}; border: none; }}
    QScrollArea {{ border: none; background: transparent; }}
    QScrollBar:vertical {{ background: transparent; width: 10px; margin: 0; }}
    QScrollBar:horizontal {{ background: transparent; height: 10px; margin: 0; }}
    QScrollBar::handle {{ background: {p.border}; border-radius: 4px; min-height: 24px; min-width: 24px; margin: 1px; }}
    QScrollBar::handle:hover {{ background: {p.muted}; }}
    QScrollBar::add-line, QScrollBar::sub-line, QScrollBar::add-page, QScrollBar::sub-page {{ background: none; border: none; width: 0; height: 0; }}
    QProgressBar {{ background: {p.sunken}; border: 1px solid {p.border}; border-radius: 4px; max-height: 8px; min-height: 8px; }}
    QProgressBar::chunk {{ background: {p.accent}; border-radius: 3px; }}
    QStatusBar {{ background: {p.sunken}; border-top: 1px solid {p.border}; }}
    QStatusBar::item {{ border: none; }}
    QLabel[role="muted"] {{ color: {p.muted}; }}
    QLabel[role="error"] {{ color: {p.bad}; }}
    QLabel[role="warning"] {{ color: {p.warning}; }}
    QLabel[role="heading"] {{ color: {p.muted}; font-weight: 600; }}
    QFrame[role="card"] {{ background: {p.raised}; border: 1px solid {p.border}; border-radius: 4px; }}
    QFrame[role="footer"] {{ background: {p.sunken}; border: none; border-top: 1px solid {p.border}; }}
    QFrame[role="help"] {{ background: {p.raised}; border: 1px solid {p.accent}; border-radius: 4px; }}
    """


def mark(widget: QWidget, name: str, value: object) -> None:
    """Sets a property that the style sheet looks at, and styles the widget anew where it has been styled."""
    if widget.property(name) == value:
        return
    widget.setProperty(name, value)
    if widget.testAttribute(Qt.WidgetAttribute.WA_WState_Polished):
        widget.style().unpolish(widget)
        widget.style().polish(widget)


def show_fresh(label: QLabel, is_fresh: bool) -> None:
    """A figure in ink, or dimmed and slanted while it is worked out again.

    By a sheet of its own, since these labels change often and styling by the window's sheet takes longer; a font that is set is lost when
    the appearance changes.
    """
    role = "figure" if is_fresh else "stale"
    if label.property("role") != role:
        label.setProperty("role", role)
        label.setForegroundRole(QPalette.ColorRole.WindowText if is_fresh else QPalette.ColorRole.PlaceholderText)
        label.setStyleSheet("" if is_fresh else "font-style: italic")


@lru_cache(maxsize=256)
def icon(name: str, colour: str, size: int = 20, disabled: str = "") -> QIcon:
    """An icon of `resources/icons` in one colour (QtSvg does not follow the text colour by itself), in another where its button is disabled."""
    made = QIcon()
    for scale in range(1, math.ceil(_sharpest()) + 1):
        made.addPixmap(pixmap(name, colour, size, scale))
        if disabled:
            made.addPixmap(pixmap(name, disabled, size, scale), QIcon.Mode.Disabled)
    return made


def _sharpest() -> float:
    """Pixels of the finest screen to one of the window's."""
    return max((screen.devicePixelRatio() for screen in QGuiApplication.screens()), default=1.0)


def pixmap(name: str, colour: str, size: int, scale: float = 1.0) -> QPixmap:
    text = (data_folder("resources") / "icons" / f"{name}.svg").read_text(encoding="utf-8")
    renderer = QSvgRenderer(QByteArray(text.replace("#000000", colour).encode()))
    drawn = QPixmap(QSize(round(size * scale), round(size * scale)))
    drawn.setDevicePixelRatio(scale)
    drawn.fill(Qt.GlobalColor.transparent)
    painter = QPainter(drawn)
    renderer.render(painter, QRectF(0, 0, size, size))
    painter.end()
    return drawn


def application_icon() -> QIcon:
    return QIcon(str(data_folder("resources") / "icons" / "thalweg.svg"))


def _mark_file(name: str, colour: str, appearance: str) -> str:
    """Style sheets take pictures from files only: an icon in one colour, drawn into the cache folder."""
    from PySide6.QtCore import QDir, QStandardPaths

    folder = QDir(QStandardPaths.writableLocation(QStandardPaths.StandardLocation.CacheLocation))
    folder.mkpath(".")
    path = folder.filePath(f"{name}-{appearance}.png")
    pixmap(name, colour, 20, 2.0).save(path)
    return path
