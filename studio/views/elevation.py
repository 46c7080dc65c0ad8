"""The developed elevation: height over the way travelled, head line, losses, regimes, findings, time cursor."""

import math
from typing import Any, ClassVar, NamedTuple

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt, Slot
from PySide6.QtGui import QKeyEvent, QPainter
from PySide6.QtWidgets import QWidget

from engine.errors import TrundleError
from engine.findings.finding import Severity
from engine.integrate.result import Regime
from studio.display import (
    Array,
    BallPath,
    arrivals,
    finding_sample,
    layout_of,
    levels_of,
    moment_at,
    path_of,
    regime_runs,
    shown_findings,
    time_at,
)
from studio.dragging import raised
from studio.theme import Theme
from studio.views import elevation_words
from studio.views.canvas import Canvas, Margins
from studio.views.elevation_words import RIGHT_AXIS, RULER
from studio.views.plan_words import length_words, write_about
from studio.widgets.marks import GRIP, MARK, draw_ball, draw_finding, draw_grip, draw_rest
from studio.widgets.strokes import (
    Labels,
    Stroke,
    dotted,
    draw_path,
    draw_slip,
    draw_text,
    path_colours,
    pen,
    polygon,
    small_ink,
    text_size,
    thin,
    thinned,
)
from studio.words import finding_title, placed_element
from studio.workspace import Workspace

PATH_WIDTH = 3.0
STALE = 0.35
GRID_STEP = 34.0
TIME_STEP = 0.02
"""s. One press of an arrow key."""


class Name(NamedTuple):
    """Name of an element under the ruler: id, words, where it begins on screen, where its words stand."""

    element: str
    words: str
    x: float
    box: QRectF


