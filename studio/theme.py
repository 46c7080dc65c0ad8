"""Colours of the window in a light and a dark theme, as tokens; palette and style sheet made from them.

Every pair of text and ground in `TEXT_PAIRS` has a contrast of at least `LEAST_CONTRAST` (a test computes it).
"""

from collections.abc import Mapping
from typing import Literal

from PySide6.QtCore import QObject, Signal
from PySide6.QtGui import QColor, QPalette

from studio.resources import ICONS

ThemeName = Literal["light", "dark"]

LEAST_CONTRAST = 4.5
"""Contrast of text to its ground, WCAG 2.2 success criterion 1.4.3 (level AA)."""

LIGHT: Mapping[str, str] = {
    "paper": "#FBFAF6",
    "sheet": "#FFFFFF",
    "panel": "#F4F1EA",
    "field": "#FBFAF6",
    "hover": "#EAE5DA",
    "line": "#D9D3C6",
    "grid": "#ECE8DF",
    "grid_major": "#DDD6C8",
    "ink": "#22303C",
    "soft": "#5A6672",
    "accent": "#A94B24",
    "accent_bg": "#F6E7DF",
    "second": "#1F6F78",
    "tube": "#8FA3AD",
    "tube_fill": "#DCE6EA",
    "clears": "#17594A",
    "clears_bg": "#E4F0EC",
    "warning": "#8F5608",
    "warning_bg": "#F8EEDC",
    "fails": "#9E2F24",
    "fails_bg": "#F8E4E0",
    "selection_text": "#FFFFFF",
}
DARK: Mapping[str, str] = {
    "paper": "#14202B",
    "sheet": "#182632",
    "panel": "#101A23",
    "field": "#14202B",
    "hover": "#21313F",
    "line": "#2C3F4E",
    "grid": "#213240",
    "grid_major": "#2B3F4F",
    "ink": "#E8E4D8",
    "soft": "#93A3B0",
    "accent": "#E58A5E",
    "accent_bg": "#33302F",
    "second": "#6FC3C9",
    "tube": "#7F98A6",
    "tube_fill": "#243B49",
    "clears": "#9ADBC6",
    "clears_bg": "#1F3D3A",
    "warning": "#E5B567",
    "warning_bg": "#3A3426",
    "fails": "#F2978B",
    "fails_bg": "#46292A",
    "selection_text": "#101A23",
}
TOKENS: Mapping[str, Mapping[str, str]] = {"light": LIGHT, "dark": DARK}

GROUNDS = ("paper", "sheet", "panel", "field")
TEXT_PAIRS: tuple[tuple[str, str], ...] = (
    *(
        (text, ground)
        for text in ("ink", "soft", "accent", "second", "warning", "fails", "clears")
        for ground in GROUNDS
    ),
    ("ink", "hover"),
    ("soft", "hover"),
    ("accent", "accent_bg"),
    ("ink", "accent_bg"),
    ("clears", "clears_bg"),
    ("warning", "warning_bg"),
    ("fails", "fails_bg"),
    ("selection_text", "accent"),
)
"""Text token and ground token that occur together on screen."""


def luminance(colour: QColor) -> float:
    """Relative luminance of a colour (WCAG 2.2, definition of relative luminance).

    Each channel c in 0..1 becomes c/12.92 below 0.04045, else ((c + 0.055)/1.055)^2.4; then L = 0.2126 R + 0.7152 G +
    0.0722 B.
    """

    def linear(channel: float) -> float:
        return channel / 12.92 if channel <= 0.04045 else float(((channel + 0.055) / 1.055) ** 2.4)

    return 0.2126 * linear(colour.redF()) + 0.7152 * linear(colour.greenF()) + 0.0722 * linear(colour.blueF())


def contrast(one: QColor, other: QColor) -> float:
    """Contrast ratio of two colours, 1 to 21: (L_light + 0.05)/(L_dark + 0.05)."""
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


