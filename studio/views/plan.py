"""The plan: every wall to scale from above, lower ones first, with the path in its colours and the ball on it."""

from typing import TYPE_CHECKING, Any

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt, Slot
from PySide6.QtGui import QBrush, QPainter, QPolygonF
from PySide6.QtWidgets import QWidget

from engine.errors import TrundleError
from engine.findings.finding import Finding, Severity
from studio.display import (
    Array,
    BallPath,
    finding_place,
    layout_of,
    levels_of,
    moment_at,
    path_of,
    shown_findings,
)
from studio.dragging import Grip, dragged, grips_of
from studio.outlines import Outline, nearest_outline, outlines_of
from studio.theme import Theme
from studio.views import plan_words
from studio.views.canvas import Canvas
from studio.widgets.marks import GRIP, MARK, draw_ball, draw_finding, draw_grip
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
)
from studio.words import finding_title
from studio.workspace import Workspace

if TYPE_CHECKING:
    from engine.placement import Placed

HALO = 3.5
"""px of sheet colour on both sides of what passes over something."""
DRAG_STEP = 3.0
"""px. A drag rounds lengths to a round one of about this size."""
REACH = 7.0
"""px within which a click finds an element."""
PATH_WIDTH = 2.0
STALE = 0.35
"""Opacity of a path that belongs to an earlier state of the design."""
SCALE_WIDTH, SCALE_HEIGHT = 96.0, 5.0
"""px. The bar that tells the colours of speeds."""


