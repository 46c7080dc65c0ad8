"""Fields out of JSON records, a sentence for everything that is wrong with them."""

import json
import math
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.errors import suggestion

Array = NDArray[np.float64]
Record = dict[str, Any]


@dataclass
class Reader:
    """Takes fields out of records and gathers a sentence for everything that is wrong."""

    problems: list[str] = field(default_factory=list)

    def number(self, record: Record, key: str, where: str, default: float | None = None) -> float:
        """Return a number of a record; nan and a sentence when it is missing or none."""
        value = record.get(key, default)
        if isinstance(value, int | float) and not isinstance(value, bool):
            return float(value)
        self.problems.append(f'{where}: "{key}" must be a number; {_given(value)}.')
        return math.nan

    def positive(self, record: Record, key: str, where: str) -> float:
        """Return a number above zero."""
        value = self.number(record, key, where)
        if value <= 0.0:
            self.problems.append(f'{where}: "{key}" must be above 0; {value:g} was given.')
        return value

    def vector(self, record: Record, key: str, where: str) -> Array | None:
        """Return three numbers, None where the key is not there."""
        value = record.get(key)
        if value is None:
            return None
        if isinstance(value, list) and len(value) == 3 and all(is_number(part) for part in value):
            return np.array(value, dtype=np.float64)
        self.problems.append(f'{where}: "{key}" must be three numbers; {_given(value)}.')
        return None

    def choice(self, value: Any, allowed: tuple[str, ...], what: str, where: str) -> str:
        """Return a word of a known list."""
        if value not in allowed:
            self.problems.append(f'{where}: there is no {what} "{value}"{suggestion(str(value), allowed)}.')
        return str(value)

    def records(self, record: Record, key: str, where: str) -> list[Record]:
        """Return a list of objects; a missing or null one is empty."""
        value = record.get(key) or []
        if isinstance(value, list) and all(isinstance(part, dict) for part in value):
            return value
        self.problems.append(f'{where}: "{key}" must be a list of objects.')
        return []

    def part(self, record: Record, key: str, where: str) -> Record:
        """Return an object; a missing or null one is empty."""
        value = record.get(key) or {}
        if isinstance(value, dict):
            return value
        self.problems.append(f'{where}: "{key}" must be an object.')
        return {}


def is_number(value: Any) -> bool:
    """Return whether a value is a number (and no truth value)."""
    return isinstance(value, int | float) and not isinstance(value, bool)


def _given(value: Any) -> str:
    return "it is missing" if value is None else f"{json.dumps(value)[:40]} was given"
