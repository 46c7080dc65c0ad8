"""Scalar results of a reference case, recomputed from its own run.

A number that is a closed form without a run (an angle of repose, a limit speed) has no entry here and is reported as
not run; such values belong to the tests of theory.
"""

import math
from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.integrate import log as columns
from engine.integrate.result import EventKind
from engine.reference.events import axial_period, turning_times
from engine.reference.run import CaseRun

Array = NDArray[np.float64]
Number = Callable[[CaseRun, dict[str, Any]], float]
STEP_READ = 0.02
"""s. Longest step at which a reference read its extremes."""
SPIN_LEFT = 0.01
"""Share of the first spin above which its decay is read."""


def in_span(run: CaseRun, case: dict[str, Any]) -> Array:
    """Return the rows up to the last sample of the case."""
    last = float(case["samples"][-1]["t"]) if case.get("samples") else math.inf
    return np.asarray(run.rows.samples[run.t <= last + 1e-12])


def extreme(t: Array, value: Array, highest: bool) -> float:
    """Return the largest (or smallest) value, a parabola put through the best sample and its neighbours."""
    i = int(np.argmax(value) if highest else np.argmin(value))
    if i == 0 or i == len(t) - 1 or t[i - 1] >= t[i] or t[i] >= t[i + 1]:
        return float(value[i])
    a, b, c = np.polyfit(t[i - 1 : i + 2] - t[i], value[i - 1 : i + 2], 2)
    if a == 0.0:
        return float(value[i])
    place = -b / (2.0 * a)
    if not t[i - 1] - t[i] < place < t[i + 1] - t[i]:
        return float(value[i])
    return float(c - b * b / (4.0 * a))


def pressed(run: CaseRun, case: dict[str, Any]) -> Array:
    """Return the rows up to the last sample in which the ball presses a wall."""
    rows = in_span(run, case)
    return np.asarray(rows[(rows[:, columns.PATCH] >= 0) & (rows[:, columns.FORCE] > 0.0)])


def normal_forces(run: CaseRun, case: dict[str, Any]) -> tuple[Array, Array]:
    """Return times and N/m while on a wall."""
    rows = pressed(run, case)
    return rows[:, columns.T], rows[:, columns.FORCE]


def friction_needs(run: CaseRun, case: dict[str, Any]) -> tuple[Array, Array]:
    """Return times and the |F|/N that rolling needs."""
    rows = pressed(run, case)
    return rows[:, columns.T], rows[:, columns.NEED] / rows[:, columns.FORCE]


def extreme_off(run: CaseRun, case: dict[str, Any], name: str, given: float) -> float:
    """Return how far a given extreme is from what the run met, in the unit of the number.

    The reference read its extremes at the steps of its own solution, up to STEP_READ apart: its value lies between the true
    extreme and what is met STEP_READ beside it. (In an upright cylinder the closed form (2+k)/(1+k) g/(rho Omega^2) shows it:
    case A1-01 gives 0.577885 where the closed form and this engine give 0.577892.)
    """
    reader, highest = EXTREMES[name]
    t, value = reader(run, case)
    sign = 1.0 if highest else -1.0
    best = extreme(t, value, highest)
    at = t[int(np.argmax(sign * value))]
    least = min(float((sign * value)[(t >= at - STEP_READ) & (t <= at + STEP_READ)].min()), sign * best)
    return max(0.0, sign * given - sign * best, least - sign * given)


EXTREMES = {"min_N_per_m": (normal_forces, False), "mu_needed": (friction_needs, True)}
"""Extremes over a run: how to read them, and whether the largest counts."""


def azimuth_rate(run: CaseRun, case: dict[str, Any]) -> float:
    """Mean rate round the z axis, rad/s."""
    rows = in_span(run, case)
    angle = np.unwrap(np.arctan2(rows[:, columns.Y + 1], rows[:, columns.Y]))
    return float((angle[-1] - angle[0]) / (rows[-1, columns.T] - rows[0, columns.T]))


def level(run: CaseRun, upward: bool) -> float:
    """Height of the lowest (upward) or highest turning point, m."""
    z = run.rows.samples[:, columns.Y + 2]
    times = turning_times(run, upward)
    if not times:
        return float(z.min() if upward else z.max())
    samples = run.rows.samples
    i = int(np.searchsorted(run.t, times[0])) - 1
    h, vz = times[0] - run.t[i], samples[i, columns.Y + 5]
    turned = float(z[i] + 0.5 * h * vz)
    if abs(vz) > 0.0:
        az = -vz / h if h > 0.0 else 0.0
        turned = float(z[i] + vz * h + 0.5 * az * h * h)
    return min(turned, float(z.min())) if upward else max(turned, float(z.max()))


def mark_time(run: CaseRun, kind: EventKind, order: int = 0) -> float:
    """Time of an event, s; nan when there is none."""
    marks = run.marks(kind)
    return float(marks[order, columns.MARK_T]) if len(marks) > order else math.nan


def distance_to(run: CaseRun, t: float) -> float:
    """Straight distance from the start to where the ball is at the event at t, m."""
    x = run.before(t)[columns.Y : columns.Y + 3]
    return float(np.linalg.norm(x - run.rows.samples[0, columns.Y : columns.Y + 3]))


def normal_z(run: CaseRun, kind: EventKind) -> float:
    """Vertical component of the normal where an event happens."""
    t = mark_time(run, kind)
    return float(run.before(t)[columns.NORMAL + 2]) if math.isfinite(t) else math.nan


