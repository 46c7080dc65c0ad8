"""Named events of a reference case found in the case's own run."""

import math
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from engine.integrate import log as columns
from engine.integrate.result import EventKind
from engine.reference.run import CaseRun, crossing, state_of, state_of_mark

Array = NDArray[np.float64]


class Happened(NamedTuple):
    """Time (s) and state of an event of the own run."""

    t: float
    x: Array
    v: Array
    w: Array


STILL = 1e-6
"""Share of the largest vertical speed below which the ball counts as not moving up or down: rounding has a sign too."""
BEFORE = ("landing", "strikes", "first contact")
"""Touch-downs of which the case gives the state before the impact."""
TOUCH = ("after the impact", "after that impact", "impact ")
MARKED: tuple[tuple[tuple[str, ...], tuple[EventKind, ...]], ...] = (
    (("contact lost", "centre above"), (EventKind.PATCH, EventKind.LIFT_OFF)),
    (("lift-off",), (EventKind.LIFT_OFF,)),
    (("rolling starts",), (EventKind.GRIP,)),
    (("slip starts",), (EventKind.SLIP_ONSET,)),
    (("slip speed passes through zero",), (EventKind.SLIP_REVERSAL,)),
    (("stops for good",), (EventKind.REST,)),
    (TOUCH, (EventKind.TOUCH_DOWN,)),
)
"""Beginnings of a name and the kinds of event that it means."""


def turning_times(run: CaseRun, upward: bool) -> list[float]:
    """Return the times at which the vertical velocity passes zero, from below to above when `upward`."""
    samples = run.rows.samples
    t, vz = samples[:, columns.T], samples[:, columns.Y + 5]
    sign = 1.0 if upward else -1.0
    slope = _slopes(t, vz)
    moving = np.flatnonzero(np.abs(vz) > STILL * np.abs(vz).max())
    turns = np.flatnonzero((sign * vz[moving[:-1]] < 0.0) & (sign * vz[moving[1:]] > 0.0))
    return [crossing(t, vz, slope, (int(moving[i]), int(moving[i + 1])), 0.0) for i in turns]


def _slopes(t: Array, value: Array) -> Array:
    """Return the slopes of a sampled quantity, by parabolas; repeated times (events) are skipped."""
    keep = np.concatenate([[True], np.diff(t) > 0.0])
    slope = np.gradient(value[keep], t[keep], edge_order=2)
    return np.asarray(np.interp(t, t[keep], slope))


def axial_period(run: CaseRun) -> float:
    """Return the period of the up and down motion, s: twice the time between a lowest and the next highest point, or the
    time between two alike."""
    low, high = turning_times(run, True), turning_times(run, False)
    if len(low) > 1:
        return low[1] - low[0]
    if len(high) > 1:
        return high[1] - high[0]
    return 2.0 * abs(high[0] - low[0]) if low and high else math.nan


def found_by_motion(run: CaseRun, name: str) -> float | None:
    """Return the time of an event that is a turning point, None for other names."""
    low = ("first lowest point", "first passage of the lowest point")
    if name in low:
        return next(iter(turning_times(run, True)), math.nan)
    if name == "top":
        return next(iter(turning_times(run, False)), math.nan)
    if name == "first return":
        times = turning_times(run, False)
        return times[1] if len(times) > 1 else math.nan
    if name == "one axial period":
        return float(run.t[0]) + axial_period(run)
    return None


def happened(run: CaseRun, event: dict[str, Any], order: int) -> Happened | None:
    """Return what the own run has for a named event.

    Parameters
    ----------
    run : CaseRun
    event : dict
        Name, t and state of the case.
    order : int
        How many events of the same family came before it in the case.

    Returns
    -------
    Happened or None
        None when the run has no such event.
    """
    name = str(event["name"])
    t = found_by_motion(run, name)
    if t is not None:
        return None if math.isnan(t) else Happened(t, *state_of(run.at(float(event["t"]))))
    if name.startswith(BEFORE):
        marks = run.marks(EventKind.TOUCH_DOWN)
        if order >= len(marks):
            return None
        row = run.before(float(marks[order, columns.MARK_T]))
        return Happened(float(row[columns.T]), *state_of(row))
    marks = run.marks(*kinds_of(name))
    if order >= len(marks):
        return None
    return Happened(float(marks[order, columns.MARK_T]), *state_of_mark(marks[order]))


def kinds_of(name: str) -> tuple[EventKind, ...]:
    """Return the kinds of event that a name means; none for an unknown name."""
    for beginnings, kinds in MARKED:
        if name.startswith(beginnings):
            return kinds
    return ()


def family(name: str) -> str:
    """Return the family within which events are counted."""
    if name.startswith(BEFORE):
        return "before"
    return ",".join(kind.name for kind in kinds_of(name)) or name
