"""Reference cases as read from a file: checked, typed, every problem a sentence.

The schema stands in the file's own `about` block: ball, surfaces, contact, start, samples, events, numbers; SI units.
"""

import json
import math
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from engine.constants import STANDARD_GRAVITY
from engine.errors import CasesFileError, os_reason
from engine.reference.reader import Array, Reader, Record, is_number

SURFACES = {
    "plane": ("point", "normal"),
    "cylinder": ("point", "axis", "radius"),
    "sphere": ("centre", "radius"),
    "torus": ("centre", "axis", "bend_radius", "tube_radius"),
    "helical_tube": ("helix_radius", "pitch", "hand", "tube_radius"),
    "cone": ("half_angle",),
    "paraboloid": ("focal_length",),
    "hyperbolic_funnel": ("c",),
    "edge": ("point", "direction"),
}
"""What each type of surface must give."""
DIRECTIONS = ("normal", "axis", "direction")
POINTS = ("point", "centre")
LAWS = ("no_slip", "coulomb", "frictionless", "none")
MODES = ("roll", "slip", "flight", "rest")
ROW_KEYS = ("mu", "down_angle_deg", "speed", "outcome")
MOST_PROBLEMS = 12
"""More sentences than this about one file help nobody."""


@dataclass(frozen=True)
class State:
    """Time s, mode, x m, v m/s, w rad/s; a vector that is not given is None."""

    t: float
    mode: str
    x: Array | None
    v: Array | None
    w: Array | None


@dataclass(frozen=True)
class Named:
    """A named event: its state, the velocity just before it where given (m/s), and which wall it is on."""

    name: str
    state: State
    v_before: Array | None
    where: str


@dataclass(frozen=True)
class Contact:
    """Contact law: friction, `rolling` b m, `drilling` c m, restitution, drag coefficient, air kg/m3, drag area m2."""

    law: str = "no_slip"
    mu: float = 0.0
    rolling: float = 0.0
    drilling: float = 0.0
    restitution: float = 0.5
    drag: float = 0.0
    air: float = 0.0
    area: float = 0.0


@dataclass(frozen=True)
class Case:
    """One case; `ball` is (r m, m kg, k) or None, `start` None for a case without a run of its own."""

    name: str
    kind: str
    note: str
    ball: tuple[float, float, float] | None
    surfaces: tuple[Record, ...]
    contact: Contact
    start: State | None
    samples: tuple[State, ...]
    events: tuple[Named, ...]
    numbers: Record
    rows: tuple[Record, ...]
    gain: tuple[Array, Array] | None
    gravity: float = STANDARD_GRAVITY

    @property
    def is_knife_edge(self) -> bool:
        """Whether the case says of itself that its time counts and not its outcome."""
        return "knife edge" in self.note.lower() or any("(limit)" in event.where for event in self.events)


def read_cases(path: Path | str) -> list[Case]:
    """Read a file of reference cases.

    Raises
    ------
    CasesFileError
        With a sentence for every problem found.
    """
    content = _content(Path(path))
    reader = Reader()
    reader.problems += [f"{where} is not a finite number; give one." for where in _not_finite(content, "")]
    listed = content.get("cases")
    if not isinstance(listed, list) or not listed:
        raise CasesFileError(f'{path} cannot be used: it holds no list "cases"; give an object with at least one case.')
    gravity = reader.positive(content, "g", "the file") if "g" in content else STANDARD_GRAVITY
    cases = [_case(reader, record, index, gravity) for index, record in enumerate(listed)]
    if reader.problems:
        shown = reader.problems[:MOST_PROBLEMS]
        more = len(reader.problems) - len(shown)
        tail = f" There are {more} more problems of this kind." if more else ""
        raise CasesFileError(f"{path} cannot be used: " + " ".join(shown) + tail)
    return cases


