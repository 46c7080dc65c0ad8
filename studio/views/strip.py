"""Strip of things to add, on the left: an icon and a word each, only the icon where the window is narrow."""

from PySide6.QtCore import QSize, Qt, Signal, Slot
from PySide6.QtWidgets import QFrame, QScrollArea, QSizePolicy, QToolButton, QVBoxLayout, QWidget

from studio.resources import ICON_SIZE, icon
from studio.theme import Theme
from studio.words import ADDING, kind_words

SEGMENT_KINDS = ("straight", "bend", "helix", "transition", "easing", "free_line", "loop", "gap")
VESSEL_KINDS = ("funnel", "well", "bowl", "dome", "deck", "tray")
KEYS = {
    **{kind: f"Ctrl+{number}" for number, kind in enumerate(SEGMENT_KINDS, start=1)},
    **{kind: f"Ctrl+Shift+{number}" for number, kind in enumerate(VESSEL_KINDS, start=1)},
}
"""Keys that add an element."""
WIDE, NARROW = 124, 46


class Strip(QWidget):
    """Buttons that add one element each."""

    wanted = Signal(str)
    """Kind of the element to add."""

    def __init__(self, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("strip")
        self.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        self.setAccessibleName("Add")
        self._theme = theme
        self.buttons: dict[str, QToolButton] = {}
        inner = QWidget()
        column = QVBoxLayout(inner)
        column.setContentsMargins(6, 8, 6, 8)
        column.setSpacing(1)
        for kind in SEGMENT_KINDS:
            column.addWidget(self._button(kind))
        rule = QFrame()
        rule.setProperty("role", "rule")
        column.addSpacing(7)
        column.addWidget(rule)
        column.addSpacing(7)
        for kind in VESSEL_KINDS:
            column.addWidget(self._button(kind))
        column.addStretch(1)
        scroll = QScrollArea()
        scroll.setWidgetResizable(True)
        scroll.setFrameShape(QFrame.Shape.NoFrame)
        scroll.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        scroll.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        scroll.setWidget(inner)
        outer = QVBoxLayout(self)
        outer.setContentsMargins(0, 0, 0, 0)
        outer.addWidget(scroll)
        theme.changed.connect(self._draw_icons)
        self._draw_icons()
        self.set_narrow(False)

    def _button(self, kind: str) -> QToolButton:
        """Button of one kind."""
        button = QToolButton()
        words = kind_words(kind)
        button.setText(words)
        button.setProperty("role", "add")
        button.setAccessibleName(f"Add {words.lower()}")
        button.setToolTip(f"Add {ADDING[kind]} ({KEYS[kind]})")
        button.setIconSize(QSize(ICON_SIZE, ICON_SIZE))
        button.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        button.clicked.connect(lambda: self.wanted.emit(kind))
        self.buttons[kind] = button
        return button

    @Slot()
    def _draw_icons(self) -> None:
        """Icons in the ink of the theme."""
        for kind, button in self.buttons.items():
            button.setIcon(icon(kind, self._theme.colour("ink")))

    def set_narrow(self, narrow: bool) -> None:
        """Show icons only, or icons with words."""
        style = Qt.ToolButtonStyle.ToolButtonIconOnly if narrow else Qt.ToolButtonStyle.ToolButtonTextBesideIcon
        for button in self.buttons.values():
            button.setToolButtonStyle(style)
        self.setFixedWidth(NARROW if narrow else WIDE)