class PlanView(Canvas):
    """Plan of the design."""

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(workspace, theme, "Plan", parent)
        self.setAccessibleDescription("Walls, path and findings from above; click selects an element.")
        self._outlines: list[Outline] = []
        self._path: BallPath | None = None
        self._hover: str = ""
        self._held: Grip | None = None
        self._drag_number = 0
        self.grips: list[tuple[Grip, QPointF]] = []
        self._take_design()
        self._take_roll()
        workspace.designChanged.connect(self._take_design)
        workspace.rolled.connect(self._take_roll)
        workspace.selectionChanged.connect(self.redraw)
        workspace.timeChanged.connect(self.update)

    # -- what is shown ----------------------------------------------------------------------------
    @Slot()
    def _take_design(self, *_: Any) -> None:
        empty = not self._outlines
        self.layout_now = layout_of(self.workspace.design, self.workspace.roll)
        self._outlines = outlines_of(self.layout_now)
        self.fit() if empty else self.redraw()

    @Slot()
    def _take_roll(self, *_: Any) -> None:
        self._path = path_of(self.workspace.roll)
        self.redraw()

    def world_bounds(self) -> Array | None:
        """Low and high corner of elements and site, m."""
        corners = [outline.fill for outline in self._outlines]
        site = self.workspace.design.site
        if site is not None:
            corners.append(np.array(site.outline))
        if not corners:
            return None
        points = np.concatenate(corners)
        return np.stack([points.min(axis=0), points.max(axis=0)])

    @property
    def selected(self) -> "list[Placed]":
        """Selected elements as placed."""
        return [entry for entry in self.layout_now.placed if entry.element.id in self.workspace.selection]

    # -- painting ---------------------------------------------------------------------------------
    def paint_static(self, painter: QPainter) -> None:
        """Paint grid, site, walls, path, findings and words."""
        labels = Labels(QRectF(self.rect()).adjusted(6, 6, -6, -6), self._lines())
        labels.take(QRectF(8, 6, 60, 22))
        self.paint_grid(painter)
        self._paint_site(painter)
        for outline in self._outlines:
            self._paint_outline(painter, outline)
        self._paint_path(painter)
        self._take_grips(labels)
        marked = self._paint_findings(painter, labels)
        plan_words.write_selected(painter, self, labels)
        self._name_findings(painter, labels, marked)
        for grip, at in self.grips:
            draw_grip(painter, at, self.theme, held=self._is_held(grip))
        self._paint_scale(painter, labels)
        plan_words.write_site(painter, self, labels)
        plan_words.write_names(painter, self, labels)

    def _lines(self) -> Array:
        """Points on screen of the edges of walls, which words keep off."""
        found = [dotted(self.to_screen(line)) for outline in self._outlines for line in outline.edges]
        return np.concatenate(found) if found else np.zeros((0, 2))

    def _paint_site(self, painter: QPainter) -> None:
        site = self.workspace.design.site
        if site is None:
            return
        colour = self.theme.colour("second")
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.setPen(pen(colour, 1.25))
        painter.drawPolygon(polygon(self.to_screen(np.array(site.outline))))
        for box in site.keep_outs:
            rect = QRectF(self.point(box.min[0], box.max[1]), self.point(box.max[0], box.min[1]))
            painter.setPen(pen(colour, 1.0, Qt.PenStyle.DashLine))
            painter.setBrush(QBrush(self.theme.colour("second", 0.45), Qt.BrushStyle.BDiagPattern))
            painter.drawRect(rect)

    def _paint_outline(self, painter: QPainter, outline: Outline) -> None:
        chosen = outline.element in self.workspace.selection
        fill = self.to_screen(outline.fill)
        edge = self.theme.colour("accent" if chosen else "tube")
        if not outline.edges:
            painter.setPen(pen(edge, 1.25, Qt.PenStyle.DashLine))
            painter.drawPolyline(polygon(fill))
            return
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(self.theme.colour("sheet"))
        if outline.outward is not None:
            painter.drawPolygon(polygon(fill + HALO * outline.outward * (1.0, -1.0)))
        else:
            painter.setPen(pen(self.theme.colour("sheet"), 2.0 * HALO))
            painter.drawPolygon(polygon(fill))
            painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(self.theme.colour("accent_bg" if chosen else "tube_fill"))
        painter.drawPolygon(polygon(fill))
        if outline.hole is not None:
            painter.setBrush(self.theme.colour("sheet"))
            painter.drawPolygon(polygon(self.to_screen(outline.hole)))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.setPen(pen(edge, 1.25))
        for line in outline.edges:
            painter.drawPolyline(polygon(self.to_screen(line)))
        edge.setAlphaF(0.5)
        painter.setPen(pen(edge, 0.8))
        for line in outline.fine:
            painter.drawPolyline(polygon(self.to_screen(line)))

    def _paint_path(self, painter: QPainter) -> None:
        path = self._path
        if path is None:
            return
        painter.setOpacity(1.0 if self.workspace.current else STALE)
        points = self.to_screen(path.place[:, :2])
        stroke = thin(Stroke(points, levels_of(path.speed, path.top_speed), path.regime))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        draw_path(painter, stroke, path_colours(self.theme.dark), PATH_WIDTH)
        draw_slip(painter, stroke, self.theme.colour("warning"), 2.5)
        painter.setOpacity(1.0)

    def _paint_findings(self, painter: QPainter, labels: Labels) -> list[tuple[Finding, QPointF]]:
        """Marks of the findings, the worst on top; return them with their places on screen."""
        roll = self.workspace.roll
        if roll is None or not self.workspace.current:
            return []
        places = [(finding, finding_place(finding, self.layout_now)) for finding in shown_findings(roll.findings)]
        marked = [(finding, self.point(place[0], place[1])) for finding, place in places if place is not None]
        for finding, at in reversed(marked):
            draw_finding(painter, finding, at, self.theme)
            labels.take(QRectF(at.x() - 0.5 * MARK, at.y() - 0.5 * MARK, MARK, MARK))
        return marked

    def _name_findings(self, painter: QPainter, labels: Labels, marked: list[tuple[Finding, QPointF]]) -> None:
        """Words beside all marks but those of notes."""
        ink = small_ink(self.theme, self.font(), "ink")
        for finding, at in marked:
            if finding.severity is not Severity.NOTE:
                words = finding_title(self.workspace, finding).split(":")[0].lower()
                plan_words.write_about(painter, labels, at, words, ink, MARK)

    def _take_grips(self, labels: Labels) -> None:
        """Places of the grips of the selected on screen."""
        self.grips = []
        for entry in self.selected:
            for grip in grips_of(entry):
                at = self.point(float(grip.place[0]), float(grip.place[1]))
                self.grips.append((grip, at))
                labels.take(QRectF(at.x() - GRIP, at.y() - GRIP, 2 * GRIP, 2 * GRIP))

    def _is_held(self, grip: Grip) -> bool:
        """Whether a grip is the one that is dragged."""
        return self._held is not None and self._held[:3] == grip[:3]

    def _paint_scale(self, painter: QPainter, labels: Labels) -> None:
        """Bar of the colours of speeds, lower right."""
        if self._path is None:
            return
        ink = small_ink(self.theme, self.font())
        words = f"{self._path.top_speed:.2f} m/s"
        width, height = text_size(ink.font, words)
        right, y = self.width() - 14.0 - width, self.height() - 16.0
        colours = path_colours(self.theme.dark)
        painter.setPen(Qt.PenStyle.NoPen)
        left = right - 6.0 - SCALE_WIDTH
        share = SCALE_WIDTH / len(colours)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
        for number, colour in enumerate(colours):
            painter.fillRect(QRectF(left + number * share, y - 0.5 * SCALE_HEIGHT, share + 0.5, SCALE_HEIGHT), colour)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        draw_text(painter, QPointF(right, y - 0.5 * height), words, ink)
        zero = text_size(ink.font, "0")[0]
        draw_text(painter, QPointF(left - zero - 6.0, y - 0.5 * height), "0", ink)
        labels.take(QRectF(left - zero - 12.0, y - height, self.width() - left, 2.0 * height))

    def paint_moving(self, painter: QPainter) -> None:
        """Paint the ball, and the outline under the pointer."""
        if self._hover and self._hover not in self.workspace.selection:
            painter.setPen(pen(self.theme.colour("accent"), 1.25))
            painter.setBrush(Qt.BrushStyle.NoBrush)
            for outline in self._outlines:
                if outline.element == self._hover:
                    for line in outline.edges or outline.fine:
                        painter.drawPolyline(polygon(self.to_screen(line)))
        if self._path is not None:
            place = moment_at(self._path, self.workspace.time).place
            draw_ball(painter, self.point(place[0], place[1]), self._path.radius * float(self.scale[0]), self.theme)

    # -- pointer ----------------------------------------------------------------------------------
    def element_at(self, at: QPointF) -> str:
        """Id of the topmost element at a place of the screen; empty for none."""
        found = nearest_outline(self._outlines, self.to_world(at), REACH / float(self.scale[0]))
        return found.element if found is not None else ""

    def grip_at(self, at: QPointF) -> Grip | None:
        """Grip at a place of the screen."""
        for grip, place in self.grips:
            if QRectF(place.x() - GRIP, place.y() - GRIP, 2 * GRIP, 2 * GRIP).contains(at):
                return grip
        return None

    def take_hold(self, at: QPointF) -> bool:
        """Take hold of a grip."""
        self._held = self.grip_at(at)
        self._drag_number += 1
        return self._held is not None

    def dragged(self, at: QPointF) -> None:
        """Let the element follow the grip; where it cannot, it stays as it is."""
        grip = self._held
        if grip is None:
            return
        step = self.grid_step(0, DRAG_STEP)
        try:
            changed = dragged(self.layout_now, grip, self.to_world(at), step)
        except TrundleError:
            return
        element = self.workspace.element(grip.element)
        words = f"drag {grip.role} of {element.title if element is not None else grip.element}"
        self.workspace.edit(words, changed, f"drag {grip.element} {grip.role} {grip.number} {self._drag_number}")

    def let_go(self, at: QPointF) -> None:
        """Let go of the grip."""
        self._held = None
        self.redraw()

    def clicked(self, at: QPointF) -> None:
        """Select what is under the pointer."""
        found = self.element_at(at)
        self.workspace.select((found,) if found else ())

    def hovered(self, at: QPointF) -> None:
        """Show what a click would select."""
        found = self.element_at(at)
        grip = self.grip_at(at)
        self.setCursor(Qt.CursorShape.SizeAllCursor if grip is not None else Qt.CursorShape.ArrowCursor)
        if found != self._hover:
            self._hover = found
            element = self.workspace.element(found) if found else None
            self.setToolTip(element.title if element is not None else "")
            self.update()

    def polygon_of(self, points: Array) -> QPolygonF:
        """Polygon on screen of points (n, 2) in m."""
        return polygon(self.to_screen(points))
