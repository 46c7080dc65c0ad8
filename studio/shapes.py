"""Outlines of the marks of findings, shared by the list and the drawings: triangle, diamond, circle."""

import math

from PySide6.QtCore import QPointF

CIRCLE_CORNERS = 40


def mark_outline(shape: str, x: float, y: float, size: float) -> list[QPointF]:
    """Corners of a mark of some width about its middle, px."""
    half = 0.5 * size
    if shape == "triangle":
        rise = half * math.sqrt(3.0) / 2.0
        return [QPointF(x, y - rise), QPointF(x + half, y + rise), QPointF(x - half, y + rise)]
    if shape == "diamond":
        return [QPointF(x, y - half), QPointF(x + half, y), QPointF(x, y + half), QPointF(x - half, y)]
    turns = [2.0 * math.pi * corner / CIRCLE_CORNERS for corner in range(CIRCLE_CORNERS)]
    return [QPointF(x + 0.9 * half * math.cos(turn), y + 0.9 * half * math.sin(turn)) for turn in turns]
