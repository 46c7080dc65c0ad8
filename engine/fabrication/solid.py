"""From a placed element to its solid: which builder, which sizes, and what must hold before it may leave as a file."""

from engine.errors import PartRefusedError
from engine.fabrication.inspection import Expected, bend_problems, inspect, meeting_problems
from engine.fabrication.mesh import Array, Mesh
from engine.fabrication.revolve import ON_AXIS, Face, Stand, plate, tray, wall_of_revolution
from engine.fabrication.sweep import WALL_SHARE, Profile, finest, mouth_width, sweep, trough_profile, tube_profile
from engine.model.design import Process
from engine.model.elements import SEGMENTS, Deck, Dome, Gap, Segment, Tray, Trough, Tube, Vessel
from engine.placement import Placed

COARSE_TOLERANCE = 1e-3
"""m. Tolerance for a quick look on the screen."""


def is_part(placed: Placed) -> bool:
    """Whether an element is made of anything: a free jump is not."""
    return not isinstance(placed.element, Gap)


def build_solid(placed: Placed, process: Process, *, coarse: bool = False) -> Mesh:
    """Wall of one placed element as a closed mesh, where it stands, m. It is not inspected: see `refusals`.

    Parameters
    ----------
    placed : Placed
    process : Process
        Tolerance of a chord, and the wall of trays.
    coarse : bool
        For a quick look: a tolerance of 1 mm, whatever the process asks for.

    Raises
    ------
    PartRefusedError
        When no such solid exists; one sentence that names the element, the place and what to change.
    """
    try:
        return _solid(placed, process, COARSE_TOLERANCE if coarse else process.chord_tolerance)
    except PartRefusedError as error:
        raise PartRefusedError(f"{_named(placed)} cannot be made: {error}") from error


def _named(placed: Placed) -> str:
    return f'Element {placed.index + 1}, "{placed.element.title}" of run "{placed.run}",'


def _solid(placed: Placed, process: Process, tolerance: float) -> Mesh:
    element = placed.element
    if isinstance(element, SEGMENTS):
        profile, fine = profile_of(element, tolerance)
        return sweep(_known(placed.curve), profile, fine)
    if isinstance(element, Gap):
        raise PartRefusedError("it is a free jump and has no wall; ask only for elements that are made of something.")
    if placed.plate is not None:
        face = Face(*placed.plate)
        if isinstance(element, Deck):
            return plate(face, element.thickness)
        if isinstance(element, Tray):
            return tray(face, element.depth, element.drop, process.default_wall)
    return _vessel(placed, element, tolerance)


def _vessel(placed: Placed, element: Vessel | Deck | Tray, tolerance: float) -> Mesh:
    if isinstance(element, Deck | Tray):
        raise PartRefusedError("it was placed without its plate; lay the design out again.")
    stand = Stand(_known(placed.origin), _known(placed.axis))
    return wall_of_revolution(_known(placed.meridian), stand, placed.side, element.wall, tolerance)


def _known(numbers: Array | None) -> Array:
    if numbers is None:
        raise PartRefusedError("it was placed without its line; lay the design out again.")
    return numbers


def profile_of(element: Segment, tolerance: float) -> tuple[Profile, float]:
    """Cross section of a segment and the tolerance (m) that its wall leaves."""
    section, bore = element.section, 0.5 * element.section.bore
    fine = finest(tolerance, section.wall)
    if isinstance(section, Trough):
        lip = (section.lip_angle, section.lip_radius)
        profile = trough_profile(bore, section.wall, lip, fine)
        return profile, min(fine, WALL_SHARE * mouth_width(bore, lip))
    return tube_profile(bore, section.wall, fine), fine


def refusals(placed: Placed, mesh: Mesh, process: Process) -> list[str]:
    """Why a part may not be exported: a sentence each with element, place and what to change; empty when it may.

    The first reason found of each kind is given; where the centreline already tells why, the crossing of triangles
    that follows from it is left out.
    """
    problems = _curve_problems(placed, process) or list(inspect(mesh, _expected(placed)).problems)
    return [f"{_named(placed)} cannot be made: {problem}" for problem in problems]


def _curve_problems(placed: Placed, process: Process) -> list[str]:
    element, curve = placed.element, placed.curve
    if curve is None or not isinstance(element, SEGMENTS):
        return []
    profile, _ = profile_of(element, process.chord_tolerance)
    found = bend_problems(curve, profile)
    if not found and isinstance(element.section, Tube):
        found = meeting_problems(curve, profile.reach)
    return found


def _expected(placed: Placed) -> Expected:
    """Euler characteristic of a good part: 0 with a way through (tube, open vessel), 2 without."""
    element = placed.element
    if isinstance(element, SEGMENTS):
        return Expected(0 if isinstance(element.section, Tube) else 2)
    if isinstance(element, Deck | Tray | Dome) or placed.meridian is None:
        return Expected(2)
    return Expected(2 if placed.meridian[-1, 1] < ON_AXIS else 0)
