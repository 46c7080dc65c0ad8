"""Sentences for what the document classes refuse: path, what was given, what is allowed, the nearest known name."""

import json
from collections.abc import Callable, Sequence
from typing import Any, NamedTuple, get_args, get_origin

from pydantic import ValidationError
from pydantic_core import ErrorDetails

from engine.errors import nearest, suggestion
from engine.model.base import FieldSpec, Frozen, fields_of, kind_name, members_of
from engine.model.references import Problem, ReferenceProblemsError

SHOWN = 40
"""Characters of a given value that a sentence repeats."""
ID_RULE = "an id is 1 to 64 letters a to z, digits, `_`, `.` or `-`, and begins with a letter, a digit or `_`"


class _Place(NamedTuple):
    """Where an error stands: path in the document, class that owns the field, its declaration, classes allowed."""

    path: str
    owner: type[Frozen]
    spec: FieldSpec | None
    classes: tuple[Any, ...]


def problems_of(error: ValidationError, root: type[Frozen], prefix: str = "") -> list[Problem]:
    """Translate what pydantic found into problems with one sentence each.

    Parameters
    ----------
    error : what validation of `root` raised
    root : class that was validated
    prefix : path of the validated object in the document, empty for the whole design

    Returns
    -------
    list of Problem, in the order of the document
    """
    details = error.errors(include_url=False)
    places = [detail["loc"] for detail in details]
    found: list[Problem] = []
    for detail in details:
        if detail["type"] == "too_short" and _has_deeper(detail["loc"], places):
            continue  # entries that were refused are not counted, so the list seems short
        found.extend(_problems(detail, _place(detail["loc"], root, prefix)))
    return found


def _has_deeper(loc: tuple[int | str, ...], places: Sequence[tuple[int | str, ...]]) -> bool:
    """Whether another error stands inside the place of this one."""
    return any(len(other) > len(loc) and other[: len(loc)] == loc for other in places)


def _place(loc: tuple[int | str, ...], root: type[Frozen], prefix: str) -> _Place:
    """Follow a location through the classes; words that only tell the classes of a union apart are left out."""
    path, owner, spec = prefix, root, None
    classes: tuple[Any, ...] = (root,)
    for item in loc:
        if isinstance(item, int):
            path = f"{path}[{item}]"
            classes = _entries(classes, item)
        elif len(classes) > 1:
            classes = tuple(entry for entry in classes if kind_name(entry) == item)
        else:
            path = f"{path}.{item}" if path else item
            owner = classes[0] if classes and _is_class(classes[0]) else owner
            spec = next((field for field in fields_of(owner) if field.name == item), None)
            field = owner.model_fields.get(item)
            classes = () if field is None else members_of(field.annotation)
    return _Place(path, owner, spec, classes)


def _is_class(entry: Any) -> bool:
    """Whether an annotation is a document class."""
    return isinstance(entry, type) and issubclass(entry, Frozen)


def _entries(classes: tuple[Any, ...], index: int) -> tuple[Any, ...]:
    """Annotations of one entry of a tuple."""
    if not classes or get_origin(classes[0]) is not tuple:
        return ()
    arguments = get_args(classes[0])
    if arguments[-1] is Ellipsis:
        return members_of(arguments[0])
    return members_of(arguments[index]) if index < len(arguments) else ()


def _problems(detail: ErrorDetails, place: _Place) -> list[Problem]:
    """Problems of one error: one, except for a check across the design."""
    if detail["type"] == "value_error":
        reason = detail.get("ctx", {}).get("error")
        if isinstance(reason, ReferenceProblemsError):
            return list(reason.problems)
        path = f"{place.path}." if place.path else ""
        return [Problem(place.path, f"{path}{reason}.")]
    phrase = _PHRASES.get(detail["type"], _other)
    return [Problem(place.path, phrase(detail, place))]


def shown(value: Any) -> str:
    """Given value as a sentence repeats it: as in the file, shortened."""
    if isinstance(value, int) and not isinstance(value, bool) and value.bit_length() > 4 * SHOWN:
        return f"a whole number of about {int(value.bit_length() * 0.30103) + 1} digits"
    if isinstance(value, dict):
        return "an object {...}"
    if isinstance(value, (list, tuple)):
        return f"a list of {len(value)}"
    plain = isinstance(value, (str, int, float, type(None)))
    text = json.dumps(value, ensure_ascii=False) if plain else str(value)
    text = text.encode("utf-8", "backslashreplace").decode("utf-8")
    return text if len(text) <= SHOWN else f"{text[: SHOWN - 3]}..."


