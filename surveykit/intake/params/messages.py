"""Validation errors as located sentences: file, line, key path, value got, what to write."""

from __future__ import annotations

import difflib
import re
import types
import typing
from collections.abc import Iterable, Mapping
from typing import Any

from pydantic import ValidationError

from surveykit.intake.params.base import NAME_PATTERN, NAME_WRITE, TEXT_WRITE, Fault, Loc, Strict
from surveykit.intake.params.reading import Document

NUMBER = re.compile(r"\s*[-+]?[0-9.]+\s*", re.ASCII)
# what pydantic adds to a location: the choice in `instruments`, and "this is about the key"
_NOT_KEYS = ("<path>", "<inline>", "<class>", "<explicit>", "[key]")


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
    skipped = set(skip)
    faults: list[tuple[str, Fault]] = []
    for item in error.errors(include_url=False):
        kind = str(item["type"])
        loc = keys_of(item["loc"])
        path = written(loc, data, missing=kind in ("missing", "fault"))
        if kind == "missing" and path != loc:
            kind = "incomplete"
        if any(path[:n] in skipped for n in range(1, len(path) + 1)):
            continue
        word, text = _sentence(kind, dict(item), path, model, data)
        faults.append((word, (path, text)))
    # A misspelt key explains that the one it meant is missing.
    meant = {(*path[:-1], _close(str(path[-1]), model_at(model, path[:-1])))
             for word, (path, _) in faults if word == "unknown"}
    return [fault for word, fault in faults if word != "missing" or fault[0] not in meant]


def _close(name: str, parent: type[Strict] | None) -> str | None:
    known = parent.model_fields if parent is not None else {}
    return next(iter(difflib.get_close_matches(name, known, 1, 0.6)), None)


def keys_of(loc: Loc) -> Loc:
    """Return pydantic's location without what stands for no key."""
    return tuple(part for part in loc if part not in _NOT_KEYS)


def written(loc: Loc, data: Any, *, missing: bool = False) -> Loc:
    """Return the part of a location that the user wrote; with `missing`, down to an absent key.

    {value: x} made from a bare x is cut.
    """
    for n, part in enumerate(loc):
        if isinstance(data, Mapping) and part in data:
            data = data[part]
        elif isinstance(data, list | tuple) and isinstance(part, int) and part < len(data):
            data = data[part]
        elif missing and isinstance(data, Mapping):
            return loc
        else:
            return loc[:n]
    return loc


def _sentence(
        kind: str, item: dict[str, Any], path: Loc, model: Any, data: Any) -> tuple[str, str]:
    if kind == "fault":
        return "fault", item["msg"]
    if item["loc"][-1:] == ("[key]",):
        return "name", f"got the name {shown(path[-1])}; write {_fallback(kind, item)}"
    parent = model_at(model, path[:-1])
    known = {} if parent is None else {
        field.alias or name: field for name, field in parent.model_fields.items()}
    if kind == "extra_forbidden" and parent is not None:
        close = _close(str(path[-1]), parent)
        hint = f"did you mean {close}? " if close else ""
        return "unknown", f"unknown key; {hint}known here: {', '.join(known)}"
    write = _write(known.get(str(path[-1]))) if path else None
    got = _at(data, path)
    if kind == "missing":
        return "missing", f"missing; write {write or 'it'}"
    if write is None:
        write = _fallback(kind, item)
    if kind == "string_type" and isinstance(got, int | float) and not isinstance(got, bool):
        write += f', in quotes: "{got}"' if "quotes" not in write else f': "{got}"'
    if kind in ("float_type", "int_type") and isinstance(got, str) and NUMBER.fullmatch(got):
        write += ", without quotes"
    return "value", f"got {shown(got)}; write {write}"


def _fallback(kind: str, item: dict[str, Any]) -> str:
    words = {
        "string_type": "a text", "float_type": "a number", "int_type": "a whole number",
        "model_type": "keys and their values", "dict_type": "keys and their values",
        "string_pattern_mismatch": NAME_WRITE
        if item.get("ctx", {}).get("pattern") == NAME_PATTERN else "another text",
        "string_too_long": TEXT_WRITE,
    }
    return words.get(kind, "another value (" + str(item["msg"]).lower() + ")")


def _at(data: Any, path: Loc) -> Any:
    for part in path:
        try:
            data = data[part]
        except (KeyError, IndexError, TypeError):
            return None
    return data


def _write(info: Any) -> str | None:
    extra = getattr(info, "json_schema_extra", None)
    return str(extra["write"]) if isinstance(extra, dict) and "write" in extra else None


def model_at(model: Any, path: Loc) -> type[Strict] | None:
    """Return the model whose keys stand at `path` below `model`, None if none does."""
    current = _unwrap(model)
    for part in path:
        if _is_model(current):
            info = current.model_fields.get(str(part))
            if info is None:
                return None
            current = _unwrap(info.annotation)
        elif typing.get_origin(current) is dict:
            current = _unwrap(typing.get_args(current)[1])
        else:
            return None
    return current if _is_model(current) else None


def _is_model(annotation: Any) -> bool:
    return isinstance(annotation, type) and issubclass(annotation, Strict)


def _unwrap(annotation: Any) -> Any:
    # Annotated[X, ...] -> X; of a union, the part that has keys.
    origin, parts = typing.get_origin(annotation), typing.get_args(annotation)
    if origin is typing.Annotated:
        return _unwrap(parts[0])
    if origin not in (typing.Union, types.UnionType):
        return annotation
    plain = [_unwrap(part) for part in parts]
    return next((part for part in plain if typing.get_origin(part) is dict or _is_model(part)),
                plain[0])
