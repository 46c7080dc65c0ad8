"""Findings in the motion: escape, coming back, stall, orbit, slip, lift-off, impact, speed, margin."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.findings.finding import Finding, FindingKind, Severity
from engine.findings.limits import limit
from engine.integrate.result import EventKind, Regime, Status, Trajectory
from engine.model.design import Design
from engine.model.elements import SEGMENTS, VESSELS, Trough
from engine.placement import Layout, Placed
from engine.units import format_length

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Rolled:
    """What the detectors look at: the design, where its elements stand, the recorded run and the ball's mass (kg)."""

    design: Design
    layout: Layout
    track: Trajectory
    mass: float

    def placed(self, row: int) -> Placed | None:
        """Return the element of a sample, None on the floor."""
        index = int(self.track.element[row])
        return self.layout.placed[index] if index >= 0 else None

    def length(self, metres: float) -> str:
        """Return a length in the unit of the design."""
        return format_length(metres, self.design.units)


def name_of(entry: Placed | None) -> str:
    """Return the name of an element as shown."""
    if entry is None:
        return "the floor"
    return entry.element.name or entry.element.id


def at_sample(rolled: Rolled, row: int) -> dict[str, object]:
    """Return the fields of a finding that say where and when a sample is."""
    track, entry = rolled.track, rolled.placed(row)
    s = float(track.s[row]) if entry is not None and entry.curve is not None and track.patch[row] >= 0 else math.nan
    where = name_of(entry) + (f", {rolled.length(s)} along" if math.isfinite(s) else "")
    x, y, z = (float(value) for value in track.x[row])
    return {
        "where": where,
        "segment": entry.element.id if entry is not None else "",
        "s": s,
        "t": float(track.t[row]),
        "position": (x, y, z),
    }


def stretches(mask: NDArray[np.bool_]) -> list[tuple[int, int]]:
    """Return (first, last) of every run of True in `mask`."""
    edges = np.diff(np.concatenate([[0], mask.astype(np.int8), [0]]))
    return list(zip(np.flatnonzero(edges == 1).tolist(), (np.flatnonzero(edges == -1) - 1).tolist()))


def ending(rolled: Rolled) -> list[Finding]:
    """Find how a run that does not arrive ends: escape, stall, endless orbit, two walls at once."""
    status = rolled.track.status
    if status in (Status.ESCAPED, Status.OUT_OF_BOUNDS):
        return [_escape(rolled)]
    if status == Status.RESTED:
        return [_stall(rolled)]
    if status in (Status.TIME_LIMIT, Status.STEP_LIMIT):
        return [_orbit(rolled)]
    if status == Status.CHATTER:
        return [_two_walls(rolled)]
    return []


def _last_contact(rolled: Rolled) -> int:
    """Return the last sample on a wall of the run."""
    on = np.flatnonzero((rolled.track.patch >= 0) & (rolled.track.element >= 0))
    return int(on[-1]) if len(on) else 0


def _escape(rolled: Rolled) -> Finding:
    track, row = rolled.track, _last_contact(rolled)
    entry = rolled.placed(row)
    v = track.v[max(0, len(track.t) - 2)]
    energy = 0.5 * rolled.mass * float(v @ v)
    x, y, _ = track.x[-1]
    over = "over the lip" if isinstance(getattr(entry and entry.element, "section", None), Trough) else "out of the end"
    if entry is not None and isinstance(entry.element, VESSELS):
        over = "over the rim"
    spot = f"{rolled.length(float(x))}, {rolled.length(float(y))}"
    return Finding(
        kind=FindingKind.ESCAPE,
        severity=Severity.FAILS,
        value=energy,
        limit=0.0,
        unit="J",
        sentence=f"The ball leaves {name_of(entry)} {over} and meets the floor at {spot} with {energy:.3f} J.",
        cure=f"Slow the ball before {name_of(entry)}, bank it for the arriving speed, or close the section.",
        **at_sample(rolled, row),  # type: ignore[arg-type]
    )


def _stall(rolled: Rolled) -> Finding:
    track = rolled.track
    row = len(track.t) - 1
    entry = rolled.placed(row)
    need = _least_grade(rolled, entry)
    return Finding(
        kind=FindingKind.STALL,
        severity=Severity.FAILS,
        value=0.0,
        limit=need,
        unit="ratio",
        sentence=f"The ball stops in {name_of(entry)} after {track.t[-1]:.2f} s and stays.",
        cure=f"Give {name_of(entry)} a grade above {100.0 * need:.2f} %, or more speed where it enters.",
        **at_sample(rolled, row),  # type: ignore[arg-type]
    )


