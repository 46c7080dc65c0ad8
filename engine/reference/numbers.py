"""Numbers of a case that are results of its own run, worked out from the run.

What is not in `OWN` is a closed form without a run (an angle, a height, a limit of speed) and belongs in a test.
"""

import math
from collections.abc import Callable

import numpy as np

from engine.dynamics.state import ROLLING, SLIPPING
from engine.integrate import log as columns
from engine.integrate.result import EventKind
from engine.reference import events
from engine.reference.reader import Array
from engine.reference.run import CaseRun, Moment

Number = Callable[[CaseRun], float | bool | None]
"""A number of a run; nan: the run does not have it; None: it does not belong to this run."""


def _time(moment: Moment | None) -> float:
    return math.nan if moment is None else moment.t


def _between(first: Moment | None, last: Moment | None) -> float:
    """Distance between two moments, m."""
    return math.nan if first is None or last is None else float(np.linalg.norm(last.x - first.x))


def _start(run: CaseRun) -> Array:
    return np.asarray(run.rows.samples[0])


def _least(t: Array, values: Array) -> float:
    """Least of a series, by the parabola through the least sample and its neighbours where it lies between them."""
    i = int(np.argmin(values))
    if not 0 < i < len(values) - 1 or not t[i - 1] < t[i] < t[i + 1]:
        return float(values[i])
    a, b, c = np.polyfit(t[i - 1 : i + 2] - t[i], values[i - 1 : i + 2], 2)
    between = a > 0.0 and t[i - 1] - t[i] < -0.5 * b / a < t[i + 1] - t[i]
    return float(c - b * b / (4.0 * a)) if between else float(values[i])


def pressing(run: CaseRun) -> tuple[Array, Array]:
    """Times and normal force over mass, m/s2, while on a wall within the span."""
    rows = run.span[run.span[:, columns.PATCH] >= 0.0]
    return rows[:, columns.T], rows[:, columns.FORCE]


def need_unmet(run: CaseRun) -> tuple[Array, Array]:
    """Times and -|F|/N while rolling within the span: the least of it is the friction needed, with a minus."""
    rows = run.span[run.span[:, columns.REGIME] == ROLLING]
    return rows[:, columns.T], -rows[:, columns.NEED] / rows[:, columns.FORCE]


def least_force(run: CaseRun) -> float:
    """Least normal force over mass, m/s2."""
    return _least(*pressing(run))


def friction_needed(run: CaseRun) -> float:
    """Largest |F|/N while rolling."""
    return -_least(*need_unmet(run))


EXTREMES: dict[str, tuple[Callable[[CaseRun], tuple[Array, Array]], float]] = {
    "min_N_per_m": (pressing, 1.0),
    "mu_needed": (need_unmet, -1.0),
}
"""Extremes over a run: the series whose least they are, and the sign that turns the number into it."""
READ_APART = 0.02
"""s. The cases read these extremes at the steps of their own solution, not at the extreme itself: in an upright
cylinder A1-01 gives mu_needed 0.577885 where its closed form (2 + k)/(1 + k) g/(a theta'^2) and this engine give
0.577892. The given value is therefore met a little before or after the true one, up to 8.6 ms in the open cases."""


def extreme_off(run: CaseRun, name: str, given: float) -> float:
    """How far from the run's extreme the given one is met, as a share of READ_APART; inf when it lies beyond it."""
    series, sign = EXTREMES[name]
    t, values = series(run)
    order = np.argsort(t, kind="stable")
    t, values = t[order], values[order]
    best, met = int(np.argmin(values)), np.flatnonzero(values >= sign * given)
    if len(met) == 0 or values[best] > sign * given:
        return math.inf
    return float(np.abs(t[met] - t[best]).min()) / READ_APART


def friction_limit(run: CaseRun) -> float:
    """Largest friction over mass while slipping, m/s2."""
    rows = run.span[run.span[:, columns.REGIME] == SLIPPING]
    return float(rows[:, columns.FRICTION].max()) if len(rows) else math.nan


def turning_rate(run: CaseRun) -> float:
    """Mean rate of turning about the axis of the case's surface (z where it has none) over the span, rad/s."""
    rows = run.span
    surface = run.case.surfaces[0]
    axis = surface.get("axis", np.array([0.0, 0.0, 1.0]))
    off = rows[:, columns.Y : columns.Y + 3] - surface.get("point", np.zeros(3))
    start = off[0] - (off[0] @ axis) * axis
    angle = np.unwrap(np.arctan2(off @ np.cross(axis, start), off @ start))
    return float((angle[-1] - angle[0]) / (rows[-1, columns.T] - rows[0, columns.T]))


