"""Words and figures shown in the window: names of kinds, verdict line, what the ball does in an element."""

import math
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from engine.constants import STANDARD_GRAVITY
from engine.findings.finding import Finding, FindingKind, Severity
from engine.integrate.result import STATUS_SENTENCES, Regime
from engine.model.base import Frozen
from engine.model.elements import ElementBase, SegmentBase
from engine.units import DEGREE, display, format_quantity

if TYPE_CHECKING:
    from engine.simulate import Roll
    from studio.workspace import Workspace

KIND_WORDS = {
    "straight": "Straight",
    "bend": "Bend",
    "helix": "Helix",
    "transition": "Transition",
    "easing": "Easing",
    "free_line": "Free line",
    "loop": "Loop",
    "gap": "Gap",
    "funnel": "Funnel",
    "well": "Well",
    "bowl": "Bowl",
    "dome": "Dome",
    "deck": "Deck",
    "tray": "Tray",
    "tube": "Tube",
    "trough": "Trough",
    "cone": "Cone",
    "power": "Power",
    "hyperbolic": "Hyperbolic",
    "parabolic": "Parabolic",
    "points": "Points",
    "free": "At a place of its own",
    "outlet": "At an outlet",
}
FINDING_WORDS = {
    FindingKind.ESCAPE: "Leaves the run",
    FindingKind.COMES_BACK: "Comes back",
    FindingKind.STALL: "Stalls",
    FindingKind.ORBIT: "Endless orbit",
    FindingKind.JAM: "Jams",
    FindingKind.SLIP: "Slips",
    FindingKind.LIFT_OFF: "Lifts off",
    FindingKind.IMPACT: "Hard impact",
    FindingKind.OVER_SPEED: "Too fast",
    FindingKind.THIN_MARGIN: "Thin margin",
    FindingKind.COUNTER_GRADE: "Runs uphill",
    FindingKind.CURVATURE_JUMP: "Curvature jumps",
    FindingKind.JOINT: "Joint does not match",
    FindingKind.CLASH: "Walls clash",
    FindingKind.OUT_OF_SITE: "Outside the site",
    FindingKind.TWO_WALLS: "Touches two walls",
}
ENDING_WORDS = {"arrived": "arrives", "rested": "rests", "escaped": "is lost", "out_of_bounds": "is lost"}
"""Last part of the verdict, by how the ball ended."""
ADDING = {
    "straight": "a straight piece of even grade",
    "bend": "an arc in plan",
    "helix": "full turns that descend",
    "transition": "a piece whose curvature changes evenly",
    "easing": "a straight piece whose grade changes smoothly",
    "free_line": "a free line through points",
    "loop": "an upright loop",
    "gap": "a free jump to the next inlet",
    "funnel": "a vessel that ends in a throat",
    "well": "an upright, tilted or lying cylinder",
    "bowl": "part of a hollow sphere",
    "dome": "part of a sphere, from outside",
    "deck": "a flat plate",
    "tray": "a catch tray at the end",
}
"""What each tool of the strip adds, for its tip."""


class Verdict(NamedTuple):
    """One line about the run and its state: clears, thin, fails or none."""

    text: str
    state: str


class Figure(NamedTuple):
    """One row of what the ball does: words and value."""

    label: str
    value: str


def kind_words(kind: str) -> str:
    """Kind as shown."""
    return KIND_WORDS.get(kind, kind.replace("_", " ").capitalize())


def element_words(element: ElementBase) -> str:
    """Element as shown, in the words of the findings: its name, else its id."""
    return element.title


def section_words(element: Frozen, units: str) -> str:
    """Cross section in short: kind, outer and inner diameter in the design's unit."""
    if not isinstance(element, SegmentBase):
        return ""
    section = element.section
    outer, inner = (display(size, "m", units)[0] for size in (section.bore + 2 * section.wall, section.bore))
    return f"{section.kind} {outer:.4g}/{inner:.4g}"


def quantity_words(value: float, unit: str, units: str = "mm", digits: int = 3) -> str:
    """Figure for reading, with its unit, to a few significant digits."""
    number, word = display(value, unit, units)
    word = {"deg": "°", "%": " %"}.get(word, f" {word}" if word else "")
    return f"{number:.{digits}g}{word}"


