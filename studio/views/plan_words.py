"""Words and dimensions in the plan: radius, turn, heights and grade of what is selected, names, size of the site."""

import math
from typing import TYPE_CHECKING

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QPainter

from engine.model.elements import SegmentBase, VesselBase
from engine.units import DEGREE, display
from studio.dragging import centre_of
from studio.resources import USUAL
from studio.widgets.strokes import Ink, Labels, draw_text, font_of, pen, round_about, small_ink, text_size

if TYPE_CHECKING:
    from engine.placement import Placed
    from studio.views.plan import PlanView

NAME_ROOM = 46.0
"""px. Elements smaller than this on screen are named only when they are selected."""


def length_words(value: float, units: str, signed: bool = False) -> str:
    """Length as on a drawing: in the unit of the design, without its name."""
    number = display(value, "m", units)[0]
    digits = {"mm": 0, "cm": 1, "m": 3, "in": 2}[units]
    words = f"{number:+.{digits}f}" if signed else f"{number:.{digits}f}"
    return words.replace("-", "\u2212")


def write_about(painter: QPainter, labels: Labels, at: QPointF, words: str, ink: Ink, gap: float) -> bool:
    """Write a text beside a place where there is room; return whether there was."""
    size = text_size(ink.font, words)
    corner = labels.place(size, round_about(at.x(), at.y(), size, gap))
    if corner is not None:
        draw_text(painter, corner, words, ink)
    return corner is not None


def write_selected(painter: QPainter, view: "PlanView", labels: Labels) -> None:
    """Dimensions of the selected elements; of one only, when many are selected their names are enough."""
    chosen = view.selected
    if len(chosen) != 1:
        return
    entry = chosen[0]
    _write_radius(painter, view, labels, entry)
    ink = small_ink(view.theme, view.font())
    units = view.workspace.design.units
    for pose, more in ((entry.inlet, ""), (entry.outlet, grade_words(entry))):
        if pose is not None:
            words = f"{length_words(float(pose.position[2]), units, signed=True)}{more}"
            write_about(painter, labels, view.point(*pose.position[:2].tolist()), words, ink, 10.0)


def grade_words(entry: "Placed") -> str:
    """Grade at the outlet of a segment."""
    if not isinstance(entry.element, SegmentBase) or entry.outlet is None or not math.isfinite(entry.outlet.grade):
        return ""
    return f"  {100.0 * entry.outlet.grade:.1f} %"


def _write_radius(painter: QPainter, view: "PlanView", labels: Labels, entry: "Placed") -> None:
    """Line from the centre of a bend or helix, or across a vessel, with the radius on it."""
    centre, radius = _circle(entry)
    if centre is None or radius is None:
        return
    at = view.point(float(centre[0]), float(centre[1]))
    rim = _rim_point(entry, centre, radius)
    end = view.point(float(rim[0]), float(rim[1]))
    painter.setPen(pen(view.theme.colour("accent"), 1.0, Qt.PenStyle.DashLine))
    painter.drawLine(at, end)
    words = f"R {length_words(radius, view.workspace.design.units)}"
    ink = Ink(view.theme.colour("accent"), font_of(view.font(), USUAL, bold=True), view.theme.colour("sheet"))
    middle, size = 0.5 * (at + end), text_size(ink.font, words)
    above, below, *beside = sorted(
        round_about(middle.x(), middle.y(), size, 5.0), key=lambda corner: abs(corner.x() + 0.5 * size[0] - middle.x())
    )
    corner = labels.place(size, [above, below, *beside])
    if corner is not None:
        draw_text(painter, corner, words, ink)


def _circle(entry: "Placed") -> tuple[np.ndarray | None, float | None]:
    """Centre and radius of what is round."""
    if entry.meridian is not None and entry.origin is not None:
        return entry.origin, float(entry.meridian[:, 1].max())
    return centre_of(entry), getattr(entry.element, "radius", None)


def _rim_point(entry: "Placed", centre: np.ndarray, radius: float) -> np.ndarray:
    """Middle of a bend; for what goes all round, a point to the right and up."""
    turn = getattr(entry.element, "turn", None)
    if turn is not None and entry.curve is not None and abs(turn) < 2.0 * math.pi:
        return np.asarray(entry.curve[len(entry.curve) // 2, 1:4])
    return np.asarray(centre + radius * np.array([math.cos(0.6), math.sin(0.6), 0.0]))


def write_site(painter: QPainter, view: "PlanView", labels: Labels) -> None:
    """Size of the site at its lower left corner, names of keep-outs."""
    site = view.workspace.design.site
    if site is None:
        return
    ink = small_ink(view.theme, view.font(), "second")
    corners = np.array(site.outline)
    low, high = corners.min(axis=0), corners.max(axis=0)
    units = view.workspace.design.units
    size = " \u00d7 ".join(length_words(float(part), units) for part in high - low)
    _write_inside(painter, labels, view.point(float(low[0]), float(low[1])), f"site {size}", ink)
    for box in site.keep_outs:
        _write_inside(painter, labels, view.point(box.min[0], box.min[1]), box.name or box.id, ink)


def _write_inside(painter: QPainter, labels: Labels, corner: QPointF, words: str, ink: Ink) -> None:
    """Write at the lower left corner of a box: inside, else below it."""
    width, height = text_size(ink.font, words)
    places = [QPointF(corner.x() + 6.0, corner.y() - height - 4.0), QPointF(corner.x(), corner.y() + 3.0)]
    at = labels.place((width, height), places)
    if at is not None:
        draw_text(painter, at, words, ink)


def write_names(painter: QPainter, view: "PlanView", labels: Labels) -> None:
    """Names of vessels, helices and whatever is large enough, the selected first."""
    ink = small_ink(view.theme, view.font())
    bold = small_ink(view.theme, view.font(), "accent", bold=True)
    chosen = view.workspace.selection
    for entry in sorted(view.layout_now.placed, key=lambda each: each.element.id not in chosen):
        selected = entry.element.id in chosen
        box = _box(view, entry)
        if not selected and max(box.width(), box.height()) < NAME_ROOM:
            continue
        _write_name(
            painter, labels, box, (entry.element.title + _turn_words(entry), bold if selected else ink, selected)
        )


def _box(view: "PlanView", entry: "Placed") -> QRectF:
    low, high = entry.bounds()
    return QRectF(view.point(float(low[0]), float(high[1])), view.point(float(high[0]), float(low[1])))


def _write_name(painter: QPainter, labels: Labels, box: QRectF, words: tuple[str, Ink, bool]) -> None:
    text, ink, needed = words
    width, height = text_size(ink.font, text)
    middle = box.center().x() - 0.5 * width
    below, above = QPointF(middle, box.bottom() + 6.0), QPointF(middle, box.top() - height - 6.0)
    beside = [
        QPointF(box.right() + 12.0, box.center().y() - 0.5 * height),
        QPointF(box.left() - width - 12.0, box.center().y() - 0.5 * height),
    ]
    inner = QPointF(middle, box.center().y() - 0.5 * height)
    at = labels.place((width, height), [below, above, *beside, inner], needed=needed)
    if at is not None:
        draw_text(painter, at, text, ink)


def _turn_words(entry: "Placed") -> str:
    """Turns of a helix, turn of a bend."""
    turns = getattr(entry.element, "turns", None)
    if turns is not None:
        return f" · {abs(turns):.3g} turns"
    if isinstance(entry.element, VesselBase):
        return ""
    turn = getattr(entry.element, "turn", None)
    return f" · {abs(turn) / DEGREE:.0f}°" if turn else ""