def period(run: CaseRun) -> float:
    """Time until the axial motion in a cylinder, else the whole motion, is back at its start, s."""
    is_well = any(surface["type"] == "cylinder" for surface in run.case.surfaces)
    return _time(events.axial_period(run) if is_well else events.full_return(run)) - float(_start(run)[columns.T])


def _height(run: CaseRun, find: events.Finder, better: Callable[[float, float], float]) -> float:
    """Extreme height of the centre, m: of the start and the first turning point of that sense."""
    start, moment = float(_start(run)[columns.Y + 2]), find(run, 0)
    if moment is None:
        return start
    return better(start, float(moment.x[2]))


def lowest(run: CaseRun) -> float:
    """Lowest height of the centre, m."""
    return _height(run, events.lowest_point, min)


def highest(run: CaseRun) -> float:
    """Highest height of the centre, m."""
    return _height(run, events.highest_point, max)


def _normal_height(run: CaseRun, kind: EventKind) -> float:
    """Vertical part of the wall's normal just before the first event of a kind."""
    mark = events.nth_mark(run, 0, kind)
    return math.nan if mark is None else float(run.before(mark)[columns.NORMAL + 2])


def _angle(cosine: float) -> float:
    return math.degrees(math.acos(cosine)) if abs(cosine) <= 1.0 else math.nan


def touch_value(run: CaseRun, column: int) -> float:
    """A column of the first touch-down's event row."""
    mark = events.nth_mark(run, 0, EventKind.TOUCH_DOWN)
    return math.nan if mark is None else float(mark[column])


def touch_place(run: CaseRun) -> float:
    """Coordinate x of the centre at the first touch-down, m."""
    moment = events.before_touch(run)
    return math.nan if moment is None else float(moment.x[0])


def drop_at_contact(run: CaseRun) -> float:
    """Height lost between the near rim and the first touch-down, m."""
    first, last = events.above_edge(run, 0), events.before_touch(run)
    return math.nan if first is None or last is None else float(first.x[2] - last.x[2])


def _speed(moment: Moment | None) -> float:
    return math.nan if moment is None else float(np.linalg.norm(moment.v))


def top_force(run: CaseRun) -> float:
    """Normal force over weight at the highest point."""
    moment = events.highest_point(run)
    if moment is None:
        return math.nan
    near = int(np.searchsorted(run.t, moment.t)) + np.array([-2, -1, 0, 1])
    t, force = run.t[near], run.rows.samples[near, columns.FORCE]
    return float(np.polyval(np.polyfit(t - moment.t, force, 3), 0.0)) / run.case.gravity


def _gain_of_speed(run: CaseRun) -> float:
    """Mean rate of speed between the start and the last sample that still moves, m/s2."""
    moving = [sample.t for sample in run.case.samples if sample.mode != "rest"]
    row = run.at(max(moving)) if moving else None
    if row is None:
        return math.nan
    first = _start(run)
    rise = np.linalg.norm(row[columns.Y + 3 : columns.Y + 6]) - np.linalg.norm(first[columns.Y + 3 : columns.Y + 6])
    return float(rise / (row[columns.T] - first[columns.T]))


def slowing(run: CaseRun) -> float | None:
    """Deceleration of a ball that is slowed down, m/s2."""
    rate = _gain_of_speed(run)
    return None if rate > 0.0 else -rate


def quickening(run: CaseRun) -> float | None:
    """Acceleration of a ball that gains speed, m/s2."""
    rate = _gain_of_speed(run)
    return None if rate <= 0.0 else rate


def _spin(rows: Array) -> Array:
    """Spin about the wall's normal, rad/s."""
    w, normal = rows[:, columns.Y + 6 : columns.Y + 9], rows[:, columns.NORMAL : columns.NORMAL + 3]
    return np.asarray(np.einsum("ij,ij->i", w, normal))


def _spinning(run: CaseRun) -> tuple[Array, Array]:
    """Times and sizes of the spin about the normal while it is more than 2 % of that at the start."""
    spin = np.abs(_spin(run.rows.samples))
    end = int(np.argmax(spin < 0.02 * spin[0])) if (spin < 0.02 * spin[0]).any() else len(spin)
    return run.t[:end], spin[:end]


