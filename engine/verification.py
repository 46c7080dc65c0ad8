"""Reference cases held against the engine: `trundle verify`."""

from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from engine.reference.cases import read_cases
from engine.reference.compare import KINDS, CaseResult, compare

WORDS = {True: "pass", False: "FAIL", None: "not run"}


@dataclass(frozen=True)
class Report:
    """Results of a file of cases."""

    cases: tuple[CaseResult, ...]

    @property
    def passed(self) -> int:
        """How many cases agree."""
        return sum(case.ok is True for case in self.cases)

    @property
    def failed(self) -> int:
        """How many cases disagree or could not be rolled."""
        return sum(case.ok is False for case in self.cases)

    @property
    def not_run(self) -> int:
        """How many cases have no run of their own."""
        return sum(case.ok is None for case in self.cases)

    def as_json(self) -> dict[str, Any]:
        """Return the report as plain values; ratios are errors over their limits."""
        return {
            "cases": [_as_json(case) for case in self.cases],
            "passed": self.passed,
            "failed": self.failed,
            "not_run": self.not_run,
        }

    def lines(self) -> list[str]:
        """Return a line per case and a summary line."""
        width = max((len(case.name) for case in self.cases), default=0)
        summary = f"{self.passed} passed, {self.failed} failed, {self.not_run} not run."
        return [*(_line(case, width) for case in self.cases), summary]


def verify_file(path: Path | str) -> Report:
    """Compare the engine with every case of a file.

    Raises
    ------
    CasesFileError
        When the file cannot be used.
    """
    return report(compare(case) for case in read_cases(path))


def report(results: Iterable[CaseResult]) -> Report:
    """Return the report of results."""
    return Report(tuple(results))


def _as_json(case: CaseResult) -> dict[str, Any]:
    return {"name": case.name, "kind": case.kind, "ok": case.ok, "worst": dict(case.worst), "note": case.note}


def _line(case: CaseResult, width: int) -> str:
    ratios = "  ".join(f"{kind} {case.worst[kind]:8.2g}" for kind in KINDS)
    return f"{case.name:<{width}}  {WORDS[case.ok]:<7}  {ratios}  {case.note}".rstrip()
