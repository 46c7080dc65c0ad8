"""Findings that need no run: jam, counter-grade, joints, curvature jumps, clashes, out of the site."""

import math

import numpy as np
from numpy.typing import NDArray

from engine.findings.finding import Finding, FindingKind, Severity
from engine.findings.limits import limit
from engine.findings.motion import Rolled, name_of
from engine.geometry.tables import R
from engine.model.elements import SEGMENTS
from engine.placement import Placed

Array = NDArray[np.float64]
TANGENT, SECOND = slice(4, 7), slice(7, 10)


def here(rolled: Rolled, entry: Placed, s: float) -> dict[str, object]:
    """Return the fields of a finding that say where on an element it is."""
    position = entry.inlet.position
    where = name_of(entry)
    if entry.curve is not None:
        row = int(np.argmin(np.abs(entry.curve[:, 0] - s)))
        position = entry.curve[row, R]
        where = f"{where}, {rolled.length(s)} along"
    x, y, z = (float(value) for value in position)
    return {"where": where, "segment": entry.element.id, "s": s, "t": math.nan, "position": (x, y, z)}


def largest_ball(rolled: Rolled, run_id: str) -> float:
    """Return the largest radius of the ball of a run within its tolerance, m."""
    ball = rolled.design.ball_of(rolled.design.run(run_id))
    return float(ball.layers[-1].radius + 0.5 * ball.diameter_tolerance)


def jams(rolled: Rolled) -> list[Finding]:
    """Find bores too narrow for the largest ball and bends too tight for it."""
    found = []
    for entry in rolled.layout.placed:
        if not isinstance(entry.element, SEGMENTS) or entry.curve is None or entry.bore is None:
            continue
        r = largest_ball(rolled, entry.run)
        room = 2.0 * (entry.bore - r)
        need = max(limit("clearance") * 2.0 * r, limit("clearance_length"))
        if room < need:
            severity = Severity.FAILS if room <= 0.0 else Severity.THIN
            found.append(_narrow(rolled, entry, room, need, severity))
        bend = np.linalg.norm(entry.curve[:, SECOND], axis=1)
        row = int(np.argmax(bend))
        if bend[row] * entry.bore >= 1.0:
            found.append(_tight(rolled, entry, float(entry.curve[row, 0]), 1.0 / float(bend[row])))
    return found


def _narrow(rolled: Rolled, entry: Placed, room: float, need: float, severity: Severity) -> Finding:
    return Finding(
        kind=FindingKind.JAM,
        severity=severity,
        value=room,
        limit=need,
        unit="m",
        sentence=f"The bore of {name_of(entry)} leaves {rolled.length(room)} over the largest ball; "
        f"{rolled.length(need)} is needed.",
        cure=f"Widen the bore by {rolled.length(need - room)} or take a smaller ball.",
        **here(rolled, entry, 0.0),  # type: ignore[arg-type]
    )


def _tight(rolled: Rolled, entry: Placed, s: float, radius: float) -> Finding:
    bore = entry.bore or 0.0
    return Finding(
        kind=FindingKind.JAM,
        severity=Severity.FAILS,
        value=radius,
        limit=bore,
        unit="m",
        sentence=f"{name_of(entry)} bends to a radius of {rolled.length(radius)}, less than its bore radius of "
        f"{rolled.length(bore)}: its wall folds into itself.",
        cure=f"Bend no tighter than {rolled.length(2.0 * bore)}.",
        **here(rolled, entry, s),  # type: ignore[arg-type]
    )


def counter_grades(rolled: Rolled) -> list[Finding]:
    """Find segments that climb in the direction of travel (a loop climbs by its nature)."""
    found = []
    for entry in rolled.layout.placed:
        if entry.curve is None or entry.element.kind in ("loop", "free_line"):
            continue
        rise = entry.curve[:, 6]
        row = int(np.argmax(rise))
        if rise[row] <= limit("uphill"):
            continue
        climb = float(entry.curve[:, 3].max() - entry.curve[0, 3])
        found.append(
            Finding(
                kind=FindingKind.COUNTER_GRADE,
                severity=Severity.NOTE,
                value=-float(rise[row]),
                limit=0.0,
                unit="ratio",
                sentence=f"{name_of(entry)} climbs {rolled.length(climb)} in the direction of travel.",
                cure="Turn its grade downhill, or keep the head to climb it.",
                **here(rolled, entry, float(entry.curve[row, 0])),  # type: ignore[arg-type]
            )
        )
    return found


