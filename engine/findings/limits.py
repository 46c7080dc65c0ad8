"""Thresholds of the findings: one table, each with its unit, reason and source.

"Common practice" is trade knowledge from memory; replace it by what your own bench shows.
"""

from typing import NamedTuple


class Limit(NamedTuple):
    """A threshold: value, SI unit, why, and where the figure comes from."""

    value: float
    unit: str
    reason: str
    source: str


LIMITS: dict[str, Limit] = {
    "margin": Limit(0.15, "ratio", "a worn ball or a level off by a little climbs higher", "common practice"),
    "slip_time": Limit(0.02, "s", "shorter slips leave no mark and cost no head", "common practice"),
    "slip_speed": Limit(0.01, "m/s", "slower slip cannot be seen", "common practice"),
    "flight_time": Limit(0.01, "s", "a shorter hop is a joint, not a lift-off", "common practice"),
    "drop": Limit(
        0.7, "ratio", "a tube that falls steeper than 45 degrees is a drop: the ball falls in it", "geometry"
    ),
    "impact_speed": Limit(1.0, "m/s", "a steel ball chips acrylic and printed lips above this", "common practice"),
    "speed": Limit(2.0, "m/s", "above this a run needs a cover", "common practice"),
    "clearance": Limit(0.05, "ratio", "bore less ball, over the ball: at least 5 % and 1 mm", "common practice"),
    "clearance_length": Limit(0.001, "m", "bore less ball, over the ball: at least 5 % and 1 mm", "common practice"),
    "joint_angle": Limit(0.01745, "rad", "1 degree at a joint throws no ball", "common practice"),
    "joint_step": Limit(5e-5, "m", "the running face never steps up in the direction of travel", "common practice"),
    "curvature_jump": Limit(
        3.0, "1/m", "from straight to a radius below a third of a metre the ball starts to swing", "common practice"
    ),
    "clash": Limit(0.0, "m", "two walls cannot be in one place", "geometry"),
    "uphill": Limit(1e-6, "ratio", "a ball at rest does not roll uphill", "geometry"),
}


def limit(name: str) -> float:
    """Return the value of a threshold."""
    return LIMITS[name].value