def spin_loss(run: CaseRun) -> float:
    """Mean rate at which the spin about the normal is lost, rad/s2."""
    t, spin = _spinning(run)
    return float((spin[0] - spin[-1]) / (t[-1] - t[0]))


def spin_stop(run: CaseRun) -> float:
    """Time at which the spin about the normal ends, s: its line carried on to zero, if there is none after that."""
    t, spin = _spinning(run)
    slope, level = np.polyfit(t, spin, 1)
    stop = -level / slope
    later = np.abs(_spin(run.rows.samples[run.t > stop * (1.0 + 1e-5)]))
    return float(stop) if len(later) and later.max() < 1e-5 * spin[0] else math.nan


OWN: dict[str, Number] = {
    "min_N_per_m": least_force,
    "mu_needed": friction_needed,
    "friction_limit_per_m": friction_limit,
    "theta_rate": turning_rate,
    "angular_rate": turning_rate,
    "rho_centre": lambda run: float(np.hypot(*run.span[:, columns.Y : columns.Y + 2].T).mean()),
    "period": period,
    "omega_z": lambda run: 2.0 * math.pi / period(run),
    "turns_per_oscillation": lambda run: abs(turning_rate(run)) * period(run) / (2.0 * math.pi),
    "z_lowest": lowest,
    "z_highest": highest,
    "z_mean": lambda run: 0.5 * (highest(run) + lowest(run)),
    "z_amplitude": lambda run: 0.5 * (highest(run) - lowest(run)),
    "contact_lost_at": lambda run: _time(events.lift_off(run, 0)),
    "lift_off_time": lambda run: _time(events.lift_off(run, 0)),
    "cos_lift_off": lambda run: _normal_height(run, EventKind.LIFT_OFF),
    "lift_off_angle_deg": lambda run: _angle(_normal_height(run, EventKind.LIFT_OFF)),
    "slip_start_angle_deg": lambda run: _angle(_normal_height(run, EventKind.SLIP_ONSET)),
    "cos_psi_top": lambda run: -_normal_height(run, EventKind.LIFT_OFF),
    "landing_time": lambda run: touch_value(run, columns.MARK_T),
    "reimpact_time": lambda run: touch_value(run, columns.MARK_T),
    "reimpact_normal_speed": lambda run: touch_value(run, columns.VALUE),
    "energy_lost_per_m": lambda run: touch_value(run, columns.MARK_IMPACT),
    "landing_x": touch_place,
    "range": lambda run: touch_place(run) - float(getattr(events.lift_off(run, 0), "x", np.full(3, math.nan))[0]),
    "fall_time": lambda run: touch_value(run, columns.MARK_T) - _time(events.lift_off(run, 0)),
    "time_on_edge": lambda run: _time(events.lift_off(run, 0)) - _time(events.above_edge(run, 0)),
    "drop_at_contact": drop_at_contact,
    "captured_by_drop_criterion": lambda run: drop_at_contact(run) >= run.ball.radius,
    "time_to_top": lambda run: _time(events.highest_point(run)),
    "speed_at_top": lambda run: _speed(events.highest_point(run)),
    "N_over_mg_at_top": top_force,
    "slide_time": lambda run: _time(events.grip(run, 0)),
    "slide_distance": lambda run: _between(_first(run), events.grip(run, 0)),
    "final_speed": lambda run: _speed(events.grip(run, 0)),
    "decel": slowing,
    "accel_downhill": quickening,
    "stop_time": lambda run: _time(events.rest(run, 0)),
    "stop_distance": lambda run: _between(_first(run), events.rest(run, 0)),
    "spin_rate_loss": spin_loss,
    "spin_stop_time": spin_stop,
}
"""How each number of a run is worked out, by the name that the cases give it."""
HINGED_ON_EDGE = ("captured_by_drop_criterion", "drop_at_contact")
"""Numbers that a knife-edge case leaves open."""


def _first(run: CaseRun) -> Moment:
    y = _start(run)[columns.Y : columns.Y + 9]
    return Moment(float(_start(run)[columns.T]), y[0:3], y[3:6], y[6:9])


def own_number(run: CaseRun, name: str, given: object) -> float | bool | None:
    """Return a number of the run by its name; None where it is a closed form without a run, or no single number."""
    find = OWN.get(name)
    if find is None or not isinstance(given, bool | int | float):
        return None
    if run.case.is_knife_edge and name in HINGED_ON_EDGE:
        return None
    try:
        return find(run)
    except (LookupError, ValueError):
        # the run left no rows to read it from
        return math.nan
