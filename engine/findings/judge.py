"""All findings of a rolled design, worst first, and the verdict."""

from engine.findings.finding import RANK, Finding, Severity
from engine.findings.geometry_checks import of_geometry
from engine.findings.motion import Rolled, of_motion
from engine.integrate.result import Status, Trajectory
from engine.model.design import Design
from engine.placement import Layout


def find(design: Design, layout: Layout, track: Trajectory) -> tuple[Finding, ...]:
    """Return every finding, worst first, then by time.

    Parameters
    ----------
    design : Design
    layout : Layout
    track : Trajectory

    Returns
    -------
    tuple of Finding
    """
    run = design.run_of(layout.placed[0].element.id) if layout.placed else design.runs[0]
    mass = design.mass_of(design.ball_of(run))
    rolled = Rolled(design, layout, track, float(mass))
    found = [*of_motion(rolled), *of_geometry(rolled)]
    return tuple(sorted(found, key=lambda entry: (RANK[entry.severity], entry.t if entry.t == entry.t else 0.0)))


def verdict(findings: tuple[Finding, ...], status: Status) -> str:
    """Return "clears" when the ball arrives and nothing fails, else "fails"."""
    fails = any(entry.severity is Severity.FAILS for entry in findings)
    return "clears" if status == Status.ARRIVED and not fails else "fails"