def _range(place: _Place) -> str:
    """Allowed range of a field, as the end of a sentence."""
    spec = place.spec
    if spec is None or spec.low is None or spec.high is None:
        return ""
    unit = f" {spec.unit}" if spec.unit not in ("", "ratio", "grade") else ""
    return f" from {spec.low:.6g} to {spec.high:.6g}{unit}"


def _bounds(detail: ErrorDetails, place: _Place) -> str:
    """Sentence about a number out of bounds."""
    context = detail.get("ctx", {})
    allowed = _range(place)
    if not allowed:
        low, high = context.get("ge", context.get("gt")), context.get("le", context.get("lt"))
        allowed = f" at least {low:g}" if low is not None else f" at most {high:g}"
    return f"{place.path} is {shown(detail['input'])}; give a number{allowed}."


def _number(detail: ErrorDetails, place: _Place) -> str:
    """Sentence about something that is no finite number."""
    return f"{place.path} is {shown(detail['input'])}; give a finite number{_range(place)}."


def _unknown_field(detail: ErrorDetails, place: _Place) -> str:
    """Sentence about a field that the class does not have."""
    names = list(place.owner.model_fields)
    near = suggestion(str(detail["loc"][-1]), names, len(names))
    return f"{place.path} is not a field of {_class_words(place.owner)}{near}."


def _class_words(owner: type[Frozen]) -> str:
    """Name of a class in a sentence."""
    words = kind_name(owner).replace("_", " ").lower()
    return f"{'an' if words[0] in 'aeiou' else 'a'} {words}"


def _missing(detail: ErrorDetails, place: _Place) -> str:
    """Sentence about a field that must be given."""
    return f"{place.path} is missing; it must be given."


def _kind(detail: ErrorDetails, place: _Place) -> str:
    """Sentence about an unknown or missing `kind`."""
    kinds = [kind_name(entry) for entry in place.classes]
    given = detail["input"].get("kind") if isinstance(detail["input"], dict) else None
    if given is None:
        return f"{place.path}.kind is missing; known are " + ", ".join(f'"{kind}"' for kind in kinds) + "."
    return f"{place.path}.kind is {shown(given)}, which is no known kind{suggestion(str(given), kinds, len(kinds))}."


def _choice(detail: ErrorDetails, place: _Place) -> str:
    """Sentence about a word that is not one of the allowed ones."""
    choices = list(place.spec.choices) if place.spec is not None else []
    given = detail["input"]
    near = nearest(given, choices) if isinstance(given, str) else None
    hint = f'; the nearest is "{near}"' if near is not None else ""
    allowed = detail.get("ctx", {}).get("expected") or " or ".join(choices)
    return f"{place.path} is {shown(given)}; allowed is {allowed}{hint}."


def _length(detail: ErrorDetails, place: _Place) -> str:
    """Sentence about a list with too many or too few entries."""
    context = detail.get("ctx", {})
    low, high = context.get("min_length"), context.get("max_length")
    allowed = f"at least {low}" if low is not None else f"at most {high}"
    return f"{place.path} has {len(detail['input'])} entries; give {allowed}."


def _text_length(detail: ErrorDetails, place: _Place) -> str:
    """Sentence about a text that is too long."""
    given, most = len(detail["input"]), detail.get("ctx", {}).get("max_length")
    return f"{place.path} has {given} characters; give at most {most}."


def _expected(what: str) -> Callable[[ErrorDetails, _Place], str]:
    """Phrase that says what kind of value belongs there."""

    def phrase(detail: ErrorDetails, place: _Place) -> str:
        return f"{place.path or 'the design'} is {shown(detail['input'])}; give {what}."

    return phrase


def _other(detail: ErrorDetails, place: _Place) -> str:
    """Sentence about anything else that validation refuses."""
    return f"{place.path or 'the design'} is {shown(detail['input'])}, which is not allowed: {detail['msg'].lower()}."


_PHRASES: dict[str, Callable[[ErrorDetails, _Place], str]] = {
    "greater_than_equal": _bounds,
    "less_than_equal": _bounds,
    "finite_number": _number,
    "float_type": _number,
    "float_parsing": _number,
    "extra_forbidden": _unknown_field,
    "missing": _missing,
    "union_tag_invalid": _kind,
    "union_tag_not_found": _kind,
    "literal_error": _choice,
    "int_parsing_size": _choice,
    "too_long": _length,
    "too_short": _length,
    "string_too_long": _text_length,
    "string_type": _expected('text in quotes ("...")'),
    "string_unicode": _expected("text that UTF-8 can hold"),
    "string_pattern_mismatch": _expected(f"another: {ID_RULE}"),
    "bool_type": _expected("true or false"),
    "tuple_type": _expected("a list in square brackets"),
    "model_type": _expected("an object in braces"),
    "model_attributes_type": _expected("an object in braces"),
}