def joints(rolled: Rolled) -> list[Finding]:
    """Find kinks, steps up and curvature jumps where one segment follows another."""
    found = []
    for before, after in zip(rolled.layout.placed, rolled.layout.placed[1:]):
        if before.run != after.run or before.curve is None or after.curve is None:
            continue
        a, b = before.curve[-1], after.curve[0]
        cosine = float(np.clip(a[TANGENT] @ b[TANGENT], -1.0, 1.0))
        kink = math.acos(cosine)
        if kink > limit("joint_angle"):
            found.append(_kink(rolled, before, after, kink))
        step = (before.bore or 0.0) - (after.bore or 0.0)
        if step > limit("joint_step"):
            found.append(_step(rolled, before, after, step))
        jump = float(np.linalg.norm(a[SECOND] - b[SECOND]))
        if jump > limit("curvature_jump"):
            found.append(_jump(rolled, before, after, jump))
    return found


def _kink(rolled: Rolled, before: Placed, after: Placed, kink: float) -> Finding:
    degrees = math.degrees(kink)
    return Finding(
        kind=FindingKind.JOINT,
        severity=Severity.THIN,
        value=kink,
        limit=limit("joint_angle"),
        unit="rad",
        sentence=f"{name_of(before)} and {name_of(after)} meet at an angle of {degrees:.1f}°; "
        f"{math.degrees(limit('joint_angle')):.0f}° throws no ball.",
        cure="Put a vertical easing or a transition between them, or give both one grade.",
        **here(rolled, after, 0.0),  # type: ignore[arg-type]
    )


def _step(rolled: Rolled, before: Placed, after: Placed, step: float) -> Finding:
    return Finding(
        kind=FindingKind.JOINT,
        severity=Severity.FAILS,
        value=step,
        limit=limit("joint_step"),
        unit="m",
        sentence=f"The running face steps up by {rolled.length(step)} from {name_of(before)} to {name_of(after)}.",
        cure=f"Give {name_of(after)} the bore of {name_of(before)}, or a wider one.",
        **here(rolled, after, 0.0),  # type: ignore[arg-type]
    )


def _jump(rolled: Rolled, before: Placed, after: Placed, jump: float) -> Finding:
    return Finding(
        kind=FindingKind.CURVATURE_JUMP,
        severity=Severity.NOTE,
        value=jump,
        limit=limit("curvature_jump"),
        unit="1/m",
        sentence=f"Curvature jumps by {jump:.1f} 1/m from {name_of(before)} to {name_of(after)}: "
        "the ball starts to swing.",
        cure="Ease this joint with a transition.",
        **here(rolled, after, 0.0),  # type: ignore[arg-type]
    )


def outer_radius(entry: Placed) -> float:
    """Return the outer radius of a segment, m."""
    wall = getattr(getattr(entry.element, "section", None), "wall", 0.0)
    return (entry.bore or 0.0) + float(wall)


def clashes(rolled: Rolled) -> list[Finding]:
    """Find segments that run through each other (neighbours in a run meet by design)."""
    entries = [entry for entry in rolled.layout.placed if entry.curve is not None]
    if len(entries) < 2:
        return []
    boxes = np.stack([entry.bounds() for entry in entries])
    wall = np.array([outer_radius(entry) - (entry.bore or 0.0) for entry in entries])[:, None]
    low, high = boxes[:, 0] - wall, boxes[:, 1] + wall
    meet = ((low[:, None] < high[None]) & (low[None] < high[:, None])).all(axis=2)
    found = []
    for i, j in zip(*np.nonzero(np.triu(meet, 1)), strict=True):
        one, two = entries[int(i)], entries[int(j)]
        if one.run == two.run and abs(one.index - two.index) == 1:
            continue
        gap, s = _nearest(one, two)
        if gap < limit("clash"):
            found.append(_clash(rolled, one, two, gap, s))
    return found