def _least_grade(rolled: Rolled, entry: Placed | None) -> float:
    """Return the grade below which the ball does not start again: its rolling loss."""
    if entry is None:
        return 0.0
    pair = rolled.design.pair_of(rolled.design.run_of(entry.element.id), entry.element)
    return float(pair.rolling_loss)


def _orbit(rolled: Rolled) -> Finding:
    track = rolled.track
    row = len(track.t) - 1
    entry = rolled.placed(row)
    return Finding(
        kind=FindingKind.ORBIT,
        severity=Severity.FAILS,
        value=float(track.t[-1]),
        limit=float(track.t[-1]),
        unit="s",
        sentence=f"The ball is still moving in {name_of(entry)} after {track.t[-1]:.0f} s.",
        cure=f"Give {name_of(entry)} an outlet or a grade that leads out of it.",
        **at_sample(rolled, row),  # type: ignore[arg-type]
    )


def _two_walls(rolled: Rolled) -> Finding:
    row = len(rolled.track.t) - 1
    entry = rolled.placed(row)
    return Finding(
        kind=FindingKind.TWO_WALLS,
        severity=Severity.FAILS,
        value=2.0,
        limit=1.0,
        unit="ratio",
        sentence=f"The ball is held between two walls at {name_of(entry)}; its way from there is not computed.",
        cure="Widen the corner there, or round it with a fillet larger than the ball.",
        **at_sample(rolled, row),  # type: ignore[arg-type]
    )


def slipping(rolled: Rolled) -> list[Finding]:
    """Find, once for each element, where the ball slips for longer and faster than can be seen."""
    track = rolled.track
    spans: dict[int, list[tuple[int, int]]] = {}
    for first, last in stretches(track.regime == Regime.SLIPPING):
        lasts = track.t[last] - track.t[first] >= limit("slip_time")
        if lasts and track.slip_speed[first : last + 1].max() >= limit("slip_speed"):
            spans.setdefault(int(track.element[first]), []).append((first, last))
    return [_slip(rolled, found) for found in spans.values()]


def _slip(rolled: Rolled, spans: list[tuple[int, int]]) -> Finding:
    track, first = rolled.track, spans[0][0]
    entry = rolled.placed(first)
    total = sum(float(track.t[last] - track.t[start]) for start, last in spans)
    speed = max(float(track.slip_speed[start : last + 1].max()) for start, last in spans)
    times = "" if len(spans) == 1 else f" in {len(spans)} places"
    return Finding(
        kind=FindingKind.SLIP,
        severity=Severity.NOTE,
        value=speed,
        limit=limit("slip_speed"),
        unit="m/s",
        sentence=f"The ball slips in {name_of(entry)} for {total:.2f} s{times}, at up to {speed:.2f} m/s.",
        cure="Ease the joint before it, bank it for the arriving speed, or lower the speed.",
        **at_sample(rolled, first),  # type: ignore[arg-type]
    )


def flights(rolled: Rolled) -> list[Finding]:
    """Find flights that nobody planned: inside a tube, a trough or a vessel that the ball was already on."""
    found = []
    track = rolled.track
    for first, last in stretches(track.regime == Regime.FLIGHT):
        start = rolled.placed(first)
        end = rolled.placed(min(last + 1, len(track.t) - 1))
        span = float(track.t[last] - track.t[first])
        last_flight = last >= len(track.t) - 2
        if span < limit("flight_time") or start is None or end is not start or start.curve is None or last_flight:
            continue
        if -start.curve[:, 6].min() > limit("drop"):
            continue
        found.append(
            Finding(
                kind=FindingKind.LIFT_OFF,
                severity=Severity.THIN,
                value=span,
                limit=limit("flight_time"),
                unit="s",
                sentence=f"The ball lifts off in {name_of(start)} and flies for {span:.3f} s.",
                cure="Ease the change of grade there, or lower the speed.",
                **at_sample(rolled, first),  # type: ignore[arg-type]
            )
        )
    return found


