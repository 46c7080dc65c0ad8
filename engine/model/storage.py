"""Design files: read with every problem named at once, written whole or not at all, and their JSON Schema."""

import codecs
import json
import os
import shutil
import stat
import tempfile
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from engine.errors import DesignFileError, SaveError, os_reason
from engine.model.design import Design
from engine.model.migrations import migrate, version_problem
from engine.model.problems import problems_of, shown
from engine.model.references import cross_problems

SIZE_LIMIT = 50_000_000
"""Bytes. A design of many thousand elements takes a tenth of it."""
DEPTH_LIMIT = 40
"""Levels of lists and objects inside each other; a design has nine."""
PROBLEM_LIMIT = 200
"""Problems told of one file; the rest is counted."""
INDENT = 1

FilePath = str | os.PathLike[str]


class _RepeatedKeys:
    """Finds field names given twice while the JSON is read: the plain reader would silently keep the last one."""

    def __init__(self) -> None:
        self.found: list[tuple[dict[str, Any], str]] = []

    def pairs(self, pairs: list[tuple[str, Any]]) -> dict[str, Any]:
        """Make an object of its pairs and note names that come again."""
        made: dict[str, Any] = {}
        twice = []
        for name, value in pairs:
            if name in made:
                twice.append(name)
            made[name] = value
        self.found.extend((made, name) for name in twice)
        return made


def load(path: FilePath) -> Design:
    """Read a design.

    Parameters
    ----------
    path : file of any schema version up to the current one

    Returns
    -------
    Design

    Raises
    ------
    DesignFileError
        With one sentence for each problem of the file.
    """
    return parse(_read(Path(path)), str(path))


def parse(content: bytes, path: str = "design") -> Design:
    """Read a design from the bytes of its file; `path` names it in errors."""
    repeated = _RepeatedKeys()
    raw = _json(content, path, repeated)
    if not isinstance(raw, dict):
        raise DesignFileError(path, [f"The file holds {shown(raw)}; a design is an object in braces."])
    if _depth(raw) > DEPTH_LIMIT:
        raise DesignFileError(path, [f"The file is nested more than {DEPTH_LIMIT} levels deep; a design has nine."])
    problems = _repetitions(raw, repeated)
    version = version_problem(raw)
    if version is not None:
        raise DesignFileError(path, [version.sentence, *problems])
    design, refused = _validated(migrate(raw))
    problems = [*problems, *refused]
    if problems or design is None:
        raise DesignFileError(path, _limited(problems))
    return design


def _validated(raw: dict[str, Any]) -> tuple[Design | None, list[str]]:
    """Design of a dictionary, or what is wrong with it: fields first, then what only shows across the design."""
    try:
        return Design.model_validate(raw), []
    except ValidationError as error:
        found = problems_of(error, Design)
    told = {problem.sentence for problem in found}
    found.extend(problem for problem in cross_problems(raw) if problem.sentence not in told)
    return None, [problem.sentence for problem in found]


def _limited(problems: list[str]) -> list[str]:
    """Problems to tell: the first ones, and how many more there are."""
    if len(problems) <= PROBLEM_LIMIT:
        return problems
    return [*problems[:PROBLEM_LIMIT], f"There are {len(problems) - PROBLEM_LIMIT} more problems; correct these first."]


def _read(path: Path) -> bytes:
    """Bytes of a file of bearable size."""
    try:
        found = path.stat()
        if stat.S_ISDIR(found.st_mode):
            raise DesignFileError(str(path), ["It is a folder; name the design file inside it."])
        if not stat.S_ISREG(found.st_mode):
            raise DesignFileError(str(path), ["It is a device or a pipe; name a file on a disk."])
        with path.open("rb") as file:
            content = file.read(SIZE_LIMIT + 1)
    except OSError as error:
        raise DesignFileError(str(path), [f"The file cannot be read: {os_reason(error)}."]) from error
    except ValueError as error:
        raise DesignFileError(repr(str(path)), ["The name holds a character that no file name can have."]) from error
    if len(content) > SIZE_LIMIT:
        raise DesignFileError(
            str(path), [f"The file is larger than {SIZE_LIMIT // 1_000_000} MB; a design is far smaller."]
        )
    return content


