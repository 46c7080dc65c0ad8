"""`trundle verify`: reference cases read, run and compared; the report."""

import json
import math
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from engine.errors import CasesFileError, TrundleError, os_reason
from engine.reference.compare import CaseResult, compare

LARGEST_FILE = 100_000_000
"""Bytes. A larger file is not a file of cases."""


@dataclass(frozen=True)
class Report:
    """Results of a file of reference cases."""

    results: tuple[CaseResult, ...]

    @property
    def failed(self) -> int:
        """How many cases fail."""
        return sum(entry.ran and not entry.ok for entry in self.results)

    @property
    def passed(self) -> int:
        """How many cases pass."""
        return sum(entry.ran and entry.ok for entry in self.results)

    @property
    def not_run(self) -> int:
        """How many cases have nothing to run."""
        return sum(not entry.ran for entry in self.results)

    def as_json(self) -> dict[str, Any]:
        """Return the report as `--json` prints it."""
        cases = [
            {"name": r.name, "kind": r.kind, "ok": r.ok, "worst": r.worst, "note": "; ".join(r.notes)} for r in self.results
        ]
        return {"cases": cases, "passed": self.passed, "failed": self.failed, "not_run": self.not_run}

    def lines(self) -> list[str]:
        """Return one line a case and a summary."""
        rows = []
        for entry in self.results:
            word = ("pass" if entry.ok else "FAIL") if entry.ran else "not run"
            worst = "  ".join(f"{key} {value:8.1e}" for key, value in entry.worst.items())
            rows.append(f"{word:8}{entry.name:32}{worst}  {'; '.join(entry.notes)}".rstrip())
        return [*rows, f"{self.passed} passed, {self.failed} failed, {self.not_run} not run"]


def read_cases(path: Path) -> list[dict[str, Any]]:
    """Return the cases of a file.

    Raises
    ------
    CasesFileError
        When the file cannot be read or is not a file of cases; the message says what is wrong.
    """
    try:
        if path.stat().st_size > LARGEST_FILE:
            raise CasesFileError(f"{path} is larger than {LARGEST_FILE // 1_000_000} MB; give a file of reference cases.")
        data = json.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise CasesFileError(f"{path} cannot be read: {os_reason(error)}.") from error
    except (ValueError, RecursionError) as error:
        raise CasesFileError(f"{path} is not JSON text ({error}); give a file of reference cases.") from error
    cases = data.get("cases") if isinstance(data, dict) else None
    if not isinstance(cases, list) or not all(isinstance(case, dict) for case in cases):
        raise CasesFileError(f'{path} has no list "cases"; give a file of reference cases.')
    for number, case in enumerate(cases):
        if not isinstance(case.get("name"), str) or not isinstance(case.get("kind"), str):
            raise CasesFileError(f"{path}: case {number + 1} has no name or no kind; each case needs both.")
    return cases


def check_case(case: dict[str, Any]) -> CaseResult:
    """Compare one case; one that cannot be set up fails with a note that says why."""
    try:
        return compare(case)
    except KeyError as error:
        note = f"the case has no {error}"
    except (TypeError, ValueError, IndexError, ArithmeticError, TrundleError) as error:
        note = f"the case cannot be set up: {error}"
    result = CaseResult(case["name"], case["kind"], worst=dict.fromkeys(("x", "v", "w", "t", "numbers"), math.inf))
    result.worst = dict.fromkeys(result.worst, 1e9)
    result.fail(note)
    return result


def verify_file(path: str | Path) -> Report:
    """Run every case of a file and return the report."""
    return Report(tuple(check_case(case) for case in read_cases(Path(path))))