def impacts(rolled: Rolled) -> list[Finding]:
    """Find touch-downs harder than walls like."""
    found = []
    for event in rolled.track.events:
        if event.kind not in (EventKind.TOUCH_DOWN, EventKind.PATCH) or event.value <= limit("impact_speed"):
            continue
        row = min(int(np.searchsorted(rolled.track.t, event.t, side="right")), len(rolled.track.t) - 1)
        entry = rolled.placed(row)
        if entry is None:
            continue
        energy = 0.5 * rolled.mass * event.value**2
        found.append(
            Finding(
                kind=FindingKind.IMPACT,
                severity=Severity.THIN,
                value=event.value,
                limit=limit("impact_speed"),
                unit="m/s",
                sentence=f"The ball strikes {name_of(entry)} at {event.value:.2f} m/s ({energy:.3f} J).",
                cure="Lower the drop before it, or line the place with rubber or felt.",
                **at_sample(rolled, row),  # type: ignore[arg-type]
            )
        )
    return found


def speeds(rolled: Rolled) -> list[Finding]:
    """Find, once for each element, where the ball is faster than a run without a cover should be."""
    track = rolled.track
    speed = np.linalg.norm(track.v, axis=1)
    fast = (speed > limit("speed")) & (track.element >= 0)
    if not fast.any():
        return []
    row = int(np.argmax(np.where(fast, speed, 0.0)))
    return [
        Finding(
            kind=FindingKind.OVER_SPEED,
            severity=Severity.NOTE,
            value=float(speed[row]),
            limit=limit("speed"),
            unit="m/s",
            sentence=f"The ball reaches {speed[row]:.2f} m/s in {name_of(rolled.placed(row))}; above "
            f"{limit('speed'):.1f} m/s a run needs a cover.",
            cure="Lower the grade before it, or cover the run there.",
            **at_sample(rolled, row),  # type: ignore[arg-type]
        )
    ]


def margins(rolled: Rolled) -> list[Finding]:
    """Find, for each open element, how near the ball comes to the lip."""
    track = rolled.track
    margin = np.where(np.isnan(track.margin), np.inf, track.margin)
    found = []
    for index in np.unique(track.element[np.isfinite(margin)]):
        rows = np.flatnonzero((track.element == index) & np.isfinite(margin))
        row = int(rows[np.argmin(margin[rows])])
        if margin[row] >= limit("margin"):
            continue
        entry = rolled.placed(row)
        share = float(margin[row])
        found.append(
            Finding(
                kind=FindingKind.THIN_MARGIN,
                severity=Severity.THIN,
                value=share,
                limit=limit("margin"),
                unit="ratio",
                sentence=f"The ball climbs to within {100.0 * share:.0f} % of the lip of {name_of(entry)}; "
                f"{100.0 * limit('margin'):.0f} % should be left.",
                cure=f"Bank {name_of(entry)} for the arriving speed, or close its section further.",
                **at_sample(rolled, row),  # type: ignore[arg-type]
            )
        )
    return found


def comes_back(rolled: Rolled) -> list[Finding]:
    """Find vessels that the ball climbs back out of: above the rim plane after having been a ball below it."""
    found = []
    track = rolled.track
    for entry in rolled.layout.placed:
        if not isinstance(entry.element, VESSELS) or entry.origin is None or entry.axis is None or entry.side < 0:
            continue
        rows = np.flatnonzero(track.element == entry.index)
        if len(rows) == 0:
            continue
        height = (track.x[rows] - entry.origin) @ entry.axis
        above = height > 0.0
        was_in = np.maximum.accumulate(~above)
        back = np.flatnonzero(above & was_in)
        if len(back) == 0:
            continue
        row = int(rows[back[0]])
        deepest = float(-height.min())
        found.append(
            Finding(
                kind=FindingKind.COMES_BACK,
                severity=Severity.FAILS,
                value=float(height.max()),
                limit=0.0,
                unit="m",
                sentence=f"The ball goes {rolled.length(deepest)} down into {name_of(entry)} "
                "and climbs back over its rim.",
                cure=f"Let the ball enter {name_of(entry)} slower or steeper, or make it deeper.",
                **at_sample(rolled, row),  # type: ignore[arg-type]
            )
        )
    return found


def of_motion(rolled: Rolled) -> list[Finding]:
    """Return every finding that needs a run."""
    detectors = (ending, comes_back, slipping, flights, impacts, speeds, margins)
    return [finding for detector in detectors for finding in detector(rolled)]


__all__ = ["Rolled", "SEGMENTS", "name_of", "of_motion"]
