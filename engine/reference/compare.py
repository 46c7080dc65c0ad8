"""A case held against its own run: errors over limits, modes, numbers, maps.

Limits: position 1e-6 m, velocity 1e-5 V, angular velocity 1e-5 V/r, time of events 1e-6 s, V = max(speed at start,
sqrt(g r)); each times max(1, gain) where the case gives one. Numbers 1e-5 relative. Rows of a map 1e-5 s.
"""

import math
from dataclasses import dataclass, field

import numpy as np

from engine.errors import TrundleError
from engine.integrate import log as columns
from engine.integrate.result import STATUS_SENTENCES, Status
from engine.reference.cases import Case, Named, State
from engine.reference.events import own_moments, rule_of
from engine.reference.numbers import EXTREMES, extreme_off, own_number
from engine.reference.reader import Record
from engine.reference.run import MODES, CaseRun, Moment, moment_of_sample, run_case, run_row

POSITION, VELOCITY, EVENT_TIME, ROW_TIME, NUMBER = 1e-6, 1e-5, 1e-6, 1e-5, 1e-5
"""Limits: m, share of V, s, s, relative."""
NUMBER_FLOOR = 1e-9
"""A number that should be zero may differ by this much (SI)."""
BEYOND = 1e9
"""Ratio reported where there is nothing to compare with: an event that did not happen, a run that ended before."""
KINDS = ("x", "v", "w", "t", "numbers")


@dataclass
class CaseResult:
    """What the comparison of one case found; `ok` None when the case has no run of its own."""

    name: str
    kind: str
    ok: bool | None = None
    worst: dict[str, float] = field(default_factory=lambda: dict.fromkeys(KINDS, 0.0))
    notes: list[str] = field(default_factory=list)
    faults: list[str] = field(default_factory=list)

    @property
    def note(self) -> str:
        """Faults and remarks in one line."""
        return " ".join([*self.faults, *self.notes])

    def take(self, kind: str, ratio: float, what: str) -> None:
        """Keep the largest ratio of a kind; say where it is above 1."""
        ratio = ratio if math.isfinite(ratio) else BEYOND
        self.worst[kind] = max(self.worst[kind], ratio)
        if ratio > 1.0:
            amount = "is missing from the run" if ratio >= BEYOND else f"{ratio:.3g} times the limit"
            self.faults.append(f"{what}: {amount}.")


@dataclass(frozen=True)
class Limits:
    """Limits of one case before the gain: x m, v m/s, w rad/s, t s."""

    case: Case
    speed: float
    radius: float

    def gain(self, t: float) -> float:
        """Factor on every limit at a time."""
        if self.case.gain is None:
            return 1.0
        return max(1.0, float(np.interp(t, *self.case.gain)))

    def of(self, kind: str) -> float:
        """Limit of a kind of error."""
        by_kind = {"x": POSITION, "v": VELOCITY * self.speed, "w": VELOCITY * self.speed / self.radius, "t": EVENT_TIME}
        return by_kind[kind]


def compare(case: Case) -> CaseResult:
    """Roll a case and compare; a case that cannot be set up or rolled has failed, with a note."""
    result = CaseResult(case.name, case.kind)
    try:
        if case.rows:
            _compare_rows(case, result)
        elif case.start is not None:
            _compare_run(run_case(case), result)
        else:
            result.notes.append("Not run: closed forms or library values without a run of their own.")
            return result
    except (TrundleError, ValueError, ArithmeticError, LookupError) as error:
        result.faults.append(f"The case cannot be rolled: {str(error) or type(error).__name__}.")
    result.ok = not result.faults
    return result


