"""Base of every document class: frozen, nothing unknown accepted, each field with unit, bounds and label."""

import types
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Annotated, Any, Literal, Union, get_args, get_origin

from annotated_types import Ge, Gt, Le, Lt
from pydantic import BaseModel, ConfigDict, Field, StringConstraints
from pydantic.fields import FieldInfo

SHORTEST_LENGTH = 1e-5
LONGEST_LENGTH = 1e3
"""m. Sizes of a part: thinner than 0.01 mm or longer than a kilometre is a slip of the keyboard or of units."""
FARTHEST = 1e4
"""m. Coordinates of a site."""
TEXT_LIMIT = 200
NOTE_LIMIT = 20_000
"""Characters in a name and in a note."""

Identifier = Annotated[str, StringConstraints(strict=True, pattern=r"^[A-Za-z0-9_][A-Za-z0-9_.\-]{0,63}$")]
"""Letters, digits, `_ . -`, at most 64; what references point at."""
Text = Annotated[str, StringConstraints(strict=True, max_length=TEXT_LIMIT)]
Note = Annotated[str, StringConstraints(strict=True, max_length=NOTE_LIMIT)]
Coordinate = Annotated[float, Field(strict=True, allow_inf_nan=False, ge=-FARTHEST, le=FARTHEST)]
Point2 = tuple[Coordinate, Coordinate]
Point3 = tuple[Coordinate, Coordinate, Coordinate]

FieldKind = Literal["number", "flag", "text", "choice", "reference", "vector", "points", "model", "models"]


class Frozen(BaseModel):
    """Immutable piece of the document; an edit makes a new one."""

    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False)


@dataclass(frozen=True)
class FieldSpec:
    """What an editor needs to know about one field.

    Attributes
    ----------
    name, label : str
        Name in the document; text to show (key for translation).
    unit : str
        SI unit ("m", "rad", "m/s", ...), "grade" or "ratio"; empty when the field is not a quantity.
    low, high : float or None
        Bounds, both allowed unless the class says otherwise.
    kind : str
        number, flag, text, choice, reference, vector, points, model, models.
    optional : bool
        True when the field may be left out (None).
    choices : tuple of str
        Allowed words of a choice; kinds of document class for a model.
    """

    name: str
    label: str
    unit: str
    low: float | None
    high: float | None
    kind: FieldKind
    optional: bool = False
    choices: tuple[str, ...] = ()


def quantity(default: float | None, unit: str, label: str, low: float, high: float) -> Any:
    """Field that holds one finite number with bounds, in SI."""
    return Field(
        default=default,
        ge=low,
        le=high,
        strict=True,
        allow_inf_nan=False,
        json_schema_extra={"unit": unit, "label": label},
    )


def metres(default: float | None, label: str, low: float = SHORTEST_LENGTH, high: float = LONGEST_LENGTH) -> Any:
    """Field that holds a length, m."""
    return quantity(default, "m", label, low, high)


def radians(default: float | None, label: str, low: float, high: float) -> Any:
    """Field that holds an angle, rad."""
    return quantity(default, "rad", label, low, high)


def graded(default: float, label: str, limit: float = 20.0) -> Any:
    """Field that holds a grade: fall over plan length, positive downhill; 20 is 87 degrees."""
    return quantity(default, "grade", label, -limit, limit)


def labelled(default: Any, label: str, **extra: Any) -> Any:
    """Field that is not a number: text, choice, flag, part of the document."""
    return Field(default=default, json_schema_extra={"label": label, **extra})


def named(label: str, **extra: Any) -> Any:
    """Field without a default."""
    return Field(json_schema_extra={"label": label, **extra})


def several(label: str, most: int, default: tuple[Any, ...] = (), least: int = 0) -> Any:
    """Field that holds a tuple of at most `most` entries."""
    return Field(default=default, min_length=least, max_length=most, json_schema_extra={"label": label})


def fields_of(model: Frozen | type[Frozen]) -> list[FieldSpec]:
    """List the editable fields of a document class, in the order of the document; `kind` is left out.

    Parameters
    ----------
    model : a document object or its class

    Returns
    -------
    list of FieldSpec
    """
    owner = model if isinstance(model, type) else type(model)
    return [_spec(name, field) for name, field in owner.model_fields.items() if name != "kind"]


def _spec(name: str, field: FieldInfo) -> FieldSpec:
    """Specification of one field from its declaration."""
    extra = field.json_schema_extra if isinstance(field.json_schema_extra, dict) else {}
    optional = type(None) in _members(field.annotation)
    low, high = _bounds(field.metadata)
    kind, choices = _kind_of(members_of(field.annotation))
    if "reference" in extra:
        kind = "reference"
        choices = (str(extra["reference"]),)
    unit, label = str(extra.get("unit", "")), str(extra.get("label", name.replace("_", " ").capitalize()))
    return FieldSpec(name, label, unit, low, high, kind, optional, choices)


def members_of(annotation: Any) -> tuple[Any, ...]:
    """Plain members of an annotation, None left out: classes of a union, or the one type."""
    return tuple(member for member in _members(annotation) if member is not type(None))


def _members(annotation: Any) -> Iterator[Any]:
    """Plain members of an annotation: unions and `Annotated` taken apart."""
    origin = get_origin(annotation)
    if origin is Annotated:
        yield from _members(get_args(annotation)[0])
    elif origin in (Union, types.UnionType):
        for member in get_args(annotation):
            yield from _members(member)
    else:
        yield annotation


def _bounds(metadata: list[Any]) -> tuple[float | None, float | None]:
    """Lower and upper bound among the declarations of a field."""
    low: float | None = None
    high: float | None = None
    for entry in metadata:
        if isinstance(entry, (Ge, Gt)):
            low = float(str(entry.ge if isinstance(entry, Ge) else entry.gt))
        elif isinstance(entry, (Le, Lt)):
            high = float(str(entry.le if isinstance(entry, Le) else entry.lt))
    return low, high


def _kind_of(members: tuple[Any, ...]) -> tuple[FieldKind, tuple[str, ...]]:
    """Kind of editor for a field, and its choices."""
    first = members[0]
    if isinstance(first, type) and issubclass(first, Frozen):
        return "model", tuple(kind_name(member) for member in members)
    if get_origin(first) is Literal:
        return "choice", tuple(str(choice) for choice in get_args(first))
    if get_origin(first) is tuple:
        return _tuple_kind(get_args(first))
    plain: dict[Any, FieldKind] = {bool: "flag", float: "number", int: "number", str: "text"}
    return plain[first], ()


def _tuple_kind(arguments: tuple[Any, ...]) -> tuple[FieldKind, tuple[str, ...]]:
    """Kind of a tuple field: a vector of fixed length, a list of points or a list of models."""
    if arguments[-1] is not Ellipsis:
        return "vector", ()
    members = list(_members(arguments[0]))
    if get_origin(members[0]) is tuple:
        return "points", ()
    return "models", tuple(kind_name(member) for member in members)


def kind_name(model: Any) -> str:
    """Word by which a class is told apart in the document (`kind`), or its name where it has none."""
    field = model.model_fields.get("kind")
    return str(field.default) if field is not None else str(model.__name__)