class Theme(QObject):
    """The colours in use; `changed` is emitted after the theme has been switched."""

    changed = Signal()

    def __init__(self, name: ThemeName = "light", parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._name: ThemeName = name

    @property
    def name(self) -> ThemeName:
        """Name of the theme in use, light or dark."""
        return self._name

    @property
    def dark(self) -> bool:
        """Whether the dark theme is in use."""
        return self._name == "dark"

    def use(self, name: ThemeName) -> None:
        """Switch to a theme."""
        if name != self._name:
            self._name = name
            self.changed.emit()

    def colour(self, token: str, alpha: float = 1.0) -> QColor:
        """Colour of a token, with an opacity from 0 to 1."""
        made = QColor(TOKENS[self._name][token])
        made.setAlphaF(alpha)
        return made

    def hex(self, token: str) -> str:
        """Colour of a token as #rrggbb."""
        return TOKENS[self._name][token]

    def palette(self) -> QPalette:
        """Palette of the application."""
        made = QPalette()
        roles = {
            QPalette.ColorRole.Window: "panel",
            QPalette.ColorRole.WindowText: "ink",
            QPalette.ColorRole.Base: "field",
            QPalette.ColorRole.AlternateBase: "panel",
            QPalette.ColorRole.Text: "ink",
            QPalette.ColorRole.Button: "panel",
            QPalette.ColorRole.ButtonText: "ink",
            QPalette.ColorRole.BrightText: "fails",
            QPalette.ColorRole.Highlight: "accent",
            QPalette.ColorRole.HighlightedText: "selection_text",
            QPalette.ColorRole.Link: "second",
            QPalette.ColorRole.ToolTipBase: "sheet",
            QPalette.ColorRole.ToolTipText: "ink",
            QPalette.ColorRole.PlaceholderText: "soft",
            QPalette.ColorRole.Light: "hover",
            QPalette.ColorRole.Midlight: "line",
            QPalette.ColorRole.Mid: "line",
            QPalette.ColorRole.Dark: "line",
            QPalette.ColorRole.Shadow: "line",
        }
        for role, token in roles.items():
            made.setColor(role, self.colour(token))
        for role in (QPalette.ColorRole.WindowText, QPalette.ColorRole.Text, QPalette.ColorRole.ButtonText):
            made.setColor(QPalette.ColorGroup.Disabled, role, self.colour("soft", 0.6))
        return made

    def style_sheet(self) -> str:
        """Style sheet of the application."""
        text = _SHEET
        for token in sorted(TOKENS[self._name], key=len, reverse=True):
            text = text.replace(f"@{token};", f"{self.hex(token)};").replace(f"@{token} ", f"{self.hex(token)} ")
        for picture in ("arrow", "check"):
            text = text.replace(f"@{picture})", f"{(ICONS / f'{picture}-{self._name}.svg').as_posix()})")
        return text


_SHEET = """
QWidget { font-size: 12.5px; color: @ink; }
QMainWindow, QDialog, QWidget#board { background: @paper; }
QWidget#header, QWidget#strip { background: @panel; }
QWidget#header { border-bottom: 1px solid @line; }
QWidget#strip { border-right: 1px solid @line; }
QFrame#sheet { background: @sheet; border: 1px solid @line; }
QLabel { background: transparent; }
QLabel[role="title"] { font-size: 14px; font-weight: 600; }
QLabel[role="pane"] { font-size: 12.5px; font-weight: 600; color: @soft; }
QLabel[role="soft"] { color: @soft; }
QLabel[role="small"] { font-size: 11px; color: @soft; }
QLabel[role="refused"] { font-size: 11px; color: @fails; }
QLabel[role="design"] { font-weight: 600; }
QFrame[role="rule"] { background: @line; border: none; max-height: 1px; min-height: 1px; }
QLabel#verdict { font-weight: 600; border-radius: 3px; padding: 4px 12px; background: @hover; }
QLabel#verdict[state="clears"] { color: @clears; background: @clears_bg; }
QLabel#verdict[state="thin"] { color: @warning; background: @warning_bg; }
QLabel#verdict[state="fails"] { color: @fails; background: @fails_bg; }
QLabel#verdict[state="none"] { color: @soft; background: @hover; }
QLineEdit, QComboBox, QPlainTextEdit { background: @field; border: 1px solid @line; border-radius: 3px;
  padding: 2px 6px; selection-background-color: @accent; selection-color: @selection_text; }
QLineEdit:focus, QComboBox:focus, QPlainTextEdit:focus { border: 1px solid @accent; }
QLineEdit[wrong="true"] { border: 1px solid @fails; }
QComboBox::drop-down { border: none; width: 18px; }
QComboBox::down-arrow { image: url(@arrow); width: 10px; height: 6px; margin-right: 8px; }
QComboBox QAbstractItemView { background: @sheet; border: 1px solid @line; selection-background-color: @hover;
  selection-color: @ink; outline: none; }
QCheckBox { spacing: 6px; background: transparent; }
QCheckBox::indicator { width: 13px; height: 13px; border: 1px solid @soft; border-radius: 2px; background: @field; }
QCheckBox::indicator:checked { background: @accent; border: 1px solid @accent; image: url(@check); }
QCheckBox::indicator:focus { border: 1px solid @accent; }
QPushButton { background: @panel; border: 1px solid @line; border-radius: 3px; padding: 4px 12px; }
QPushButton:hover { background: @hover; }
QPushButton:focus { border: 1px solid @accent; }
QPushButton:disabled { color: @soft; }
QPushButton[role="cure"] { color: @accent; font-weight: 600; }
QToolButton { background: transparent; border: 1px solid transparent; border-radius: 3px; padding: 3px; }
QToolButton:hover { background: @hover; }
QToolButton:focus { border: 1px solid @accent; }
QToolButton:checked { background: @accent_bg; color: @accent; }
QToolButton[role="add"] { padding: 3px 8px; }
QLabel[role="place"] { font-size: 14px; font-weight: 600; border-bottom: 3px solid @accent; padding: 3px 2px 0 2px; }
QMenuBar { background: @panel; spacing: 2px; }
QMenuBar::item { background: transparent; padding: 4px 8px; }
QMenuBar::item:selected { background: @hover; }
QMenu { background: @sheet; border: 1px solid @line; padding: 4px 0; }
QMenu::item { padding: 5px 28px 5px 24px; }
QMenu::item:selected { background: @hover; }
QMenu::item:disabled { color: @soft; }
QMenu::icon { padding-left: 10px; }
QMenu::separator { height: 1px; background: @line; margin: 4px 0; }
QMenu::indicator { width: 10px; height: 10px; margin-left: 8px; }
QMenu::indicator:checked { background: @accent; border-radius: 5px; }
QSplitter::handle { background: @paper; }
QSplitter::handle:hover { background: @line; }
QScrollArea, QScrollArea > QWidget > QWidget { background: transparent; border: none; }
QListView, QTreeView, QTableView { background: @sheet; border: none; outline: none;
  selection-background-color: @hover; selection-color: @ink; }
QListWidget::item { padding: 5px 6px; border-bottom: 1px solid @line; }
QScrollBar:vertical { background: transparent; width: 8px; margin: 0; }
QScrollBar::handle:vertical { background: @line; border-radius: 3px; min-height: 24px; margin: 1px; }
QScrollBar:horizontal { background: transparent; height: 8px; margin: 0; }
QScrollBar::handle:horizontal { background: @line; border-radius: 3px; min-width: 24px; margin: 1px; }
QScrollBar::add-line, QScrollBar::sub-line { width: 0; height: 0; }
QScrollBar::add-page, QScrollBar::sub-page { background: transparent; }
QToolTip { background: @sheet; color: @ink; border: 1px solid @line; padding: 4px 6px; }
QStatusBar { background: @panel; color: @soft; border-top: 1px solid @line; }
"""