def verdict_of(workspace: "Workspace") -> Verdict:
    """Line about the design as it is drawn."""
    roll = workspace.roll
    if workspace.problem:
        return Verdict(workspace.problem, "none")
    if roll is None or not workspace.current:
        return Verdict("Rolling …", "none")
    worst = roll.findings[0] if roll.findings else None
    if roll.verdict != "clears":
        fails = worst is not None and worst.severity is Severity.FAILS
        reason = finding_title(workspace, worst) if worst is not None and fails else _ending(roll)
        end = f"{ENDING_WORDS.get(roll.outcome, 'ends')} after {roll.duration:.1f} s"
        return Verdict(f"Fails · {reason} · {end}", "fails")
    parts = [f"Clears in {roll.duration:.1f} s", *_least_margin(workspace, roll)]
    thin = worst is not None and worst.severity is Severity.THIN
    if worst is not None and thin and len(parts) == 1:
        parts.append(finding_title(workspace, worst))
    return Verdict(" · ".join(parts), "thin" if thin else "clears")


def _ending(roll: "Roll") -> str:
    """How the run ended, in short."""
    return STATUS_SENTENCES[roll.trajectory.status].split(";")[0].rstrip(".")


def finding_title(workspace: "Workspace", finding: Finding) -> str:
    """Title of a finding: what, and where in the words of the window."""
    element = workspace.element(finding.segment)
    where = element_words(element) if element is not None else finding.where
    words = FINDING_WORDS[finding.kind]
    return f"{words}: {where}" if where else words


def _least_margin(workspace: "Workspace", roll: "Roll") -> list[str]:
    """Least margin to a lip and where, when there is a lip at all."""
    margin = roll.trajectory.margin
    if len(margin) == 0 or np.isnan(margin).all():
        return []
    place = int(np.nanargmin(margin))
    element = placed_element(roll, int(roll.trajectory.element[place]))
    where = f" at {element_words(element)}" if element is not None else ""
    return [f"least margin {100.0 * float(margin[place]):.0f} %{where}"]


def placed_element(roll: "Roll", index: int) -> ElementBase | None:
    """Element by its place in the layout, None outside."""
    placed = roll.layout.placed
    return placed[index].element if 0 <= index < len(placed) else None


def figures_of(roll: "Roll", element: ElementBase) -> list[Figure]:
    """What the ball does in an element: arrives, leaves, climbs, load, time there; empty when it never comes there."""
    track = roll.trajectory
    index = next((entry.index for entry in roll.layout.placed if entry.element.id == element.id), -1)
    rows = np.flatnonzero(track.element == index)
    if len(rows) == 0:
        return []
    speed = np.linalg.norm(track.v[rows], axis=1)
    figures = [
        Figure("Arrives", f"{speed[0]:.2f} m/s at {track.t[rows[0]]:.2f} s"),
        Figure("Leaves", f"{speed[-1]:.2f} m/s at {track.t[rows[-1]]:.2f} s"),
    ]
    touching = rows[track.regime[rows] != int(Regime.FLIGHT)]
    if isinstance(element, SegmentBase) and len(touching):
        angle = track.angle[touching]
        climb = float(angle[int(np.argmax(np.abs(angle)))])
        side = "" if abs(climb) < DEGREE else (" left" if climb > 0.0 else " right")
        figures.append(Figure("Climbs the wall to", f"{math.degrees(abs(climb)):.0f}°{side}"))
    if len(touching):
        weight = roll.ball.mass * STANDARD_GRAVITY
        figures.append(Figure("Load at most", f"{float(track.normal_force[touching].max()) / weight:.2f} g"))
    margins = track.margin[rows]
    if not np.isnan(margins).all():
        figures.append(Figure("Least margin", f"{100.0 * float(np.nanmin(margins)):.0f} %"))
    if (track.regime[rows] == int(Regime.SLIPPING)).any():
        figures.append(Figure("Slips at most", f"{float(track.slip_speed[rows].max()):.2f} m/s"))
    return figures


def allowed_words(low: float | None, high: float | None, unit: str, units: str) -> str:
    """Allowed range in words, in the units of the design."""
    if low is None or high is None:
        return "any number"
    return f"{format_quantity(low, unit, units)} to {format_quantity(high, unit, units)}"
