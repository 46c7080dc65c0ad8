"""A reference case held against its own run: every error over its limit."""

import math
from collections import Counter
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.integrate import log as columns
from engine.reference.events import family, happened
from engine.reference.numbers import EXTREMES, NUMBERS, extreme_off
from engine.reference.run import MODES, CaseRun, ended_at_rest, run_case, run_row, state_of

Array = NDArray[np.float64]
POSITION, VELOCITY, TIME, MAP_TIME, NUMBER = 1e-6, 1e-5, 1e-6, 1e-5, 1e-5
"""Limits: m, share of V, s, s, relative."""
NEAR_EVENT = 1e-6
"""s. A sample this near to an event may carry either mode."""
KNIFE_EDGES = ("limit",)
"""Words in an event's `where` that make it a knife edge: its time counts, not its outcome."""
GRAVITY = 9.80665


@dataclass
class CaseResult:
    """Outcome of one case: the worst error of each kind over its limit (<= 1 passes), what was not run, a note."""

    name: str
    kind: str
    ok: bool = True
    ran: bool = True
    worst: dict[str, float] = field(default_factory=lambda: dict.fromkeys(("x", "v", "w", "t", "numbers"), 0.0))
    notes: list[str] = field(default_factory=list)

    def add(self, kind: str, ratio: float, what: str) -> None:
        """Count one error; one above its limit fails the case and is noted."""
        value = ratio if math.isfinite(ratio) else 1e9
        self.worst[kind] = max(self.worst[kind], value)
        if value > 1.0:
            self.fail(f"{what} is {value:.3g} times its limit off")

    def fail(self, note: str) -> None:
        """Fail the case with a note."""
        self.ok = False
        if note not in self.notes:
            self.notes.append(note)


def scales(case: dict[str, Any]) -> tuple[float, float]:
    """Return V = max(speed at the start, sqrt(g r)) and r."""
    r = float(case["ball"]["r"])
    return max(float(np.linalg.norm(case["start"]["v"])), math.sqrt(GRAVITY * r)), r


def compare_state(result: CaseResult, case: dict[str, Any], own: tuple[Array, Array, Array], given: dict[str, Any]) -> None:
    """Compare x, v, w with a sample or event of the case, its gain counted."""
    big, r = scales(case)
    gain = max(1.0, float(given.get("gain", 1.0)))
    what = str(given.get("name") or f"sample at {given['t']} s")
    for key, value, limit in zip(("x", "v", "w"), own, (POSITION, VELOCITY * big, VELOCITY * big / r), strict=True):
        error = float(np.linalg.norm(value - np.array(given[key])))
        result.add(key, error / (limit * gain), f"{what}: {key}")


def with_gains(case: dict[str, Any]) -> list[dict[str, Any]]:
    """Return the samples of a case, each with the gain that its sensitivity gives."""
    gains = (case.get("sensitivity") or {}).get("gain") or []
    samples = case.get("samples") or []
    return [dict(entry, gain=gains[i] if i < len(gains) else 1.0) for i, entry in enumerate(samples)]


def compare_samples(result: CaseResult, case: dict[str, Any], run: CaseRun) -> None:
    """Compare every sample: state and mode."""
    marks = run.rows.marks[:, columns.MARK_T]
    for entry in with_gains(case):
        t = float(entry["t"])
        row = run.at(t)
        if row[columns.T] < t - 1e-9 and not ended_at_rest(run):
            result.fail(f"the run ended at {row[columns.T]:.6g} s, before the sample at {t} s")
            continue
        compare_state(result, case, state_of(row), entry)
        mode = MODES[int(row[columns.REGIME])]
        if mode != entry["mode"] and np.abs(marks - t).min() > NEAR_EVENT:
            result.fail(f"sample at {t} s: mode {mode}, not {entry['mode']}")


def compare_events(result: CaseResult, case: dict[str, Any], run: CaseRun) -> None:
    """Compare every named event: time and state."""
    seen: Counter[str] = Counter()
    knife = False
    for event in case.get("events") or []:
        name = str(event["name"])
        own = happened(run, event, seen[family(name)])
        seen[family(name)] += 1
        if own is None:
            result.fail(f'the run has no event "{name}"')
            continue
        result.add("t", abs(own.t - float(event["t"])) / TIME, f"{name}: t")
        knife = knife or any(word in str(event.get("where", "")) for word in KNIFE_EDGES)
        if not knife:
            compare_state(result, case, (own.x, own.v, own.w), event)


def compare_numbers(result: CaseResult, case: dict[str, Any], run: CaseRun) -> None:
    """Compare every number that is a result of the run; name the others as not run."""
    left = []
    for name, given in (case.get("numbers") or {}).items():
        if name not in {**NUMBERS, **EXTREMES} or not isinstance(given, int | float) or isinstance(given, bool):
            left.append(name)
            continue
        try:
            off = number_off(run, case, name, float(given))
        except (IndexError, ValueError, ZeroDivisionError):
            result.fail(f"number {name} cannot be read from the run")
            continue
        floor = NUMBER * abs(float(given)) if given else POSITION
        result.add("numbers", off / max(floor, 1e-12), f"number {name}")
    if left:
        result.notes.append("not run: " + ", ".join(left))


def number_off(run: CaseRun, case: dict[str, Any], name: str, given: float) -> float:
    """Return how far a given number is from the run's own."""
    if name in EXTREMES:
        return extreme_off(run, case, name, given)
    return abs(NUMBERS[name](run, case) - given)


def compare_map(result: CaseResult, case: dict[str, Any]) -> None:
    """Compare every robust row of a map: outcome and time."""
    rows = case["numbers"]["rows"]
    for i, row in enumerate(rows):
        if not row.get("robust"):
            continue
        outcome, t = run_row(case, row)
        if outcome != row["outcome"]:
            result.fail(f"row {i} (mu {row['mu']}, {row['down_angle_deg']} deg, {row['speed']} m/s): {outcome}, not "
                        f"{row['outcome']}")
        elif row.get("t") is not None:
            result.add("t", abs(t - float(row["t"])) / MAP_TIME, f"row {i}: t")
    result.notes.append(f"{sum(bool(row.get('robust')) for row in rows)} of {len(rows)} rows are robust")


def compare(case: dict[str, Any]) -> CaseResult:
    """Run a case and compare it; a case without a start is reported as not run."""
    result = CaseResult(str(case["name"]), str(case["kind"]))
    if "rows" in (case.get("numbers") or {}):
        compare_map(result, case)
        return result
    if not (case.get("start") or {}).get("x"):
        result.ran = False
        result.notes.append("closed form or library value without a run: see the tests of theory")
        return result
    run = run_case(case)
    compare_samples(result, case, run)
    compare_events(result, case, run)
    compare_numbers(result, case, run)
    return result
