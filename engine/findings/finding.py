"""One thing that goes wrong, or nearly: kind, place, time, figure against its limit, one sentence, one cure."""

import math
from dataclasses import dataclass
from enum import StrEnum


class FindingKind(StrEnum):
    """What a finding is about."""

    ESCAPE = "escape"
    COMES_BACK = "comes_back"
    STALL = "stall"
    ORBIT = "endless_orbit"
    JAM = "jam"
    SLIP = "slip"
    LIFT_OFF = "lift_off"
    IMPACT = "hard_impact"
    OVER_SPEED = "over_speed"
    THIN_MARGIN = "thin_margin"
    COUNTER_GRADE = "counter_grade"
    CURVATURE_JUMP = "curvature_jump"
    JOINT = "joint_mismatch"
    CLASH = "clash"
    OUT_OF_SITE = "out_of_site"
    TWO_WALLS = "two_walls"


class Severity(StrEnum):
    """How bad: the run fails by it, it is near a limit, or it is worth knowing."""

    FAILS = "fails"
    THIN = "thin"
    NOTE = "note"


RANK = {Severity.FAILS: 0, Severity.THIN: 1, Severity.NOTE: 2}


@dataclass(frozen=True)
class Finding:
    """One finding.

    Attributes
    ----------
    kind : FindingKind
    severity : Severity
    where : str
        Place in words, as shown.
    segment : str
        Id of the element, empty for none.
    s : float
        Arc length along the element, m; nan where it has none.
    t : float
        Time, s; nan for what needs no run.
    value, limit : float
        Figure and its limit, in `unit` (SI or "ratio").
    unit : str
    sentence : str
        What, how much, against what limit.
    cure : str
        One thing to do.
    position : tuple of three floats, m, or None
    """

    kind: FindingKind
    severity: Severity
    where: str
    segment: str
    s: float
    t: float
    value: float
    limit: float
    unit: str
    sentence: str
    cure: str
    position: tuple[float, float, float] | None = None

    def as_json(self) -> dict[str, object]:
        """Return the finding as the command line prints it; numbers that do not exist are null."""
        return {
            "kind": self.kind.value,
            "severity": self.severity.value,
            "where": self.where,
            "segment": self.segment,
            "s_m": finite(self.s),
            "t_s": finite(self.t),
            "value": finite(self.value),
            "limit": finite(self.limit),
            "unit": self.unit,
            "sentence": self.sentence,
            "cure": self.cure,
        }


def finite(value: float) -> float | None:
    """Return the number, None where it is nan or infinite (JSON has neither)."""
    return value if math.isfinite(value) else None