def _json(content: bytes, path: str, repeated: _RepeatedKeys) -> Any:
    """Plain data of the bytes of a file; NaN and Infinity are let through for the check of fields to name."""
    if not content.strip():
        raise DesignFileError(path, ["The file is empty; a design is an object in braces."])
    if content.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        raise DesignFileError(path, ["The file is UTF-16 text; save it as UTF-8."])
    try:
        return json.loads(content.decode("utf-8-sig"), object_pairs_hook=repeated.pairs)
    except UnicodeDecodeError as error:
        sentence = f"The file is not UTF-8 text (byte {error.start} is 0x{content[error.start]:02x}); save it as UTF-8."
    except json.JSONDecodeError as error:
        sentence = f"The file is not JSON at line {error.lineno}, column {error.colno}: {_json_reason(error)}."
    except RecursionError:
        sentence = f"The file is nested more than {DEPTH_LIMIT} levels deep; a design has nine."
    except ValueError:
        sentence = "The file holds a whole number of several thousand digits; give numbers of a usual size."
    raise DesignFileError(path, [sentence])


def _json_reason(error: json.JSONDecodeError) -> str:
    """Reason why text is no JSON; a file that just ends has been cut off."""
    if error.pos >= len(error.doc.rstrip()) or error.msg.startswith("Unterminated"):
        return "the text ends too early, as if the file was cut off"
    return error.msg[0].lower() + error.msg[1:]


def _depth(raw: Any) -> int:
    """Levels of nesting, counted without recursion and no further than needed."""
    level, depth = [raw], 0
    while level and depth <= DEPTH_LIMIT:
        depth += 1
        level = [
            inner
            for outer in level
            for inner in (outer.values() if isinstance(outer, dict) else outer)
            if isinstance(inner, (dict, list))
        ]
    return depth


def _repetitions(raw: dict[str, Any], repeated: _RepeatedKeys) -> list[str]:
    """One sentence for each field name given twice, with its path."""
    if not repeated.found:
        return []
    paths: dict[int, str] = {}
    waiting: list[tuple[Any, str]] = [(raw, "")]
    while waiting:
        node, path = waiting.pop()
        if isinstance(node, dict):
            paths[id(node)] = path
            waiting.extend((inner, f"{path}.{name}" if path else name) for name, inner in node.items())
        elif isinstance(node, list):
            waiting.extend((inner, f"{path}[{index}]") for index, inner in enumerate(node))
    names = [(paths.get(id(node), ""), name) for node, name in repeated.found]
    return [f"{path}{'.' if path else ''}{name} is given twice; keep one of them." for path, name in names]


def to_text(design: Design) -> str:
    """Text of a design file: fields in the order of the document, what is None left out, a newline at the end."""
    raw = design.model_dump(mode="json", exclude_none=True)
    return json.dumps(raw, indent=INDENT, ensure_ascii=False, allow_nan=False) + "\n"


def save(design: Design, path: FilePath) -> None:
    """Write a design whole or not at all: beside the file first, then put in its place in one step.

    Raises
    ------
    SaveError
        When it cannot be written; what stood at `path` before is whole.
    """
    write_whole(to_text(design).encode("utf-8"), path)


def write_whole(content: bytes, path: FilePath) -> None:
    """Write bytes to a file in one step, so that no half-written file can be left; a link stays a link."""
    target = Path(os.path.realpath(path))
    beside: str | None = None
    try:
        if target.is_dir():
            raise SaveError(f"{path} cannot be written: it is a folder, not a file; give a file name.")
        if target.exists() and not os.access(target, os.W_OK):
            raise SaveError(f"{path} cannot be written: it is write-protected; save under another name.")
        handle, beside = tempfile.mkstemp(prefix=f".{target.name[:100]}.", suffix=".part", dir=target.parent)
        with os.fdopen(handle, "wb") as file:
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
        _keep_mode(target, beside)
        os.replace(beside, target)
        beside = None
    except OSError as error:
        advice = "what stood there before is unchanged; save to another place"
        raise SaveError(f"{path} cannot be written: {os_reason(error)}; {advice}.") from error
    finally:
        if beside is not None:
            _remove(beside)
    _settle(target.parent)


def _keep_mode(target: Path, beside: str) -> None:
    """Give the new file the permissions of the old one, or those of any new file."""
    if target.exists():
        shutil.copymode(target, beside)
        return
    mask = os.umask(0)
    os.umask(mask)
    os.chmod(beside, 0o666 & ~mask)


def _remove(path: str) -> None:
    """Remove a half-written file as far as possible."""
    try:
        os.unlink(path)
    except OSError:
        return


def _settle(folder: Path) -> None:
    """Have the folder itself written to disk, where the system can do that."""
    if not hasattr(os, "O_DIRECTORY"):
        return
    try:
        handle = os.open(folder, os.O_RDONLY | os.O_DIRECTORY)
    except OSError:
        return
    try:
        os.fsync(handle)
    except OSError:
        return
    finally:
        os.close(handle)


def schema() -> dict[str, Any]:
    """JSON Schema (draft 2020-12) of the current version of the document."""
    made = Design.model_json_schema()
    title = "Trundle design, schema version 1"
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **made, "title": title}
