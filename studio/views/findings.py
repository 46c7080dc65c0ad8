"""List of what goes wrong: shape, title, sentence, cure; a click goes there in space and time."""

from typing import NamedTuple

from PySide6.QtCore import (
    QAbstractItemModel,
    QEvent,
    QModelIndex,
    QPersistentModelIndex,
    QRect,
    QSize,
    Qt,
    Signal,
    Slot,
)
from PySide6.QtGui import QFont, QFontMetrics, QMouseEvent, QPainter, QPen, QPolygonF
from PySide6.QtWidgets import (
    QFrame,
    QHBoxLayout,
    QLabel,
    QListView,
    QStyle,
    QStyledItemDelegate,
    QStyleOptionViewItem,
    QVBoxLayout,
    QWidget,
)

from studio.cures import cure_of
from studio.item_models import TOKENS, FindingRow, FindingsModel
from studio.shapes import mark_outline
from studio.theme import Theme
from studio.workspace import Workspace

Index = QModelIndex | QPersistentModelIndex

MARGIN = 12
TEXT_LEFT = 36
GAP = 3
SENTENCE_SIZE = 11
MARK_SIZE = 13.0
WRAP = Qt.TextFlag.TextWordWrap | Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignTop


class Line(NamedTuple):
    """One text of a finding: words, font, colour token."""

    text: str
    font: QFont
    token: str


class FindingDelegate(QStyledItemDelegate):
    """Draws one finding; a cure in the accent can be pressed."""

    pressed = Signal(int)
    """Row whose cure was pressed."""

    def __init__(self, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._theme = theme

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: Index) -> None:
        """Draw mark and texts, and a hair line below."""
        row = index.data(FindingsModel.ROW)
        painter.save()
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        if option.state & QStyle.StateFlag.State_Selected:
            painter.fillRect(option.rect, self._theme.colour("hover"))
        self._paint_mark(painter, option.rect, row)
        top = option.rect.top() + MARGIN
        for line in lines_of(row, option.font):
            box = QRect(option.rect.left() + TEXT_LEFT, top, option.rect.width() - TEXT_LEFT - MARGIN, 1000)
            used = QFontMetrics(line.font).boundingRect(box, int(WRAP), line.text)
            painter.setFont(line.font)
            painter.setPen(self._theme.colour(line.token))
            painter.drawText(box, int(WRAP), line.text)
            top = used.bottom() + GAP
        painter.setPen(QPen(self._theme.colour("line"), 1))
        bottom = option.rect.bottom()
        painter.drawLine(option.rect.left() + MARGIN, bottom, option.rect.right() - MARGIN, bottom)
        painter.restore()

    def _paint_mark(self, painter: QPainter, rect: QRect, row: FindingRow) -> None:
        """Draw the shape; filled when the run fails by it."""
        colour = self._theme.colour(TOKENS[row.shape])
        outline = mark_outline(row.shape, rect.left() + MARGIN + 7.0, rect.top() + MARGIN + 8.0, MARK_SIZE)
        painter.setPen(QPen(colour, 1.6))
        painter.setBrush(colour if row.shape == "triangle" else Qt.BrushStyle.NoBrush)
        painter.drawPolygon(QPolygonF(outline))

    def editorEvent(self, event: QEvent, model: QAbstractItemModel, option: QStyleOptionViewItem, index: Index) -> bool:
        """Take a press on the cure."""
        row = index.data(FindingsModel.ROW)
        if event.type() == QEvent.Type.MouseButtonRelease and isinstance(event, QMouseEvent) and row.pressable:
            if event.position().y() >= cure_top(option.rect, row, option.font):
                self.pressed.emit(index.row())
                return True
        return super().editorEvent(event, model, option, index)

    def sizeHint(self, option: QStyleOptionViewItem, index: Index) -> QSize:
        """Height of the texts at the width of the list."""
        view = option.widget
        width = view.viewport().width() if isinstance(view, QListView) else option.rect.width()
        height = 2 * MARGIN - GAP
        for line in lines_of(index.data(FindingsModel.ROW), option.font):
            box = QRect(0, 0, max(40, width - TEXT_LEFT - MARGIN), 1000)
            height += QFontMetrics(line.font).boundingRect(box, int(WRAP), line.text).height() + GAP
        return QSize(width, height)


