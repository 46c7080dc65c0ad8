"""Marks on the drawings: findings by shape, grips of what is selected, ticks, bars, the ball."""

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QPainter, QPolygonF

from engine.findings.finding import Finding
from studio.item_models import SHAPES, TOKENS
from studio.shapes import mark_outline
from studio.theme import Theme
from studio.widgets.strokes import pen

MARK = 13.0
"""px. Size of the mark of a finding."""
GRIP = 8.0
"""px. Side of the square by which a thing is taken hold of."""
LEAST_BALL = 4.0
"""px. Least radius of the ball on a drawing."""


def mark_shape(finding: Finding) -> str:
    """Shape by which a finding is known: triangle, diamond or circle."""
    return SHAPES[finding.severity]


def mark_colour(finding: Finding, theme: Theme) -> QColor:
    """Colour of the mark of a finding."""
    return theme.colour(TOKENS[mark_shape(finding)])


def draw_finding(painter: QPainter, finding: Finding, at: QPointF, theme: Theme) -> None:
    """Draw the mark of a finding on a ground of sheet colour; filled when the run fails by it."""
    shape, colour = mark_shape(finding), mark_colour(finding, theme)
    painter.setPen(Qt.PenStyle.NoPen)
    painter.setBrush(theme.colour("sheet"))
    _draw_shape(painter, shape, at, MARK + 6.0)
    painter.setPen(pen(colour, 1.7))
    painter.setBrush(colour if shape == "triangle" else theme.colour("sheet"))
    _draw_shape(painter, shape, at, MARK)


def _draw_shape(painter: QPainter, shape: str, at: QPointF, size: float) -> None:
    if shape == "circle":
        painter.drawEllipse(at, 0.45 * size, 0.45 * size)
    else:
        painter.drawPolygon(QPolygonF(mark_outline(shape, at.x(), at.y(), size)))


def draw_grip(painter: QPainter, at: QPointF, theme: Theme, *, held: bool = False) -> None:
    """Draw the square by which a thing is taken hold of."""
    half = 0.5 * GRIP
    painter.setPen(pen(theme.colour("accent"), 1.5))
    painter.setBrush(theme.colour("accent" if held else "sheet"))
    painter.drawRect(QRectF(at.x() - half, at.y() - half, GRIP, GRIP))


def draw_tick(painter: QPainter, at: QPointF, along: QPointF, half: float) -> None:
    """Draw a tick of half length `half` px across a direction, with the pen in use."""
    across = QPointF(-along.y() * half, along.x() * half)
    painter.drawLine(at - across, at + across)


def draw_rest(painter: QPainter, at: QPointF, colour: QColor) -> None:
    """Draw the bar at which the ball rests."""
    painter.setPen(pen(colour, 3.0))
    painter.drawLine(at + QPointF(0.0, -8.0), at + QPointF(0.0, 8.0))


def draw_ball(painter: QPainter, at: QPointF, radius: float, theme: Theme) -> None:
    """Draw the ball, at least a few px large, with a rim of sheet colour."""
    size = max(radius, LEAST_BALL)
    painter.setPen(pen(theme.colour("sheet"), 1.5))
    painter.setBrush(theme.colour("ink"))
    painter.drawEllipse(at, size + 0.75, size + 0.75)
    painter.setBrush(Qt.BrushStyle.NoBrush)
