"""Playback: play, pause, step, speed, and a time line to scrub with a tick at every event of the run."""

import math
from typing import TYPE_CHECKING

from PySide6.QtCore import QElapsedTimer, QPointF, QRectF, QSize, Qt, QTimer, Slot
from PySide6.QtGui import QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QComboBox, QFrame, QHBoxLayout, QLabel, QToolButton, QWidget

from engine.integrate.result import EventKind
from studio.resources import SMALL, icon
from studio.theme import Theme
from studio.workspace import Workspace

if TYPE_CHECKING:
    from engine.simulate import Roll

SPEEDS = (0.01, 0.02, 0.05, 0.1, 0.25, 0.5, 1.0, 2.0, 5.0, 10.0)
FRAME_MS = 16
STEP = 0.01
"""s. One press of an arrow key; with Shift ten of them."""
FEWEST_TICKS = 5
SIDE = 16.0
TICKED = {EventKind.SLIP_ONSET, EventKind.LIFT_OFF, EventKind.TOUCH_DOWN, EventKind.REST, EventKind.ARRIVED}
"""Events that get a tick; passing from one piece of wall to the next does not."""
EVENT_WORDS = {
    EventKind.SLIP_ONSET: "slips",
    EventKind.LIFT_OFF: "lifts off",
    EventKind.TOUCH_DOWN: "touches down",
    EventKind.REST: "rests",
    EventKind.ARRIVED: "arrives",
}


def tick_step(duration: float, most: int) -> float:
    """Distance of the figures on the time line, s: 1, 2 or 5 times a power of ten, at most `most` of them."""
    rough = max(duration, 1e-6) / max(1, most)
    power = 10.0 ** math.floor(math.log10(rough))
    return next((factor * power for factor in (1.0, 2.0, 5.0) if factor * power >= rough), 10.0 * power)


class TimeLine(QWidget):
    """Line from release to end; drag or arrow keys move the time cursor."""

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._workspace, self._theme = workspace, theme
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setAccessibleName("Time")
        self.setMinimumSize(QSize(160, 48))
        self.setMouseTracking(True)
        workspace.timeChanged.connect(self._moved)
        workspace.rolled.connect(lambda _roll: self.update())
        theme.changed.connect(self.update)

    def sizeHint(self) -> QSize:
        """Preferred size."""
        return QSize(600, 52)

    @property
    def duration(self) -> float:
        """Length of the run, s; 0 without a roll."""
        roll = self._workspace.roll
        return roll.duration if roll is not None else 0.0

    def x_of(self, t: float) -> float:
        """Place of a time, px."""
        span = self.width() - 2 * SIDE
        return SIDE + (span * t / self.duration if self.duration > 0.0 else 0.0)

    def t_of(self, x: float) -> float:
        """Time at a place, s."""
        return (x - SIDE) / max(1.0, self.width() - 2 * SIDE) * self.duration

    @Slot(float)
    def _moved(self, t: float) -> None:
        """Draw anew and tell screen readers."""
        self.setAccessibleDescription(f"{t:.2f} s")
        self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Draw line, figures, ticks of events and the cursor."""
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        y = 0.42 * self.height()
        rest = QPen(self._theme.colour("line"), 4, Qt.PenStyle.SolidLine, Qt.PenCapStyle.RoundCap)
        painter.setPen(rest)
        painter.drawLine(QPointF(SIDE, y), QPointF(self.width() - SIDE, y))
        roll = self._workspace.roll
        if roll is None or self.duration <= 0.0:
            return
        self._paint_figures(painter, y)
        self._paint_events(painter, y, roll)
        x = self.x_of(self._workspace.time)
        rest.setColor(self._theme.colour("accent"))
        painter.setPen(rest)
        painter.drawLine(QPointF(SIDE, y), QPointF(x, y))
        painter.setPen(QPen(self._theme.colour("sheet"), 2))
        painter.setBrush(self._theme.colour("accent"))
        painter.drawEllipse(QPointF(x, y), 7.0, 7.0)
        if self.hasFocus():
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.setPen(QPen(self._theme.colour("accent"), 1))
            painter.drawEllipse(QPointF(x, y), 10.0, 10.0)

    def _paint_figures(self, painter: QPainter, y: float) -> None:
        """Seconds below the line."""
        font = self.font()
        font.setPixelSize(round(SMALL))
        painter.setFont(font)
        painter.setPen(self._theme.colour("soft"))
        step = tick_step(self.duration, max(FEWEST_TICKS, int(self.width() / 90)))
        digits = max(0, -math.floor(math.log10(step) + 1e-9))
        for number in range(int(self.duration / step + 1e-9) + 1):
            x = self.x_of(number * step)
            painter.drawText(
                QRectF(x - 40, y + 12, 80, 16), Qt.AlignmentFlag.AlignCenter, f"{number * step:.{digits}f} s"
            )

    def _paint_events(self, painter: QPainter, y: float, roll: "Roll") -> None:
        """Ticks across the line."""
        painter.setPen(QPen(self._theme.colour("soft"), 1))
        last = -10.0
        for entry in roll.trajectory.events:
            x = self.x_of(entry.t)
            if entry.kind in TICKED and x - last >= 2.0:
                painter.drawLine(QPointF(x, y - 8), QPointF(x, y + 8))
                last = x

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Move the time cursor here."""
        if event.button() == Qt.MouseButton.LeftButton:
            self._workspace.set_time(self.t_of(event.position().x()))

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Scrub while the button is down; else say what event is near."""
        if event.buttons() & Qt.MouseButton.LeftButton:
            self._workspace.set_time(self.t_of(event.position().x()))
            return
        roll = self._workspace.roll
        near = ""
        for entry in roll.trajectory.events if roll is not None else ():
            if entry.kind in TICKED and abs(self.x_of(entry.t) - event.position().x()) < 4.0:
                near = f"{entry.t:.2f} s: {EVENT_WORDS[entry.kind]}"
        self.setToolTip(near)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Step with arrow keys, Home and End."""
        big = 10.0 if event.modifiers() & Qt.KeyboardModifier.ShiftModifier else 1.0
        now = self._workspace.time
        targets = {
            Qt.Key.Key_Left: now - big * STEP,
            Qt.Key.Key_Right: now + big * STEP,
            Qt.Key.Key_Home: 0.0,
            Qt.Key.Key_End: self.duration,
        }
        target = targets.get(Qt.Key(event.key()))
        if target is None:
            super().keyPressEvent(event)
        else:
            self._workspace.set_time(target)