COARSE, FINE = 0.02, 0.002
"""m. Spacing of the points between which two segments are compared, and of those near the closest pair."""


def _nearest(one: Placed, two: Placed) -> tuple[float, float]:
    """Return the room between two segments (m, negative: overlap) and the place on the first."""
    if one.curve is None or two.curve is None:
        return math.inf, 0.0
    ends = [(float(entry.curve[0, 0]), float(entry.curve[-1, 0])) for entry in (one, two) if entry.curve is not None]
    touching = outer_radius(one) + outer_radius(two)
    for spacing in (COARSE, FINE):
        a, b = (points_along(entry.curve, span, spacing) for entry, span in ((one, ends[0]), (two, ends[1])))
        square = ((a[:, None, 1:4] - b[None, :, 1:4]) ** 2).sum(axis=2)
        if one.run == two.run:
            # what follows closely along the run is near by design
            apart = np.abs((two.start + b[None, :, 0]) - (one.start + a[:, None, 0]))
            square = np.where(apart < math.pi * touching, np.inf, square)
        i, j = np.unravel_index(int(np.argmin(square)), square.shape)
        nearest = math.sqrt(square[i, j])
        if nearest > touching + spacing:
            break
        ends = [(float(a[i, 0]) - COARSE, float(a[i, 0]) + COARSE), (float(b[j, 0]) - COARSE, float(b[j, 0]) + COARSE)]
    return nearest - touching, float(a[i, 0])


def points_along(curve: Array | None, span: tuple[float, float], spacing: float) -> Array:
    """Return rows (s, x, y, z) along part of a centreline, no farther apart than `spacing` m (chords between the
    knots).
    """
    if curve is None:
        return np.zeros((0, 4))
    low, high = max(span[0], float(curve[0, 0])), min(span[1], float(curve[-1, 0]))
    s = np.linspace(low, high, max(2, math.ceil((high - low) / spacing) + 1))
    return np.column_stack([s, *(np.interp(s, curve[:, 0], curve[:, k]) for k in (1, 2, 3))])


def _clash(rolled: Rolled, one: Placed, two: Placed, gap: float, s: float) -> Finding:
    return Finding(
        kind=FindingKind.CLASH,
        severity=Severity.FAILS,
        value=gap,
        limit=limit("clash"),
        unit="m",
        sentence=f"{name_of(one)} and {name_of(two)} run through each other by {rolled.length(-gap)}.",
        cure=f"Move one of them by at least {rolled.length(-gap)}.",
        **here(rolled, one, s),  # type: ignore[arg-type]
    )


def outside(rolled: Rolled) -> list[Finding]:
    """Find elements that leave the site or enter a keep-out."""
    site = rolled.design.site
    if site is None:
        return []
    found = []
    low = np.array([*np.min(site.outline, axis=0), site.floor])
    high = np.array([*np.max(site.outline, axis=0), site.floor + site.height])
    for entry in rolled.layout.placed:
        box = entry.bounds()
        over = float(max((low - box[0]).max(), (box[1] - high).max()))
        if over > 0.0:
            found.append(_outside(rolled, entry, over, "leaves the site"))
        for keep in site.keep_outs:
            inside = np.minimum(box[1], keep.max) - np.maximum(box[0], keep.min)
            if (inside > 0.0).all():
                found.append(_outside(rolled, entry, float(inside.min()), f"enters {keep.name or keep.id}"))
    return found


def _outside(rolled: Rolled, entry: Placed, over: float, what: str) -> Finding:
    return Finding(
        kind=FindingKind.OUT_OF_SITE,
        severity=Severity.FAILS,
        value=over,
        limit=0.0,
        unit="m",
        sentence=f"{name_of(entry)} {what} by {rolled.length(over)}.",
        cure=f"Move it back by {rolled.length(over)}, or change the site.",
        **here(rolled, entry, 0.0),  # type: ignore[arg-type]
    )


def of_geometry(rolled: Rolled) -> list[Finding]:
    """Return every finding that needs no run."""
    return [finding for detector in (jams, counter_grades, joints, clashes, outside) for finding in detector(rolled)]
