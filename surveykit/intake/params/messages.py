"""Validation errors as located sentences: file, line, key path, value got, what to write."""

from __future__ import annotations

import re
import types
import typing
from collections.abc import Iterable, Mapping
from typing import Any, NamedTuple

from pydantic import ValidationError

from surveykit.intake.params.base import NAME_WRITE, Fault, Loc, Strict, meant, nearest
from surveykit.intake.params.reading import Document

NUMBER = re.compile(r"\s*[-+]?[0-9.]+\s*", re.ASCII)
# what pydantic adds to a location: the choice in `instruments`, and "this is about the key"
_NOT_KEYS = ("<path>", "<inline>", "<class>", "<explicit>", "[key]")
# type of error: what to write at an entry of a list or mapping, which has no description of its own
_ENTRIES = {
    "string_type": "a text", "float_type": "a number", "int_type": "a whole number",
    "model_type": "keys and their values", "dict_type": "keys and their values",
    "string_pattern_mismatch": NAME_WRITE, "literal_error": "{expected}",
    "string_too_long": "a text of at most {max_length} characters",
    "greater_than": "a number above {gt:g}", "less_than": "a number below {lt:g}",
    "greater_than_equal": "a number, {ge:g} or more", "less_than_equal": "a number, at most {le:g}",
}


def located(document: Document, faults: Iterable[Fault]) -> list[str]:
    """Return one sentence a fault, in the order of the file's lines, each once."""
    placed = []
    for path, text in faults:
        line = next((document.lines[path[:n]] for n in range(len(path), 0, -1)
                     if path[:n] in document.lines), 0)
        where = f"{document.name} line {line}" if line else document.name
        placed.append((line, f"{where}: {dotted(path)}: {text}" if path else f"{where}: {text}"))
    return list(dict.fromkeys(sentence for _, sentence in sorted(
        placed, key=lambda item: item[0])))


def dotted(path: Loc) -> str:
    """Return a key path as people write it.

    Examples
    --------
    >>> dotted(("comparison", "earlier", 0)), dotted(("surfaces", "two words", "label"))
    ('comparison.earlier[0]', "surfaces.'two words'.label")
    """
    text = ""
    for part in path:
        if isinstance(part, int):
            text += f"[{part}]"
            continue
        plain = re.fullmatch(r"[^\W\d][\w-]*|[\w-]+", part) is not None
        text += ("." if text else "") + (part if plain else repr(part[:60]))
    return text


def shown(value: Any) -> str:
    """Return what was got, short.

    Examples
    --------
    >>> shown("abc"), shown(None), shown({"a": 1}), shown(["a"]), shown(True)
    ("'abc'", 'nothing', 'a mapping', 'a list', 'true')
    """
    if value is None:
        return "nothing"
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, Mapping):
        return "a mapping"
    if isinstance(value, list | tuple):
        return "a list"
    text = repr(value)
    return text if len(text) <= 60 else text[:56] + "..." + text[-1:]


class Place(NamedTuple):
    """What stands at a location: the keys the user wrote, their model, what to write, what was got.

    `parent` is the model whose key is the last one; `write` belongs to that key, where it has none
    of its own (`own`) to the nearest above.
    """

    path: Loc
    parent: type[Strict] | None
    write: str
    own: bool
    got: Any


def place_of(loc: Loc, model: Any, data: Any, *, missing: bool = False) -> Place:
    """Follow a location of pydantic's through `model` and `data`, as far as the user wrote it.

    {value: x} made from a bare x is cut; with `missing`, the last key may be absent.
    """
    here, current = Place((), None, "at least one entry", False, data), _unwrap(model)
    for part in loc:
        if part in _NOT_KEYS:
            continue
        there = (part in here.got if isinstance(here.got, Mapping)
                 else isinstance(here.got, list) and part in range(len(here.got)))
        if not there and not (missing and isinstance(here.got, Mapping)):
            break
        parent = current if _is_model(current) else None
        info = keys_of(parent).get(str(part))
        if parent is None:  # an entry: of a mapping by its name, of a list by its number
            entry = typing.get_args(current)
            current = _unwrap(entry[-1 if typing.get_origin(current) is dict else 0])
        else:
            current = _unwrap(info.annotation if info else None)
        write = info.json_schema_extra["write"] if info else ""
        here = Place((*here.path, part), parent, write or here.write, bool(write),
                     here.got[part] if there else None)
    return here