def _content(path: Path) -> Record:
    try:
        content = json.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise CasesFileError(f"{path} cannot be read: {os_reason(error)}.") from error
    except UnicodeDecodeError as error:
        raise CasesFileError(f"{path} cannot be used: it is not text in UTF-8; give a JSON file.") from error
    except json.JSONDecodeError as error:
        place = f"line {error.lineno}, column {error.colno}"
        raise CasesFileError(f"{path} cannot be used: it is not JSON ({error.msg} at {place}).") from error
    except (RecursionError, ValueError) as error:
        raise CasesFileError(f"{path} cannot be used: its JSON is too deep or holds too long a number.") from error
    if not isinstance(content, dict):
        raise CasesFileError(f'{path} cannot be used: it must be an object with a list "cases".')
    return content


def _not_finite(value: Any, where: str) -> Iterator[str]:
    """Yield the place of every NaN or infinity."""
    if isinstance(value, float) and not math.isfinite(value):
        yield where or "The file"
    elif isinstance(value, dict):
        for key, part in value.items():
            yield from _not_finite(part, f"{where}.{key}" if where else str(key))
    elif isinstance(value, list):
        for index, part in enumerate(value):
            name = part.get("name", index) if isinstance(part, dict) else index
            yield from _not_finite(part, f"{where}[{name}]")


def _case(reader: Reader, record: Any, index: int, gravity: float) -> Case:
    if not isinstance(record, dict):
        reader.problems.append(f"Case {index + 1} must be an object.")
        record = {}
    name = str(record.get("name", f"case {index + 1}"))
    where = f'Case "{name}"'
    numbers = reader.part(record, "numbers", where)
    rows = tuple(reader.records(numbers, "rows", where))
    start = reader.part(record, "start", where)
    has_run = bool(start) and not rows
    ball = _ball(reader, record, where) if start else None
    surfaces = tuple(_surface(reader, entry, where) for entry in reader.records(record, "surfaces", where))
    samples = reader.records(record, "samples", where)
    case = Case(
        name=name,
        kind=str(record.get("kind", "")),
        note=str(record.get("note", "")),
        ball=ball,
        surfaces=surfaces,
        contact=_contact(reader, reader.part(record, "contact", where), bool(rows), where),
        start=_start(reader, start, where) if has_run else None,
        samples=tuple(_whole(reader, entry, f"{where}, sample {i + 1}") for i, entry in enumerate(samples)),
        events=tuple(_named(reader, entry, where) for entry in reader.records(record, "events", where)),
        numbers=numbers,
        rows=rows,
        gain=_gain(reader.part(record, "sensitivity", where)),
        gravity=gravity,
    )
    _check_rows(reader, case, where)
    return case


def _ball(reader: Reader, record: Record, where: str) -> tuple[float, float, float]:
    ball = reader.part(record, "ball", where)
    inertia = reader.number(ball, "k", f"{where}, ball")
    if inertia <= 0.0 or inertia > 1.0:
        reader.problems.append(f'{where}, ball: "k" must be above 0 and at most 1; {inertia:g} was given.')
    return reader.positive(ball, "r", f"{where}, ball"), reader.positive(ball, "m", f"{where}, ball"), inertia


def _surface(reader: Reader, record: Record, where: str) -> Record:
    """Return a surface whose keys are all there; directions are made unit vectors."""
    kind = reader.choice(record.get("type"), tuple(SURFACES), "type of surface", where)
    where = f'{where}, surface "{kind}"'
    surface = dict(record)
    if kind == "cone" and "half_angle" not in surface and is_number(surface.get("half_angle_deg")):
        surface["half_angle"] = math.radians(surface["half_angle_deg"])
    if "side" in surface:
        reader.choice(surface["side"], ("inside", "outside"), "side", where)
    for key in SURFACES.get(kind, ()):
        if key in DIRECTIONS or key in POINTS:
            surface[key] = _place(reader, surface, key, where)
        else:
            surface[key] = reader.number(surface, key, where) if key == "hand" else reader.positive(surface, key, where)
    return surface


