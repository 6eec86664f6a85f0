"""YAML read the same by every route: what its editions read differently is refused, with lines."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import yaml

from surveykit.core import InputError
from surveykit.intake.params.base import Fault, Loc
from surveykit.intake.params.scalars import implicit_tag, plain_reading

MAX_BYTES = 256 * 1024
MAX_DEPTH = 12
MAX_ALIASES = 5
MAX_NODES = 20_000


@dataclass(frozen=True)
class Document:
    """A parameter file as plain data, the line of each key, and what was refused in it.

    `refused` are the key paths whose value is a guess at what was meant.
    """

    name: str
    data: dict[str, Any]
    lines: dict[Loc, int]
    faults: tuple[Fault, ...]
    refused: tuple[Loc, ...]


def _short(text: str) -> str:
    return text if len(text) <= 40 else text[:37] + "..."


def read_text(path: Path, name: str) -> str:
    """Return the text of a parameter file.

    Raises
    ------
    InputError
        If it is missing, no plain file, too long, binary, or not UTF-8.
    """
    try:
        if not path.is_file():
            what = ("is a folder" if path.is_dir() else "is no plain file" if path.exists()
                    else "no such file")
            raise InputError(f"{name}: {what}; name a parameter file, such as params/x.yml")
        size = path.stat().st_size
        if size > MAX_BYTES:
            raise InputError(f"{name}: {size} bytes; a parameter file has at most {MAX_BYTES}: "
                             "is this a data file?")
        raw = path.read_bytes()
    except (OSError, ValueError) as problem:
        reason = getattr(problem, "strerror", None) or "the name is not usable"
        raise InputError(f"{name}: cannot be read ({reason}); check the name and its "
                         "permissions") from None
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as problem:
        line = raw[:problem.start].count(b"\n") + 1
        raise InputError(f"{name} line {line}: byte {raw[problem.start]:#04x} is not UTF-8; "
                         "save the file as text in UTF-8") from None
    if "\0" in text:
        raise InputError(f"{name}: is a binary file; write a YAML text file in UTF-8")
    return text


def read_document(path: Path, name: str) -> Document:
    """Return the parameter file `path`, called `name` in messages.

    Raises
    ------
    InputError
        If nothing can be made of it; what can be located without giving up is in `faults`.
    """
    text = read_text(path, name)
    try:
        reader = _Reader(text, name)
        node = reader.get_single_node()
    except yaml.YAMLError as problem:
        raise InputError(_syntax(problem, name)) from None
    except (ValueError, OverflowError):
        raise InputError(f"{name}: not YAML: an escape or directive holds no character or "
                         "version; write texts without backslashes") from None
    data = None if node is None else reader.value(node, ())
    if data is None:
        raise InputError(f"{name}: is empty; write the keys of a campaign or of a kit")
    if not isinstance(data, dict):
        raise InputError(f"{name}: holds {'a list' if isinstance(data, list) else 'one text'}; "
                         "write keys, such as campaign: mill-yard-2025-07-24")
    return Document(name, data, reader.lines, tuple(reader.faults), tuple(reader.refused))


class _Reader(yaml.SafeLoader):
    """Reads a file's one document: as a stream of events, then as plain data with their lines.

    The events are watched for depth, aliases and tags before anything is built of them.
    """

    def __init__(self, text: str, called: str) -> None:
        super().__init__(text)
        self.called = called
        self.lines: dict[Loc, int] = {}
        self.faults: list[Fault] = []
        self.refused: list[Loc] = []
        self.open_anchors: list[str | None] = []
        self.count = Counter[str]()

    def get_event(self) -> Any:
        event = super().get_event()
        self.count["events"] += 1
        if self.count["events"] > 2 * MAX_NODES:
            raise InputError(f"{self.called}: more than {MAX_NODES} entries; write a shorter file")
        line = event.start_mark.line + 1 if event.start_mark else 1
        here = f"{self.called} line {line}: "
        if isinstance(event, yaml.DocumentStartEvent):
            self.count["documents"] += 1
            if self.count["documents"] > 1:
                raise InputError(here + "a second document begins; write one, without ---")
        elif isinstance(event, yaml.AliasEvent):
            self.count["aliases"] += 1
            if event.anchor in self.open_anchors:
                raise InputError(here + f"*{event.anchor} stands inside what it names; "
                                 "write it out")
            if self.count["aliases"] > MAX_ALIASES:
                raise InputError(here + f"more than {MAX_ALIASES} aliases; write the values out")
        elif isinstance(event, yaml.CollectionStartEvent | yaml.ScalarEvent):
            if event.tag is not None:
                tag = event.tag.replace("tag:yaml.org,2002:", "!!")
                self.faults.append(((), f"tag {_short(tag)} in line {line}; write the value "
                                    "without a tag, a text in quotes"))
            if isinstance(event, yaml.CollectionStartEvent):
                self.open_anchors.append(event.anchor)
                if len(self.open_anchors) > MAX_DEPTH:
                    raise InputError(here + f"more than {MAX_DEPTH} levels deep; "
                                     "check the indentation and the brackets")
        elif isinstance(event, yaml.CollectionEndEvent):
            self.open_anchors.pop()
        return event

    def refuse(self, path: Loc, text: str) -> None:
        self.faults.append((path, text))
        self.refused.append(path)

    def value(self, node: yaml.Node, path: Loc) -> Any:
        self.count["values"] += 1
        if self.count["values"] > MAX_NODES:
            raise InputError(f"{self.called}: more than {MAX_NODES} entries; "
                             "write a shorter file, or fewer aliases")
        if isinstance(node, yaml.MappingNode):
            return self._mapping(node, path)
        if isinstance(node, yaml.SequenceNode):
            values = []
            for index, child in enumerate(node.value):
                self.lines[(*path, index)] = child.start_mark.line + 1
                values.append(self.value(child, (*path, index)))
            return values
        if getattr(node, "style", None) is not None or node.tag != implicit_tag(node.value):
            return node.value  # quoted, or tagged and refused for that
        value, spelling = plain_reading(node.value)
        if spelling:
            self.refuse(path, f"got {_short(node.value)}; {spelling}")
        return value

    def _mapping(self, node: yaml.MappingNode, path: Loc) -> dict[str, Any]:
        data: dict[str, Any] = {}
        for key_node, child in node.value:
            line = key_node.start_mark.line + 1
            key = self._key(key_node, path, line)
            if key is None:
                continue
            here = (*path, key)
            if key in data:
                self.faults.append((here, f"written again in line {line}; each key may stand "
                                    "once: remove one of the two"))
                continue
            self.lines[here] = line
            data[key] = self.value(child, here)
        return data

    def _key(self, node: yaml.Node, path: Loc, line: int) -> str | None:
        if not isinstance(node, yaml.ScalarNode):
            self.faults.append((path, f"a list or mapping as a key in line {line}; write a name"))
            return None
        text = str(node.value)
        value, spelling = (text, None) if node.style is not None else plain_reading(text)
        if text == "<<" and spelling:
            self.refuse((*path, text), "merging is not supported; write the keys out")
        elif spelling or not isinstance(value, str):
            self.refuse((*path, text), f"as a key, a bare {_short(text)} is no text to every YAML "
                                       f'reader; write "{_short(text)}", in quotes')
        return text


def _syntax(problem: yaml.YAMLError, name: str) -> str:
    if isinstance(problem, yaml.MarkedYAMLError):
        mark = problem.problem_mark or problem.context_mark
        where = f"{name} line {mark.line + 1}" if mark else name
        said = " ".join(part for part in (problem.context, problem.problem) if part)
        repair = "check indentation, colons, quotes and brackets here and in the line above"
        if "'\\t'" in said:
            repair = "indent with spaces, not tabs"
        elif "cannot start any token" in said:
            repair = "put a text that begins with this character in quotes"
        return f"{where}: not YAML: {said}; {repair}"
    if isinstance(problem, yaml.reader.ReaderError):
        return (f"{name}: character {problem.character!r} at position {problem.position} is not "
                "allowed in YAML; remove it")
    return f"{name}: not YAML; check indentation, colons, quotes and brackets"