def _compare_run(run: CaseRun, result: CaseResult) -> None:
    case = run.case
    start = case.start.v if case.start is not None and case.start.v is not None else np.zeros(3)
    speed = max(float(np.linalg.norm(start)), math.sqrt(case.gravity * run.ball.radius))
    limits = Limits(case, speed, run.ball.radius)
    for sample in case.samples:
        _compare_sample(run, sample, limits, result)
    for event, moment in zip(case.events, own_moments(run), strict=True):
        _compare_event(event, moment, limits, result)
    _compare_numbers(run, result)
    if result.faults and run.rows.status not in (Status.TIME_LIMIT, Status.RESTED):
        result.notes.append(STATUS_SENTENCES[Status(run.rows.status)])


def _errors(own: Moment, given: State, limits: Limits) -> dict[str, float]:
    """Return every error over its limit."""
    gain = limits.gain(given.t)
    pairs = {"x": (own.x, given.x), "v": (own.v, given.v), "w": (own.w, given.w)}
    return {
        kind: float(np.linalg.norm(mine - other)) / (gain * limits.of(kind))
        for kind, (mine, other) in pairs.items()
        if other is not None
    }


def _compare_sample(run: CaseRun, sample: State, limits: Limits, result: CaseResult) -> None:
    row, what = run.at(sample.t), f"sample at {sample.t:g} s"
    if row is None:
        result.take("x", math.nan, what)
        return
    for kind, ratio in _errors(moment_of_sample(row), sample, limits).items():
        result.take(kind, ratio, f"{kind} of {what}")
    mode = MODES.get(int(row[columns.REGIME]), "")
    near = np.abs(run.rows.marks[1:, columns.MARK_T] - sample.t) <= EVENT_TIME
    if mode != sample.mode and not near.any():
        result.faults.append(f'{what}: the mode is "{mode}", not "{sample.mode}".')


def _compare_event(event: Named, moment: Moment | None, limits: Limits, result: CaseResult) -> None:
    given, what = event.state, f'event "{event.name}"'
    if moment is None:
        result.take("t", math.nan, what)
        return
    result.take("t", abs(moment.t - given.t) / (EVENT_TIME * limits.gain(given.t)), f"time of {what}")
    if rule_of(event.name.lower()) is None:
        result.notes.append(f"{what} is of no known kind and was compared at its own time.")
    if limits.case.is_knife_edge and "after" in event.name.lower():
        return
    for kind, ratio in _errors(moment, given, limits).items():
        result.take(kind, ratio, f"{kind} of {what}")


def _compare_numbers(run: CaseRun, result: CaseResult) -> None:
    left, read_apart = [], []
    for name, given in run.case.numbers.items():
        own = own_number(run, name, given)
        if own is None:
            left.append(name)
        elif isinstance(given, bool):
            result.take("numbers", 0.0 if own == given else math.nan, name)
        else:
            ratio = abs(own - given) / max(NUMBER * abs(given), NUMBER_FLOOR)
            if ratio > 1.0 and name in EXTREMES:
                ratio = min(ratio, extreme_off(run, name, given))
                read_apart.append(name)
            result.take("numbers", ratio, name)
    if read_apart:
        result.notes.append(f"Read at steps of the case's own solution: {', '.join(read_apart)}.")
    if left:
        result.notes.append("Not run: " + ", ".join(left) + ".")


def _compare_rows(case: Case, result: CaseResult) -> None:
    """Compare outcome and time of every robust row of a map."""
    robust = [row for row in case.rows if row.get("robust", True)]
    for row in robust:
        _compare_row(case, row, result)
    result.notes.append(f"{len(robust)} robust rows of {len(case.rows)}.")


def _compare_row(case: Case, row: Record, result: CaseResult) -> None:
    outcome, t = run_row(case, row)
    what = f"row mu {row['mu']:g}, {row['down_angle_deg']:g} deg, {row['speed']:g} m/s"
    if outcome != row["outcome"]:
        result.faults.append(f"{what}: {outcome}, not {row['outcome']}.")
    elif isinstance(row.get("t"), int | float):
        result.take("t", abs(t - row["t"]) / ROW_TIME, what)
