"""Steps that bring an older file up to date: one function from each version n to n + 1, dictionary in, dictionary out.

Version 1 is the first, so there is no step yet. To add one: raise `SCHEMA_VERSION` in `engine/model/design.py`, write
the step here, with the reason in its docstring; enter it in `STEPS`; keep an old file in `tests/documents/`.
"""

from collections.abc import Callable, Mapping
from typing import Any

from engine.model.design import SCHEMA_VERSION
from engine.model.problems import shown
from engine.model.references import Problem

Step = Callable[[dict[str, Any]], dict[str, Any]]

STEPS: dict[int, Step] = {}
"""Step from each version to the next."""


def version_problem(
    raw: Mapping[str, Any], current: int = SCHEMA_VERSION, steps: Mapping[int, Step] = STEPS
) -> Problem | None:
    """Say why the version of a file cannot be read; None when it can."""
    version = raw.get("schema_version")
    path = "schema_version"
    if "schema_version" not in raw:
        return Problem(path, f"{path} is missing; a design of this version has {current}.")
    if not isinstance(version, int) or isinstance(version, bool) or version < 0:
        return Problem(path, f"{path} is {shown(version)}; give a whole number up to {current}.")
    if version > current:
        sentence = (
            f"{path} is {version}: the file was made by a newer Trundle; this one reads up to {current}, update it."
        )
        return Problem(path, sentence)
    lacking = [step for step in range(version, current) if step not in steps]
    if lacking:
        return Problem(path, f"{path} is {version}; there is no way from version {lacking[0]} to {lacking[0] + 1}.")
    return None


def migrate(raw: dict[str, Any], current: int = SCHEMA_VERSION, steps: Mapping[int, Step] = STEPS) -> dict[str, Any]:
    """Bring the dictionary of a file to the current version; `version_problem` must have found nothing.

    Parameters
    ----------
    raw : dictionary of the file, left as it is
    current, steps : version to reach, step from each version

    Returns
    -------
    dict
        With `schema_version` equal to `current`.
    """
    for version in range(raw["schema_version"], current):
        raw = {**steps[version](dict(raw)), "schema_version": version + 1}
    return raw
