"""Editors for texts, flags, choices, vectors and points, and the choice of the editor that fits a field."""

from collections.abc import Mapping, Sequence
from typing import Any

from PySide6.QtCore import QEvent, QSignalBlocker, Qt
from PySide6.QtWidgets import QCheckBox, QComboBox, QHBoxLayout, QLabel, QLineEdit, QPlainTextEdit, QVBoxLayout, QWidget

from engine.errors import QuantityError
from engine.model.base import FieldSpec
from engine.units import parse_quantity
from studio.widgets.fields import FieldEditor, QuantityEditor, shown_number
from studio.words import kind_words

AXES = ("x", "y", "z")
FARTHEST = 1e4
"""m. Bound of a coordinate, as in the document."""


class TextEditor(FieldEditor):
    """One line of text."""

    def __init__(self, spec: FieldSpec, units: str, parent: QWidget | None = None) -> None:
        super().__init__(spec, units, parent)
        self._shown = ""
        self.line = QLineEdit()
        self.place(self.line)
        self.line.editingFinished.connect(self._finish)

    def show_value(self, value: Any) -> None:
        """Show a text."""
        self._shown = str(value or "")
        with QSignalBlocker(self.line):
            if self.line.text() != self._shown:
                self.line.setText(self._shown)
        self.accept()

    def _finish(self) -> None:
        if self.line.text() != self._shown:
            self.committed.emit(self.line.text(), False)


class FlagEditor(FieldEditor):
    """Yes or no."""

    def __init__(self, spec: FieldSpec, units: str, parent: QWidget | None = None) -> None:
        super().__init__(spec, units, parent)
        self.box = QCheckBox()
        self.place(self.box)
        self.box.toggled.connect(lambda on: self.committed.emit(on, False))

    def show_value(self, value: Any) -> None:
        """Show a flag."""
        with QSignalBlocker(self.box):
            self.box.setChecked(bool(value))


class ChoiceEditor(FieldEditor):
    """One of several entries: words of a choice, kinds of a part, or ids with their names."""

    def __init__(self, spec: FieldSpec, units: str, entries: Mapping[Any, str], parent: QWidget | None = None) -> None:
        super().__init__(spec, units, parent)
        self.box = QComboBox()
        self.box.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        self.box.setMinimumContentsLength(8)
        self.box.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        for value, words in entries.items():
            self.box.addItem(words, value)
        self.place(self.box)
        self.box.installEventFilter(self)
        self.box.activated.connect(lambda place: self.committed.emit(self.box.itemData(place), False))

    def eventFilter(self, watched: object, event: QEvent) -> bool:
        """Leave the wheel to the panel: a choice must not change while scrolling past."""
        if event.type() == QEvent.Type.Wheel and watched is self.box:
            event.ignore()
            return True
        return False

    def show_value(self, value: Any) -> None:
        """Show an entry; one that is not in the list is added."""
        with QSignalBlocker(self.box):
            place = self.box.findData(value)
            if place < 0:
                self.box.addItem(str(value), value)
                place = self.box.count() - 1
            self.box.setCurrentIndex(place)
            self.box.setToolTip(self.box.currentText())


class VectorEditor(FieldEditor):
    """Two or three lengths side by side."""

    def __init__(self, spec: FieldSpec, units: str, parent: QWidget | None = None) -> None:
        super().__init__(spec, units, parent)
        self._values: tuple[float, ...] = ()
        self._row = QWidget()
        self._line = QVBoxLayout(self._row)
        self._line.setContentsMargins(0, 0, 0, 0)
        self._line.setSpacing(4)
        self.editors: list[QuantityEditor] = []
        self.place(self._row)

    def show_value(self, value: Any) -> None:
        """Show the numbers; the editors are made on first use."""
        self._values = tuple(value) if value is not None else ()
        while len(self.editors) < len(self._values):
            self._add_axis()
        for editor, number in zip(self.editors, self._values, strict=False):
            editor.show_value(number)
        self.accept()

    def _add_axis(self) -> None:
        place = len(self.editors)
        unit = self.spec.unit or "m"
        spec = FieldSpec(AXES[place], f"{self.spec.label} {AXES[place]}", unit, -FARTHEST, FARTHEST, "number")
        editor = QuantityEditor(spec, self.units)
        editor.committed.connect(lambda value, merge, place=place: self._commit(place, value, merge))
        row = QHBoxLayout()
        row.setSpacing(6)
        letter = QLabel(AXES[place])
        letter.setProperty("role", "soft")
        letter.setFixedWidth(10)
        row.addWidget(letter)
        row.addWidget(editor)
        self._line.addLayout(row)
        self.editors.append(editor)
        self.setFocusProxy(self.editors[0])

    def _commit(self, place: int, value: float, merge: bool) -> None:
        changed = (*self._values[:place], value, *self._values[place + 1 :])
        self.committed.emit(changed, merge)


class PointsEditor(FieldEditor):
    """Points, one a line, numbers apart by commas or blanks, in the unit of the design."""

    def __init__(self, spec: FieldSpec, units: str, parent: QWidget | None = None) -> None:
        super().__init__(spec, units, parent)
        self._shown = ""
        self._width = 2
        self.text = QPlainTextEdit()
        self.text.setTabChangesFocus(True)
        self.text.setFixedHeight(96)
        self.place(self.text)
        self.text.installEventFilter(self)
        self.text.setToolTip(f"{spec.label}, one point a line, in {units}")

    def eventFilter(self, watched: object, event: QEvent) -> bool:
        """Read the points when the editor is left."""
        if watched is self.text and event.type() == QEvent.Type.FocusOut:
            self.finish()
        return False

    def show_value(self, value: Any) -> None:
        """Show points given in m."""
        points: Sequence[Sequence[float]] = value or ()
        self._width = len(points[0]) if points else self._width
        lines = ["  ".join(shown_number(number, "m", self.units) for number in point) for point in points]
        self._shown = "\n".join(lines)
        if self.text.toPlainText() != self._shown:
            self.text.setPlainText(self._shown)
        self.accept()

    def finish(self) -> None:
        """Read what was typed and hand it on, or say which line is wrong."""
        text = self.text.toPlainText().strip()
        if text == self._shown.strip():
            self.accept()
            return
        points: list[tuple[float, ...]] = []
        for number, line in enumerate(filter(str.strip, text.splitlines()), start=1):
            words = line.replace(";", " ").replace(", ", " ").split()
            try:
                point = tuple(parse_quantity(word, "m", self.units) for word in words)
            except QuantityError as error:
                self.refuse(f"Line {number}: {error}")
                return
            if len(point) != self._width:
                self.refuse(f"Line {number} has {len(point)} numbers; give {self._width}, apart by blanks.")
                return
            points.append(point)
        self.accept()
        self.committed.emit(tuple(points), False)


def editor_for(spec: FieldSpec, units: str, entries: Mapping[Any, str] | None = None) -> FieldEditor | None:
    """Editor that fits a field; None for parts of the document that have a panel of their own."""
    if spec.name == "hand":
        return ChoiceEditor(spec, units, {1: "To the left", -1: "To the right"})
    if entries is not None:
        return ChoiceEditor(spec, units, entries)
    if spec.kind == "choice":
        return ChoiceEditor(spec, units, {choice: kind_words(choice) for choice in spec.choices})
    kinds: dict[str, type[FieldEditor]] = {
        "number": QuantityEditor,
        "text": TextEditor,
        "flag": FlagEditor,
        "vector": VectorEditor,
        "points": PointsEditor,
    }
    made = kinds.get(spec.kind)
    return made(spec, units) if made is not None else None