def keys_of(model: type[Strict] | None) -> dict[str, Any]:
    """Return the fields of a model by the keys people write."""
    return {} if model is None else {
        field.alias or name: field for name, field in model.model_fields.items()}


def _is_model(annotation: Any) -> bool:
    return isinstance(annotation, type) and issubclass(annotation, Strict)


def _unwrap(annotation: Any) -> Any:
    # Annotated[X, ...] -> X; of a union, the part that has keys or entries.
    origin, parts = typing.get_origin(annotation), typing.get_args(annotation)
    if origin is typing.Annotated:
        return _unwrap(parts[0])
    if origin not in (typing.Union, types.UnionType):
        return annotation
    plain = [_unwrap(part) for part in parts]
    return next((part for part in plain
                 if typing.get_origin(part) in (dict, tuple) or _is_model(part)), plain[0])


def model_faults(
        error: ValidationError, model: Any, data: Any, skip: Iterable[Loc] = ()) -> list[Fault]:
    """Return the faults of a failed validation of `data` against `model`.

    Parameters
    ----------
    error : ValidationError
    model : type
        A model, or the type of a mapping of models.
    data : plain data
        What was validated.
    skip : iterable of tuple
        Key paths already found at fault; nothing more is said about them.
    """
    found = []
    for item in error.errors(include_url=False):
        kind = item["type"]
        place = place_of(item["loc"], model, data, missing=kind in ("missing", "fault"))
        if not under(place.path, skip):
            found.append((*_sentence(kind, item, place), place))
    # A misspelt key explains that the one it meant is missing, an entry that its list is short.
    misspelt = {(*place.path[:-1], nearest(place.path[-1], keys_of(place.parent)))
                for word, _, place in found if word == "unknown"}
    entries = {place.path[:n] for word, _, place in found if word != "too_short"
               for n in range(1, len(place.path) + 1)}
    return [(place.path, text) for word, text, place in found
            if not (word == "missing" and place.path in misspelt)
            and not (word == "too_short" and place.path in entries)]


def under(path: Loc, others: Iterable[Loc]) -> bool:
    """Return whether a key path is one of the others or lies below one."""
    return not {path[:n] for n in range(1, len(path) + 1)}.isdisjoint(others)


def _sentence(kind: str, item: Mapping[str, Any], place: Place) -> tuple[str, str]:
    """Return a word for the kind of fault, and the sentence."""
    got, write = place.got, place.write
    if kind == "fault":
        return kind, item["msg"]
    if not place.own and kind in _ENTRIES:
        write = _ENTRIES[kind].format(**item.get("ctx", {}))
    if item["loc"][-1:] == ("[key]",):
        return "name", f"got the name {shown(place.path[-1])}; write {write}"
    if kind == "extra_forbidden":
        known = keys_of(place.parent)
        return "unknown", f"unknown key; {meant(place.path[-1], known)}known here: " \
            + ", ".join(known)
    if kind == "missing" and got is None and place.own:
        return kind, f"missing; write {write}"
    if kind == "string_type" and isinstance(got, int | float) and not isinstance(got, bool):
        write += f', in quotes: "{got}"' if "quotes" not in write else f': "{got}"'
    if kind in ("float_type", "int_type") and isinstance(got, str) and NUMBER.fullmatch(got):
        write += ", without quotes"
    return "too_short" if kind == "missing" else kind, f"got {shown(got)}; write {write}"