class Playback(QFrame):
    """Row of play button, speed, time line and present time."""

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("sheet")
        self.setAccessibleName("Playback")
        self._workspace, self._theme = workspace, theme
        self._clock = QElapsedTimer()
        self._timer = QTimer(self)
        self._timer.setInterval(FRAME_MS)
        self._timer.timeout.connect(self._advance)
        self.start_button = self._button("start", "To the release", self.to_start)
        self.play_button = self._button("play", "Play", self.toggle)
        self.speed = QComboBox()
        self.speed.setAccessibleName("Speed of playback")
        self.speed.setToolTip("Speed of playback")
        for value in SPEEDS:
            self.speed.addItem(f"× {value:g}", value)
        self.speed.setCurrentIndex(SPEEDS.index(1.0))
        self.line = TimeLine(workspace, theme)
        self.now = QLabel("0.00 s")
        self.now.setMinimumWidth(56)
        self.now.setAlignment(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
        self._lay_out()
        workspace.timeChanged.connect(lambda t: self.now.setText(f"{t:.2f} s"))
        workspace.opened.connect(self.pause)
        theme.changed.connect(self._draw_icons)
        self._draw_icons()

    def _button(self, name: str, words: str, slot: object) -> QToolButton:
        button = QToolButton()
        button.setAccessibleName(words)
        button.setToolTip(words)
        button.setIconSize(QSize(20, 20))
        button.clicked.connect(slot)
        button.setProperty("picture", name)
        return button

    def _lay_out(self) -> None:
        row = QHBoxLayout(self)
        row.setContentsMargins(12, 4, 12, 4)
        row.setSpacing(6)
        for widget in (self.start_button, self.play_button, self.speed):
            row.addWidget(widget)
        row.addWidget(self.line, 1)
        row.addWidget(self.now)

    @Slot()
    def _draw_icons(self) -> None:
        self.play_button.setIcon(icon("pause" if self.playing else "play", self._theme.colour("ink")))
        self.start_button.setIcon(icon("start", self._theme.colour("ink")))
        self.play_button.setAccessibleName("Pause" if self.playing else "Play")
        self.play_button.setToolTip("Pause (P)" if self.playing else "Play (P)")

    @property
    def playing(self) -> bool:
        """Whether the ball is running."""
        return self._timer.isActive()

    @Slot()
    def toggle(self) -> None:
        """Play, or pause; at the end play from the release again."""
        if self.playing:
            self.pause()
            return
        roll = self._workspace.roll
        if roll is None or roll.duration <= 0.0:
            return
        if self._workspace.time >= roll.duration:
            self._workspace.set_time(0.0)
        self._clock.start()
        self._timer.start()
        self._draw_icons()

    @Slot()
    def pause(self) -> None:
        """Stop where the ball is."""
        self._timer.stop()
        self._draw_icons()

    @Slot()
    def to_start(self) -> None:
        """Go back to the release."""
        self._workspace.set_time(0.0)

    def step(self, by: float) -> None:
        """Move the time cursor by some seconds, paused."""
        self.pause()
        self._workspace.set_time(self._workspace.time + by)

    def change_speed(self, by: int) -> None:
        """Choose the next faster or slower speed."""
        self.speed.setCurrentIndex(min(max(self.speed.currentIndex() + by, 0), len(SPEEDS) - 1))

    @Slot()
    def _advance(self) -> None:
        """Move the ball on by the time that has passed."""
        passed = 1e-3 * self._clock.restart()
        roll = self._workspace.roll
        target = self._workspace.time + passed * float(self.speed.currentData())
        self._workspace.set_time(target)
        if roll is None or target >= roll.duration:
            self.pause()