def _place(reader: Reader, surface: Record, key: str, where: str) -> Array:
    """Return a point, or a direction made a unit vector."""
    vector = reader.vector(surface, key, where)
    if vector is None:
        reader.problems.append(f'{where}: "{key}" is missing; give three numbers.')
        return np.array([0.0, 0.0, 1.0])
    if key in POINTS:
        return vector
    length = float(np.linalg.norm(vector))
    if length == 0.0:
        reader.problems.append(f'{where}: "{key}" has no length; give a direction.')
        return np.array([0.0, 0.0, 1.0])
    return vector / length


def _contact(reader: Reader, record: Record, has_rows: bool, where: str) -> Contact:
    where = f"{where}, contact"
    law = reader.choice(record.get("law", "no_slip"), LAWS, "law", where)
    mu = reader.number(record, "mu", where) if law == "coulomb" and not has_rows else 0.0
    drag = reader.part(record, "drag", where)
    return Contact(
        law,
        mu,
        reader.number(record, "rolling_b", where, 0.0),
        reader.number(record, "drilling_c", where, 0.0),
        reader.number(record, "restitution", where, 0.5),
        reader.number(drag, "Cd", where, 0.0),
        reader.number(drag, "rho", where, 0.0),
        reader.number(drag, "area", where, 0.0),
    )


def _state(reader: Reader, record: Record, where: str) -> State:
    x, v, w = (reader.vector(record, key, where) for key in ("x", "v", "w"))
    mode = str(record.get("mode", ""))
    return State(reader.number(record, "t", where), reader.choice(mode, MODES, "mode", where) if mode else "", x, v, w)


def _whole(reader: Reader, record: Record, where: str) -> State:
    """Return a state that must give everything."""
    missing = [key for key in ("t", "mode", "x", "v", "w") if record.get(key) is None]
    if missing:
        reader.problems.append(f"{where}: {', '.join(missing)} missing; give t, mode, x, v and w.")
        return State(0.0, "", None, None, None)
    return _state(reader, record, where)


def _start(reader: Reader, record: Record, where: str) -> State:
    return _whole(reader, {"t": 0.0, **record}, f"{where}, start")


def _named(reader: Reader, record: Record, where: str) -> Named:
    name = record.get("name")
    if not isinstance(name, str) or not name:
        reader.problems.append(f'{where}: an event has no "name"; give one.')
    where = f'{where}, event "{name}"'
    before = reader.vector(record, "v_before", where)
    return Named(str(name), _state(reader, record, where), before, str(record.get("where", "")))


def _gain(record: Record) -> tuple[Array, Array] | None:
    """Return times and gains of a sensitivity block, None where it gives none."""
    times, gains = record.get("t"), record.get("gain")
    if not isinstance(times, list) or not isinstance(gains, list) or len(times) != len(gains) or not times:
        return None
    pairs = [(t, gain) for t, gain in zip(times, gains, strict=True) if is_number(t) and is_number(gain)]
    table = np.array(sorted(pairs), dtype=np.float64).reshape(-1, 2)
    return (table[:, 0], table[:, 1]) if len(table) else None


def _check_rows(reader: Reader, case: Case, where: str) -> None:
    """Gather what is wrong with the rows of a map."""
    if not case.rows:
        return
    if not any(surface.get("type") == "cylinder" for surface in case.surfaces):
        reader.problems.append(f"{where}: a map needs a cylinder to roll in.")
    for key in ("drop_depth", "t_max"):
        reader.positive(case.numbers, key, where)
    for index, row in enumerate(case.rows):
        for key in ROW_KEYS[:3]:
            reader.number(row, key, f"{where}, row {index + 1}")
        reader.choice(row.get("outcome"), ("exit", "drop", "stays"), "outcome", f"{where}, row {index + 1}")