def lines_of(row: FindingRow, font: QFont) -> list[Line]:
    """Texts of a finding with their fonts."""
    bold, small, small_bold = QFont(font), QFont(font), QFont(font)
    bold.setWeight(QFont.Weight.DemiBold)
    small.setPixelSize(SENTENCE_SIZE)
    small_bold.setPixelSize(SENTENCE_SIZE)
    small_bold.setWeight(QFont.Weight.DemiBold if row.pressable else QFont.Weight.Normal)
    texts = (
        Line(row.title, bold, "ink"),
        Line(row.sentence, small, "soft"),
        Line(row.cure, small_bold, "accent" if row.pressable else "ink"),
    )
    return [line for line in texts if line.text]


def cure_top(rect: QRect, row: FindingRow, font: QFont) -> int:
    """Height in the list from which on a finding shows its cure, px."""
    top = rect.top() + MARGIN
    for line in lines_of(row, font)[:-1]:
        box = QRect(0, top, rect.width() - TEXT_LEFT - MARGIN, 1000)
        top = QFontMetrics(line.font).boundingRect(box, int(WRAP), line.text).bottom() + GAP
    return top


class FindingsList(QListView):
    """List whose rows are as high as their text at the present width."""

    def resizeEvent(self, event: object) -> None:
        """Lay the rows out anew."""
        super().resizeEvent(event)
        self.scheduleDelayedItemsLayout()


class FindingsPanel(QFrame):
    """Findings with their number; worst first."""

    chosen = Signal(str)
    """Id of the element of the finding that was chosen."""

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("sheet")
        self._workspace = workspace
        self.model = FindingsModel(workspace, self)
        self.list = FindingsList()
        self.list.setModel(self.model)
        self.list.setAccessibleName("Findings")
        delegate = FindingDelegate(theme, self.list)
        delegate.pressed.connect(self.take_cure, Qt.ConnectionType.QueuedConnection)  # after the click has gone there
        self.list.setItemDelegate(delegate)
        self.list.setVerticalScrollMode(QListView.ScrollMode.ScrollPerPixel)
        self.list.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.list.clicked.connect(self._go)
        self.list.activated.connect(self._go)
        self._count, self._none = QLabel(), QLabel()
        self._lay_out()
        self.model.modelReset.connect(self._show_count)
        workspace.rolled.connect(self._show_count)
        workspace.designChanged.connect(self._show_count)
        theme.changed.connect(self.list.viewport().update)
        self._show_count()

    def _lay_out(self) -> None:
        """Title and number over the list."""
        title = QLabel("Findings")
        for label, role in ((title, "pane"), (self._count, "soft"), (self._none, "soft")):
            label.setProperty("role", role)
        self._none.setContentsMargins(MARGIN, 0, MARGIN, MARGIN)
        self._none.setWordWrap(True)
        self._none.setAlignment(Qt.AlignmentFlag.AlignTop)
        top = QHBoxLayout()
        top.setContentsMargins(MARGIN, MARGIN, MARGIN, 4)
        top.addWidget(title, 1)
        top.addWidget(self._count)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addLayout(top)
        column.addWidget(self._none)
        column.addWidget(self.list, 1)

    @Slot()
    def _show_count(self, *_: object) -> None:
        """Show the number, or a sentence when there is nothing to list."""
        count = len(self.model.rows)
        self._count.setText(str(count) if count else "")
        self.list.setVisible(count > 0)
        self._none.setVisible(count == 0)
        if self._workspace.problem:
            self._none.setText(self._workspace.problem)
        else:
            self._none.setText("Nothing found." if self._workspace.current else "")

    @Slot(QModelIndex)
    def _go(self, index: QModelIndex) -> None:
        """Select the element of a finding and move the time cursor to it."""
        row: FindingRow = index.data(FindingsModel.ROW)
        if row.element:
            self._workspace.select((row.element,))
            self.chosen.emit(row.element)
        if row.time is not None:
            self._workspace.set_time(row.time)

    @Slot()
    def take_chosen_cure(self) -> None:
        """Take the cure of the chosen finding, of the worst one that has any when none is chosen."""
        place = self.list.currentIndex().row()
        if place < 0:
            place = next((number for number, row in enumerate(self.model.rows) if row.pressable), -1)
        if place >= 0:
            self.take_cure(place)

    @Slot(int)
    def take_cure(self, place: int) -> None:
        """Put the cure of a finding in place as one step."""
        roll = self._workspace.roll
        if roll is None or not self._workspace.current or place >= len(roll.findings):
            return
        cure = cure_of(self._workspace, roll.findings[place])
        if cure is not None:
            self._workspace.edit(cure.label, cure.design)
            self._workspace.select((cure.element,))

    @Slot()
    def go_next(self) -> None:
        """Go to the next finding; after the last one to the first."""
        count = len(self.model.rows)
        if count:
            index = self.model.index((self.list.currentIndex().row() + 1) % count, 0)
            self.list.setCurrentIndex(index)
            self._go(index)
