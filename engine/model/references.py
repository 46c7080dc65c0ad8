"""Checks across a whole design: ids are unique, what is pointed at exists, no run starts from itself.

They read a design or the plain dictionaries of its file alike, so that a file with a wrong number somewhere else is
told about these too. What is not of the expected shape is passed over here: the check of fields names it.
"""

from collections.abc import Iterator, Mapping, Sequence
from typing import Any, NamedTuple

from engine.errors import suggestion
from engine.model.ball import VOID
from engine.model.catalogue import BALLS, MATERIALS, PAIRS


class Problem(NamedTuple):
    """One thing wrong: the field it is about (`runs[0].elements[3].radius`, empty for the whole) and a sentence."""

    path: str
    sentence: str


class ReferenceProblemsError(ValueError):
    """What the checks across a design found, as a ValueError so that a model validator may raise it."""

    def __init__(self, problems: Sequence[Problem]) -> None:
        self.problems = tuple(problems)
        super().__init__(" ".join(problem.sentence for problem in problems))


class _Known(NamedTuple):
    """Ids that a design may point at."""

    materials: set[str]
    balls: set[str]
    pairs: set[str]
    runs: dict[str, set[str]]


def cross_problems(design: Any) -> list[Problem]:
    """List what is wrong across a design.

    Parameters
    ----------
    design : Design, or the dictionary of a design file

    Returns
    -------
    list of Problem
        In the order of the document; empty when nothing is wrong.
    """
    known = _Known(
        {VOID, *MATERIALS, *_ids(design, "materials")},
        {*BALLS, *_ids(design, "balls")},
        {*PAIRS, *_ids(design, "pairs")},
        {_text(run, "id"): set(_ids(run, "elements")) for run in _entries(design, "runs")},
    )
    found = list(_repeated(design))
    for path, what, given, names in _pointers(design, known):
        if given not in names:
            found.append(
                Problem(path, f'{path} is "{given}", but there is no such {what}{suggestion(given, sorted(names))}.')
            )
    found.extend(_cycles(design))
    return found


def _get(node: Any, name: str) -> Any:
    """Field of a document object or of a dictionary; None when it is not there."""
    return node.get(name) if isinstance(node, Mapping) else getattr(node, name, None)


def _entries(node: Any, name: str) -> list[Any]:
    """Entries of a list field; none when it is not a list."""
    value = _get(node, name)
    return list(value) if isinstance(value, (list, tuple)) else []


def _text(node: Any, name: str) -> str:
    """Text field, empty when it is not text."""
    value = _get(node, name)
    return value if isinstance(value, str) else ""


def _ids(node: Any, name: str) -> list[str]:
    """Ids of the entries of a list field."""
    return [_text(entry, "id") for entry in _entries(node, name)]


def _repeated(design: Any) -> Iterator[Problem]:
    """Ids used twice among things of one kind; the ids of elements are unique over all runs."""
    site = _get(design, "site")
    lists = [
        ([f"{name}[{i}].id" for i in range(len(ids))], ids)
        for name in ("materials", "balls", "pairs", "runs", "stations")
        for ids in [_ids(design, name)]
    ]
    kept_out = _ids(site, "keep_outs")
    lists.append(([f"site.keep_outs[{i}].id" for i in range(len(kept_out))], kept_out))
    elements = [
        (f"runs[{r}].elements[{e}].id", key)
        for r, run in enumerate(_entries(design, "runs"))
        for e, key in enumerate(_ids(run, "elements"))
    ]
    lists.append(([path for path, _ in elements], [key for _, key in elements]))
    for paths, ids in lists:
        first: dict[str, str] = {}
        for path, key in zip(paths, ids, strict=True):
            if key and first.setdefault(key, path) != path:
                yield Problem(path, f'{path} is "{key}", which {first[key]} is already; give each its own id.')


def _pointers(design: Any, known: _Known) -> Iterator[tuple[str, str, str, set[str]]]:
    """Every reference: its path, what it points at, the id given, the ids there are."""
    for b, ball in enumerate(_entries(design, "balls")):
        for n, layer in enumerate(_entries(ball, "layers")):
            yield from _pointer(layer, "material", f"balls[{b}].layers[{n}]", "material", known.materials)
    for p, pair in enumerate(_entries(design, "pairs")):
        for name in ("ball_material", "wall_material"):
            yield from _pointer(pair, name, f"pairs[{p}]", "material", known.materials - {VOID})
    for r, run in enumerate(_entries(design, "runs")):
        yield from _pointer(run, "ball", f"runs[{r}]", "ball", known.balls)
        yield from _pointer(run, "pair", f"runs[{r}]", "contact pair", known.pairs)
        start = _get(run, "start")
        if _get(start, "kind") == "outlet":
            yield from _place(start, f"runs[{r}].start", known)
        for e, element in enumerate(_entries(run, "elements")):
            yield from _pointer(element, "pair", f"runs[{r}].elements[{e}]", "contact pair", known.pairs)
    for n, station in enumerate(_entries(design, "stations")):
        yield from _place(station, f"stations[{n}]", known)


def _pointer(node: Any, name: str, path: str, what: str, names: set[str]) -> Iterator[tuple[str, str, str, set[str]]]:
    """One reference, when it is given as text."""
    given = _text(node, name)
    if given:
        yield f"{path}.{name}", what, given, names


def _place(node: Any, path: str, known: _Known) -> Iterator[tuple[str, str, str, set[str]]]:
    """References to a run and to one of its elements."""
    yield from _pointer(node, "run", path, "run", set(known.runs))
    elements = known.runs.get(_text(node, "run"))
    if elements is not None:
        yield from _pointer(node, "element", path, "element in that run", elements)


def _cycles(design: Any) -> Iterator[Problem]:
    """Runs that start, over others or directly, from their own outlet."""
    starts = {}
    for r, run in enumerate(_entries(design, "runs")):
        start = _get(run, "start")
        if _get(start, "kind") == "outlet":
            starts[_text(run, "id")] = (_text(start, "run"), f"runs[{r}].start.run")
    told: set[str] = set()
    for key in starts:
        chain = [key]
        while chain[-1] in starts and starts[chain[-1]][0] not in chain:
            chain.append(starts[chain[-1]][0])
        if chain[-1] in starts and starts[chain[-1]][0] == key and key not in told:
            told.update(chain)
            path = starts[key][1]
            way = " -> ".join(f'"{name}"' for name in reversed([*chain, key]))
            yield Problem(path, f"{path} leads round in a circle ({way}); let one of these runs start free.")
