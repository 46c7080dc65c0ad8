"""Files under assets/ and the user's folders: the only module that knows where they are."""

import os
import sys
from functools import lru_cache
from pathlib import Path

from PySide6.QtCore import QByteArray, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QFont, QFontDatabase, QIcon, QPainter, QPixmap
from PySide6.QtSvg import QSvgRenderer

ASSETS = Path(__file__).resolve().parent.parent / "assets"
ICONS = ASSETS / "icons"
FONTS = ASSETS / "fonts"
EXAMPLES = ASSETS / "examples"
DEMONSTRATION = EXAMPLES / "wall.json"

SMALL, USUAL, LARGE = 11.0, 12.5, 14.0
"""Sizes of type in px at 96 dots an inch."""
ICON_SIZE = 20
DENSITIES = (1.0, 2.0, 3.0)
"""Device pixels per pixel for which icons are drawn."""
INK = "currentColor"


def state_folder() -> Path:
    """Folder for working copies and logs of this user."""
    chosen = os.environ.get("TRUNDLE_STATE")
    if chosen:
        return Path(chosen)
    if sys.platform == "win32":
        return Path(os.environ.get("LOCALAPPDATA", Path.home())) / "Trundle"
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Application Support" / "Trundle"
    return Path(os.environ.get("XDG_STATE_HOME") or Path.home() / ".local" / "state") / "trundle"


def load_fonts() -> list[str]:
    """Load the fonts that ship with the program; return their families."""
    families: list[str] = []
    for path in sorted(FONTS.glob("*.ttf")) + sorted(FONTS.glob("*.otf")):
        number = QFontDatabase.addApplicationFont(str(path))
        families.extend(family for family in QFontDatabase.applicationFontFamilies(number) if family not in families)
    return families


def window_font(families: list[str]) -> QFont:
    """Font of the window, with figures of equal width."""
    font = QFont(families[0]) if families else QFont()
    font.setPixelSize(round(USUAL))
    font.setFeature(QFont.Tag("tnum"), 1)
    return font


@lru_cache(maxsize=128)
def icon_source(name: str) -> str:
    """Text of an icon."""
    return (ICONS / f"{name}.svg").read_text(encoding="utf-8")


def icon_pixmap(name: str, colour: QColor, size: int = ICON_SIZE, density: float = 1.0) -> QPixmap:
    """Icon drawn in one colour."""
    renderer = QSvgRenderer(QByteArray(icon_source(name).replace(INK, colour.name()).encode()))
    pixmap = QPixmap(QSize(round(size * density), round(size * density)))
    pixmap.fill(Qt.GlobalColor.transparent)
    painter = QPainter(pixmap)
    renderer.render(painter, QRectF(pixmap.rect()))
    painter.end()
    pixmap.setDevicePixelRatio(density)
    return pixmap


def icon(name: str, colour: QColor, size: int = ICON_SIZE) -> QIcon:
    """Icon in one colour, sharp on dense screens."""
    made = QIcon()
    for density in DENSITIES:
        made.addPixmap(icon_pixmap(name, colour, size, density))
    return made