def touch(run: CaseRun) -> Array:
    """Row before the first touch-down after the start."""
    return run.before(mark_time(run, EventKind.TOUCH_DOWN))


def top_row(run: CaseRun) -> Array:
    """Sample nearest to the first highest point."""
    times = turning_times(run, False)
    return np.asarray(run.rows.samples[int(np.argmin(np.abs(run.t - times[0])))])


def speed(row: Array) -> float:
    """|v| of a sample row, m/s."""
    return float(np.linalg.norm(row[columns.Y + 3 : columns.Y + 6]))


def spins(run: CaseRun) -> Array:
    """Spin about the normal at every sample, rad/s."""
    rows = run.rows.samples
    w, n = rows[:, columns.Y + 6 : columns.Y + 9], rows[:, columns.NORMAL : columns.NORMAL + 3]
    return np.asarray(np.einsum("ij,ij->i", w, n))


def spin_decay(run: CaseRun) -> tuple[float, float]:
    """Return (first spin, rate at which it is lost) from a straight line through the early decay."""
    spin = np.abs(spins(run))
    rows = spin > SPIN_LEFT * spin[0]
    rate, first = np.polyfit(run.t[rows], spin[rows], 1)
    return float(first), float(-rate)


def degrees(cosine: float) -> float:
    """Angle of a cosine, degrees."""
    return math.degrees(math.acos(cosine))


NUMBERS: dict[str, Number] = {
    "theta_rate": azimuth_rate,
    "angular_rate": azimuth_rate,
    "period": lambda run, case: _period(run, case),
    "omega_z": lambda run, case: 2.0 * math.pi / axial_period(run),
    "turns_per_oscillation": lambda run, case: azimuth_rate(run, case) * axial_period(run) / (2.0 * math.pi),
    "z_lowest": lambda run, case: level(run, True),
    "z_highest": lambda run, case: level(run, False),
    "z_mean": lambda run, case: 0.5 * (level(run, True) + level(run, False)),
    "z_amplitude": lambda run, case: 0.5 * (level(run, False) - level(run, True)),
    "rho_centre": lambda run, case: float(np.hypot(*in_span(run, case)[:, columns.Y : columns.Y + 2].T).mean()),
    "contact_lost_at": lambda run, case: mark_time(run, EventKind.LIFT_OFF),
    "lift_off_time": lambda run, case: mark_time(run, EventKind.LIFT_OFF),
    "slide_time": lambda run, case: mark_time(run, EventKind.GRIP),
    "slide_distance": lambda run, case: distance_to(run, mark_time(run, EventKind.GRIP)),
    "final_speed": lambda run, case: speed(in_span(run, case)[-1]),
    "cos_lift_off": lambda run, case: normal_z(run, EventKind.LIFT_OFF),
    "lift_off_angle_deg": lambda run, case: degrees(normal_z(run, EventKind.LIFT_OFF)),
    "slip_start_angle_deg": lambda run, case: degrees(normal_z(run, EventKind.SLIP_ONSET)),
    "cos_psi_top": lambda run, case: -normal_z(run, EventKind.LIFT_OFF),
    "landing_time": lambda run, case: mark_time(run, EventKind.TOUCH_DOWN),
    "landing_x": lambda run, case: float(touch(run)[columns.Y]),
    "range": lambda run, case: float(touch(run)[columns.Y]),
    "reimpact_time": lambda run, case: mark_time(run, EventKind.TOUCH_DOWN),
    "reimpact_normal_speed": lambda run, case: float(run.marks(EventKind.TOUCH_DOWN)[0, columns.VALUE]),
    "fall_time": lambda run, case: mark_time(run, EventKind.TOUCH_DOWN) - mark_time(run, EventKind.LIFT_OFF),
    "time_on_edge": lambda run, case: mark_time(run, EventKind.LIFT_OFF) - mark_time(run, EventKind.PATCH),
    "drop_at_contact": lambda run, case: float(case["start"]["x"][2]) - float(touch(run)[columns.Y + 2]),
    "N_over_mg_at_top": lambda run, case: float(top_row(run)[columns.FORCE]) / 9.80665,
    "speed_at_top": lambda run, case: speed(top_row(run)),
    "time_to_top": lambda run, case: turning_times(run, False)[0],
    "energy_lost_per_m": lambda run, case: float(run.marks(EventKind.TOUCH_DOWN)[0, columns.MARK_IMPACT]),
    "stop_time": lambda run, case: mark_time(run, EventKind.REST),
    "stop_distance": lambda run, case: distance_to(run, mark_time(run, EventKind.REST)),
    "friction_limit_per_m": lambda run, case: float(case["contact"]["mu"]) * float(run.rows.samples[0, columns.FORCE]),
    "spin_rate_loss": lambda run, case: spin_decay(run)[1],
    "spin_stop_time": lambda run, case: spin_decay(run)[0] / spin_decay(run)[1],
}
"""Name of a number to its value in a run."""


def _period(run: CaseRun, case: dict[str, Any]) -> float:
    """Period of a swing in a bowl (two returns) or of the bobbing in a cylinder, s."""
    if str(case["kind"]).startswith("A5"):
        times = turning_times(run, False)
        return times[1] if len(times) > 1 else 2.0 * times[0]
    return axial_period(run)