class ElevationView(Canvas):
    """Developed elevation of the run in work."""

    margins: ClassVar[Margins] = Margins(24.0, 52.0, RIGHT_AXIS + 8.0, 52.0)
    stretches: ClassVar[bool] = True

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(workspace, theme, "Elevation, developed", parent)
        self.setAccessibleDescription("Height and head over the way travelled; click or drag to move the time cursor.")
        self._path: BallPath | None = None
        self.names: list[Name] = []
        self._held, self._lift, self._drag_number = "", 0.0, 0
        self._take_design()
        self._take_roll()
        workspace.rolled.connect(self._take_roll)
        workspace.designChanged.connect(self._take_design)
        workspace.selectionChanged.connect(self.redraw)
        workspace.timeChanged.connect(self.update)

    @Slot()
    def _take_design(self, *_: Any) -> None:
        self.layout_now = layout_of(self.workspace.design, self.workspace.roll)
        self.redraw()

    @Slot()
    def _take_roll(self, *_: Any) -> None:
        empty = self._path is None
        self._path = path_of(self.workspace.roll)
        self.fit() if (self._fitted and not self._held) or empty else self.redraw()

    def world_bounds(self) -> Array | None:
        """From the release to the end, from the lowest place to the highest head, m."""
        path = self._path
        if path is None:
            return None
        low, high = float(path.place[:, 2].min()), float(max(path.head.max(), path.place[:, 2].max()))
        return np.array([[0.0, low], [max(float(path.developed[-1]), 1e-3), max(high, low + 1e-3)]])

    @property
    def exaggeration(self) -> float:
        """How many times heights are drawn larger than lengths."""
        return float(self.scale[1] / self.scale[0])

    # -- painting ---------------------------------------------------------------------------------
    def paint_static(self, painter: QPainter) -> None:
        """Paint heights, head line, track line, names, findings and losses."""
        path = self._path
        if path is None:
            self._paint_nothing(painter)
            return
        painter.setOpacity(1.0 if self.workspace.current else STALE)
        labels = Labels(QRectF(self.rect()).adjusted(6, 30, -6.0, -RULER - 4.0))
        self._paint_heights(painter)
        painter.save()
        painter.setClipRect(QRectF(1.0, 30.0, self.width() - RIGHT_AXIS - 2.0, self.height() - RULER - 31.0))
        track, head = self._paint_lines(painter, path)
        labels.lines = np.concatenate([dotted(track), dotted(head)])
        self._paint_rests(painter, path)
        painter.restore()
        self._paint_names(painter, path)
        self._paint_findings(painter, labels, path)
        self._paint_grip(painter, labels)
        elevation_words.write_head(painter, self, labels, head)
        elevation_words.write_losses(painter, self, path)
        painter.setOpacity(1.0)

    def _paint_nothing(self, painter: QPainter) -> None:
        """Say why there is nothing to see."""
        words = self.workspace.problem or "Rolling …" if self.workspace.run is not None else "No run yet"
        ink = small_ink(self.theme, self.font())
        width, height = text_size(ink.font, words)
        at = QPointF(max(12.0, 0.5 * (self.width() - width)), 0.5 * (self.height() - height))
        draw_text(painter, at, words, ink)

    def _paint_heights(self, painter: QPainter) -> None:
        """Level lines at round heights, and the heights on the right."""
        step = self.grid_step(1, GRID_STEP)
        low, high = self.to_world(QPointF(0, self.height() - RULER - 8.0))[1], self.to_world(QPointF(0, 34.0))[1]
        ink = small_ink(self.theme, self.font(), halo=False)
        units = self.workspace.design.units
        right = self.width() - RIGHT_AXIS
        for number in range(math.ceil(low / step), math.floor(high / step) + 1):
            y = round(self.point(0.0, number * step).y())
            painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
            painter.setPen(pen(self.theme.colour("grid_major" if number % 5 == 0 else "grid")))
            painter.drawLine(1, y, round(right), y)
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            words = length_words(number * step, units, signed=True)
            width, height = text_size(ink.font, words)
            draw_text(painter, QPointF(self.width() - 10.0 - width, y - 0.5 * height), words, ink)

    def _paint_lines(self, painter: QPainter, path: BallPath) -> tuple[Array, Array]:
        """Gap between head line and track, head line, track in the colours of the speed; return both on screen."""
        track = self.to_screen(np.stack([path.developed, path.place[:, 2]], axis=1))
        head = self.to_screen(np.stack([path.developed, path.head], axis=1))
        stroke = thin(Stroke(track, levels_of(path.speed, path.top_speed), path.regime))
        head = head[thinned(head, 1.5, np.zeros(len(head), dtype=np.int64))]
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(self.theme.colour("second", 0.09))
        painter.drawPolygon(polygon(np.concatenate([head, stroke.points[::-1]])))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.setPen(pen(self.theme.colour("second"), 1.6))
        painter.drawPolyline(polygon(head))
        draw_path(painter, stroke, path_colours(self.theme.dark), PATH_WIDTH)
        draw_slip(painter, stroke, self.theme.colour("warning"), 3.0)
        return stroke.points, head

    def _paint_rests(self, painter: QPainter, path: BallPath) -> None:
        """Bars where the ball rests."""
        for first, _ in regime_runs(path, Regime.REST):
            at = self.point(float(path.developed[first]), float(path.place[first, 2]))
            draw_rest(painter, at, self.theme.colour("ink"))

    def _paint_grip(self, painter: QPainter, labels: Labels) -> None:
        """Square at the end of the selected element, with the height of its outlet."""
        found = self.grip()
        if found is None:
            return
        outlet = self.layout_now.find(found[0]).outlet
        if outlet is None:
            return
        draw_grip(painter, found[1], self.theme, held=bool(self._held))
        labels.take(QRectF(found[1].x() - GRIP, found[1].y() - GRIP, 2.0 * GRIP, 2.0 * GRIP))
        words = length_words(float(outlet.position[2]), self.workspace.design.units, signed=True)
        write_about(
            painter, labels, found[1], words, small_ink(self.theme, self.font(), "accent", bold=True), GRIP + 4.0
        )

    # -- words ------------------------------------------------------------------------------------
    def _paint_names(self, painter: QPainter, path: BallPath) -> None:
        """Ticks where the ball enters each element, names where there is room: the selected first, then from left."""
        roll = self.workspace.roll
        if roll is None:
            return
        self.names = []
        base = self.height() - RULER
        painter.setPen(pen(self.theme.colour("line")))
        painter.drawLine(QPointF(1.0, base), QPointF(self.width() - RIGHT_AXIS, base))
        rooms = Labels(QRectF(2.0, base, self.width() - RIGHT_AXIS + 40.0, RULER))
        entries = [(placed_element(roll, each.index), float(path.developed[each.sample])) for each in arrivals(path)]
        marked = [(element, self.point(s, 0.0).x()) for element, s in entries if element is not None]
        chosen = self.workspace.selection
        for element, x in sorted(marked, key=lambda pair: pair[0].id not in chosen):
            selected = element.id in chosen
            painter.setPen(pen(self.theme.colour("accent" if selected else "soft"), 1.5 if selected else 1.0))
            painter.drawLine(QPointF(x, base - 5.0), QPointF(x, base + 5.0))
            ink = small_ink(self.theme, self.font(), "accent" if selected else "soft", bold=selected)
            size = text_size(ink.font, element.title)
            at = rooms.place(size, [QPointF(x + 4.0, base + 5.0)])
            box = QRectF(at, QPointF(at.x() + size[0], at.y() + size[1])) if at is not None else QRectF()
            self.names.append(Name(element.id, element.title, x, box))
            if at is not None:
                draw_text(painter, at, element.title, ink)

    def _paint_findings(self, painter: QPainter, labels: Labels, path: BallPath) -> None:
        """Marks of the findings on the track line, words beside all but notes."""
        roll = self.workspace.roll
        if roll is None or not self.workspace.current:
            return
        found = [(finding, finding_sample(finding, path, roll.layout)) for finding in shown_findings(roll.findings)]
        places = [
            (finding, self.point(float(path.developed[sample]), float(path.place[sample, 2])))
            for finding, sample in found
            if sample is not None
        ]
        inside = [(finding, at) for finding, at in places if 0.0 < at.x() < self.width() - RIGHT_AXIS]
        for finding, at in reversed(inside):
            draw_finding(painter, finding, at, self.theme)
            labels.take(QRectF(at.x() - 0.5 * MARK, at.y() - 0.5 * MARK, MARK, MARK))
        ink = small_ink(self.theme, self.font(), "ink")
        for finding, at in inside:
            if finding.severity is not Severity.NOTE:
                words = finding_title(self.workspace, finding).split(":")[0].lower()
                write_about(painter, labels, at, words, ink, MARK)

    # -- the grip ---------------------------------------------------------------------------------
    def grip(self) -> tuple[str, QPointF] | None:
        """Element whose end can be dragged up and down, and where its grip is; None unless one element is selected."""
        path, element = self._path, self.workspace.selected_element
        if path is None or element is None:
            return None
        rows = np.flatnonzero(path.element == self.layout_now.find(element.id).index)
        if len(rows) == 0:
            return None
        return element.id, self.point(float(path.developed[rows[-1]]), float(path.place[rows[-1], 2]))

    def _hold_grip(self, at: QPointF) -> bool:
        """Take hold of the grip when it is there."""
        found = self.grip()
        if found is None or (found[1] - at).manhattanLength() > 1.5 * GRIP:
            return False
        outlet = self.layout_now.find(found[0]).outlet
        if outlet is None:
            return False
        self._held, self._drag_number = found[0], self._drag_number + 1
        self._lift = float(outlet.position[2] - self.to_world(at)[1])
        return True

    def _raise(self, at: QPointF) -> None:
        """Let grade or drop follow the grip; where that cannot be, the element stays as it is."""
        height = float(self.to_world(at)[1]) + self._lift
        try:
            changed = raised(self.layout_now, self._held, height)
        except TrundleError:
            return
        element = self.workspace.element(self._held)
        words = f"drag height of {element.title if element is not None else self._held}"
        self.workspace.edit(words, changed, f"raise {self._held} {self._drag_number}")

    # -- time -------------------------------------------------------------------------------------
    def paint_moving(self, painter: QPainter) -> None:
        """Paint the time cursor with its readout and the ball."""
        path = self._path
        if path is None:
            return
        moment = moment_at(path, self.workspace.time)
        at = self.point(moment.developed, float(moment.place[2]))
        painter.setPen(pen(self.theme.colour("accent"), 1.25))
        painter.drawLine(QPointF(at.x(), 32.0), QPointF(at.x(), self.height() - RULER + 5.0))
        draw_ball(painter, at, 4.0, self.theme)
        second = f"load {moment.load:.1f} g"
        if math.isfinite(moment.angle):
            second = f"wall angle {math.degrees(moment.angle):.0f}°   {second}".replace("-", "\u2212")
        if path.regime[moment.sample] == int(Regime.FLIGHT):
            second = "in flight"
        lines = [f"{moment.t:.2f} s   {moment.speed:.2f} m/s", second]
        elevation_words.paint_readout(painter, self, at, lines)

    def name_at(self, at: QPointF) -> str:
        """Id of the element whose name or tick is at a place of the screen; empty for none."""
        if at.y() < self.height() - RULER - 2.0:
            return ""
        for name in self.names:
            if name.box.adjusted(-3, -3, 3, 3).contains(at) or abs(at.x() - name.x) <= 4.0:
                return name.element
        return ""

    def take_hold(self, at: QPointF) -> bool:
        """Take hold of the grip, else scrub, unless a name was pressed."""
        if self._path is None or self.name_at(at):
            return False
        if self._hold_grip(at):
            return True
        self.dragged(at)
        return True

    def dragged(self, at: QPointF) -> None:
        """Move the grip, else the time cursor to the way travelled under the pointer."""
        if self._held:
            self._raise(at)
        elif self._path is not None:
            self.workspace.set_time(time_at(self._path, float(self.to_world(at)[0])))

    def let_go(self, at: QPointF) -> None:
        """Let go of the grip, and show all of what it made."""
        if self._held:
            self._held = ""
            self.fit() if self._fitted else self.redraw()

    def clicked(self, at: QPointF) -> None:
        """Select the element whose name was clicked."""
        found = self.name_at(at)
        if found:
            self.workspace.select((found,))

    def hovered(self, at: QPointF) -> None:
        """Tell the name of an element at its tick."""
        found = self.name_at(at)
        element = self.workspace.element(found) if found else None
        self.setToolTip(element.title if element is not None else "")
        self.setCursor(Qt.CursorShape.PointingHandCursor if found else Qt.CursorShape.ArrowCursor)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Step through time with the arrow keys; the rest as on every sheet."""
        steps = {Qt.Key.Key_Left: -TIME_STEP, Qt.Key.Key_Right: TIME_STEP}
        if event.key() in steps and not event.modifiers() & Qt.KeyboardModifier.ControlModifier:
            big = 10.0 if event.modifiers() & Qt.KeyboardModifier.ShiftModifier else 1.0
            self.workspace.set_time(self.workspace.time + big * steps[Qt.Key(event.key())])
        else:
            super().keyPressEvent(event)
