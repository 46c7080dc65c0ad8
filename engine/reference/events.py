"""Named events of a case found in its own run, by kind and order, never by the time that the case gives.

The n-th event of a name goes with the n-th mark of its kind; lowest points, tops and returns by a velocity.
"""

import re
from collections.abc import Callable
from typing import NamedTuple

import numpy as np

from engine.integrate import log as columns
from engine.integrate.result import EventKind
from engine.reference.reader import Array
from engine.reference.run import CaseRun, Moment, moment_of_mark, moment_of_sample

Finder = Callable[[CaseRun, int], Moment | None]
ORDINALS = {"first": 0, "second": 1, "third": 2, "fourth": 3, "fifth": 4}
NUMBERED = re.compile(r"^impact (\d+)$")


class Rule(NamedTuple):
    """Words of a name (any of them), how its moment is found, and the family whose order it counts in."""

    words: tuple[str, ...]
    finder: Finder
    family: str


def nth_mark(run: CaseRun, index: int, *kinds: EventKind) -> Array | None:
    """Return the index-th event row of these kinds, None when there are fewer."""
    marks = run.marks(*kinds)
    return np.asarray(marks[index]) if index < len(marks) else None


def _mark(*kinds: EventKind) -> Finder:
    """Return a finder of the state at the index-th event of these kinds."""

    def find(run: CaseRun, index: int) -> Moment | None:
        mark = nth_mark(run, index, *kinds)
        return None if mark is None else moment_of_mark(mark)

    return find


def before_touch(run: CaseRun, index: int = 0) -> Moment | None:
    """Return the state just before the index-th touch-down."""
    mark = nth_mark(run, index, EventKind.TOUCH_DOWN)
    return None if mark is None else moment_of_sample(run.before(mark))


def lowest_point(run: CaseRun, index: int = 0) -> Moment | None:
    """Return where the centre stops sinking for the index-th time."""
    return run.crossing(lambda rows: rows[:, columns.Y + 5], True, index)


def highest_point(run: CaseRun, index: int = 0) -> Moment | None:
    """Return where the centre stops climbing for the index-th time."""
    return run.crossing(lambda rows: rows[:, columns.Y + 5], False, index)


def _return_along(run: CaseRun, way: Array, index: int) -> Moment | None:
    """Return when the motion along a unit vector (3,) is back at its start.

    f = (x - x0) v0 + (v - v0) a0/nu^2 rises through 0. On a closed orbit this holds exactly after every period,
    whatever the scale nu; half way round f falls.
    """
    rows = run.rows.samples
    y0 = rows[0, columns.Y : columns.Y + 6]
    x0, v0 = float(way @ y0[:3]), float(way @ y0[3:6])
    later = rows[np.flatnonzero(run.t > run.t[0])[0]]
    a0 = (float(way @ later[columns.Y + 3 : columns.Y + 6]) - v0) / (later[columns.T] - run.t[0])
    nu2 = run.case.gravity / run.ball.radius

    def round_trip(samples: Array) -> Array:
        x, v = samples[:, columns.Y : columns.Y + 3] @ way, samples[:, columns.Y + 3 : columns.Y + 6] @ way
        return np.asarray((x - x0) * v0 + (v - v0) * a0 / nu2)

    return run.crossing(round_trip, True, index)


def axial_period(run: CaseRun, index: int = 0) -> Moment | None:
    """Return when the motion along the axis of the case's cylinder is back at its start."""
    axes = [surface["axis"] for surface in run.case.surfaces if surface["type"] == "cylinder"]
    return _return_along(run, axes[0], index) if axes else None


def full_return(run: CaseRun, index: int = 0) -> Moment | None:
    """Return when a swing is back at its start: from rest at every second highest point, else by its height."""
    if not run.rows.samples[0, columns.Y + 3 : columns.Y + 6].any():
        return highest_point(run, 2 * index + 1)
    return _return_along(run, np.array([0.0, 0.0, 1.0]), index)


lift_off = _mark(EventKind.LIFT_OFF)
above_edge = _mark(EventKind.PATCH, EventKind.LIFT_OFF)
after_touch = _mark(EventKind.TOUCH_DOWN)
grip = _mark(EventKind.GRIP)
slip_onset = _mark(EventKind.SLIP_ONSET)
rest = _mark(EventKind.REST)

RULES = (
    Rule(("before impact", "landing", "lands", "strikes", "first contact"), before_touch, "before touch"),
    Rule(("after the impact", "after that impact", "after impact"), after_touch, "after touch"),
    Rule(("centre above",), above_edge, "edge"),
    Rule(("lift-off", "lift off", "contact lost", "flight starts", "leaves the wall"), lift_off, "lift-off"),
    Rule(("slip speed passes through zero", "slip reverses"), _mark(EventKind.SLIP_REVERSAL), "reversal"),
    Rule(("rolling starts", "grips"), grip, "grip"),
    Rule(("slip starts", "slipping starts"), slip_onset, "onset"),
    Rule(("stops for good", "comes to rest"), rest, "rest"),
    Rule(("lowest point",), lowest_point, "lowest"),
    Rule(("axial period",), axial_period, "period"),
    Rule(("return",), full_return, "return"),
    Rule(("top", "highest point"), highest_point, "highest"),
)


def own_moments(run: CaseRun) -> list[Moment | None]:
    """Return the run's own moment of every event of its case, in their order.

    None: the run has no such event. An event whose name is of no known kind is taken at its own time.
    """
    counts: dict[str, int] = {}
    return [_own_moment(run, event.name.lower(), event.state.t, counts) for event in run.case.events]


def rule_of(name: str) -> Rule | None:
    """Return the rule that an event's name falls under."""
    if NUMBERED.match(name):
        return RULES[1]
    return next((rule for rule in RULES if any(word in name for word in rule.words)), None)


def _own_moment(run: CaseRun, name: str, t: float, counts: dict[str, int]) -> Moment | None:
    rule = rule_of(name)
    if rule is None:
        row = run.at(t)
        return None if row is None else moment_of_sample(row)
    numbered = NUMBERED.match(name)
    order = counts.get(rule.family, 0)
    counts[rule.family] = order + 1
    if numbered:
        order = int(numbered.group(1)) - 1
    elif name.split()[0] in ORDINALS and rule.family in ("lowest", "return", "highest"):
        order = ORDINALS[name.split()[0]]
    return rule.finder(run, order)
