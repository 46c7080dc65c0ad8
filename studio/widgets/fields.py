"""Editor of one number with its unit, and the base of all field editors: wrong input is answered where it was typed."""

from typing import Any

from PySide6.QtCore import QEvent, QSignalBlocker, Qt, Signal
from PySide6.QtGui import QKeyEvent, QWheelEvent
from PySide6.QtWidgets import QLabel, QLineEdit, QVBoxLayout, QWidget

from engine.errors import QuantityError
from engine.model.base import FieldSpec
from engine.units import display, format_quantity, parse_quantity, to_si
from studio.words import allowed_words

STEPS = {"mm": 1.0, "cm": 0.1, "m": 0.001, "in": 0.05, "deg": 1.0, "%": 0.1, "turns": 0.25, "m/s": 0.05, "1/m": 0.1}
"""Change of a shown number by one press of an arrow key, in its unit; of a plain number a hundredth."""
PLAIN_STEP = 0.01
PAGE = 10.0
"""Steps of Page Up and Page Down, and of an arrow key with Shift."""
DEGREE_SIGN = {"deg": "°"}


class FieldEditor(QWidget):
    """Editor of one field: the control, and under it a line for what was refused."""

    committed = Signal(object, bool)
    """New value in SI, and whether it may merge with the step before (stepped by keys)."""

    def __init__(self, spec: FieldSpec, units: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.spec = spec
        self.units = units
        self._column = QVBoxLayout(self)
        self._column.setContentsMargins(0, 0, 0, 0)
        self._column.setSpacing(2)
        self.answer = QLabel()
        self.answer.setProperty("role", "refused")
        self.answer.setWordWrap(True)
        self.answer.hide()
        self._column.addWidget(self.answer)

    def place(self, control: QWidget) -> None:
        """Put the control above the answer."""
        control.setAccessibleName(self.spec.label)
        self._column.insertWidget(0, control)
        self.setFocusProxy(control)

    def refuse(self, sentence: str) -> None:
        """Say what is wrong and what is allowed, beside the control."""
        self.answer.setText(sentence)
        self.answer.show()
        self._mark(True)
        control = self.focusProxy()
        if control is not None:
            control.setAccessibleDescription(sentence)

    def accept(self) -> None:
        """Take the answer away."""
        if not self.answer.isHidden():
            self.answer.hide()
            self._mark(False)
            control = self.focusProxy()
            if control is not None:
                control.setAccessibleDescription("")

    def _mark(self, wrong: bool) -> None:
        control = self.focusProxy()
        if control is not None:
            control.setProperty("wrong", wrong)
            control.style().unpolish(control)
            control.style().polish(control)

    def show_value(self, value: Any) -> None:
        """Show a value of the document; nothing is emitted."""
        raise NotImplementedError


class NumberLine(QLineEdit):
    """Line of text that holds a number; arrow keys step it."""

    stepped = Signal(float)
    abandoned = Signal()

    def event(self, event: QEvent) -> bool:
        """Keep Escape for the line while something is typed: it would clear the selection otherwise."""
        if event.type() == QEvent.Type.ShortcutOverride and isinstance(event, QKeyEvent):
            if event.key() == Qt.Key.Key_Escape and self.isModified():
                event.accept()
                return True
        return super().event(event)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Step by arrow and page keys; Escape gives the value back."""
        steps = {
            Qt.Key.Key_Up: 1.0,
            Qt.Key.Key_Down: -1.0,
            Qt.Key.Key_PageUp: PAGE,
            Qt.Key.Key_PageDown: -PAGE,
        }.get(Qt.Key(event.key()))
        if steps is not None:
            shift = event.modifiers() & Qt.KeyboardModifier.ShiftModifier
            self.stepped.emit(steps * (PAGE if shift and abs(steps) == 1.0 else 1.0))
            return
        if event.key() == Qt.Key.Key_Escape and self.isModified():
            self.abandoned.emit()
            return
        super().keyPressEvent(event)

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Step by the wheel, only while the line has the keyboard."""
        if self.hasFocus() and event.angleDelta().y():
            self.stepped.emit(1.0 if event.angleDelta().y() > 0 else -1.0)
            event.accept()
        else:
            event.ignore()


class QuantityEditor(FieldEditor):
    """Number with its unit: takes "12 mm", "1/2 in", "1:40"; an optional one may be left empty."""

    def __init__(self, spec: FieldSpec, units: str, parent: QWidget | None = None) -> None:
        super().__init__(spec, units, parent)
        self._value: float | None = None
        self._shown = ""
        self.line = NumberLine()
        self.line.setClearButtonEnabled(False)
        self.unit_label = QLabel(unit_sign(spec.unit, units), self.line)
        self.unit_label.setProperty("role", "soft")
        self.unit_label.setAttribute(Qt.WidgetAttribute.WA_TransparentForMouseEvents)
        self.place(self.line)
        self.line.setToolTip(f"{spec.label}: {allowed_words(spec.low, spec.high, spec.unit, units)}")
        self.line.editingFinished.connect(self._finish)
        self.line.stepped.connect(self._step)
        self.line.abandoned.connect(lambda: self.show_value(self._value))
        self.line.installEventFilter(self)
        if spec.optional:
            self.line.setPlaceholderText("not given")

    def eventFilter(self, watched: object, event: QEvent) -> bool:
        """Keep the unit at the right end of the line."""
        if event.type() in (QEvent.Type.Resize, QEvent.Type.Show):
            width = self.unit_label.sizeHint().width()
            self.unit_label.setGeometry(self.line.width() - width - 8, 0, width, self.line.height())
            self.line.setTextMargins(0, 0, width + 4, 0)
        return False

    def show_value(self, value: Any) -> None:
        """Show a value given in SI."""
        self._value = None if value is None else float(value)
        number = "" if value is None else shown_number(float(value), self.spec.unit, self.units)
        self._shown = number
        with QSignalBlocker(self.line):
            if self.line.text() != number:
                self.line.setText(number)
                self.line.setCursorPosition(0)
            self.line.setModified(False)
        self.accept()

    def _finish(self) -> None:
        """Read what was typed and hand it on, or say why not."""
        text = self.line.text().strip()
        if text == self._shown:
            self.accept()
            return
        if not text and self.spec.optional:
            self.accept()
            self.committed.emit(None, False)
            return
        try:
            value = parse_quantity(text, self.spec.unit or "ratio", self.units)
        except QuantityError as error:
            self.refuse(f"{error} Allowed: {self._allowed()}.")
            return
        if self._outside(value):
            self.refuse(f"{self.spec.label} must be {self._allowed()}.")
            return
        self.accept()
        self.committed.emit(value, False)

    def _step(self, steps: float) -> None:
        """Change the number by some steps, within its bounds."""
        present = self._value if self._value is not None else 0.0
        number, word = display(present, self.spec.unit or "ratio", self.units)
        moved = round(number + steps * STEPS.get(word, PLAIN_STEP), 9)
        value = to_si(moved, self.spec.unit, self.units)
        low, high = self.spec.low, self.spec.high
        value = max(value, low) if low is not None else value
        value = min(value, high) if high is not None else value
        if value != present or self._value is None:
            self.accept()
            self.committed.emit(value, True)

    def _outside(self, value: float) -> bool:
        low, high = self.spec.low, self.spec.high
        return (low is not None and value < low) or (high is not None and value > high)

    def _allowed(self) -> str:
        return allowed_words(self.spec.low, self.spec.high, self.spec.unit, self.units)


def unit_sign(unit: str, units: str) -> str:
    """Unit as shown at the end of a field."""
    word = display(0.0, unit or "ratio", units)[1]
    return DEGREE_SIGN.get(word, word)


def shown_number(value: float, unit: str, units: str) -> str:
    """Number without its unit, as precise as the design's unit asks for."""
    return format_quantity(value, unit or "ratio", units).split(" ")[0]
