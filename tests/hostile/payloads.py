"""Hostile texts, and every place of a campaign's file where a text may stand, from the schema."""

from __future__ import annotations

from collections.abc import Iterator
from copy import deepcopy
from pathlib import Path as File
from typing import Any

import small_survey
import yaml

from surveykit.intake.params import load
from surveykit.intake.params.schema import campaign_schema

PAYLOADS = (
    "<script>window.canary=1</script><img src=x onerror=window.canary=1>",
    "=HYPERLINK(\"http://x\";\"<b onclick=window.canary=1>\")",
    "{{7*7}}{%print(7)%}{canary!r}%(canary)s$canary",
    "x\"; __import__('os').system('touch CANARY'); y='",
    "'''\"\"\" + open('CANARY','w').write('') + '''\"\"\"\\",
    "%run CANARY", "!touch CANARY", "@x\u2028", "a\n!touch CANARY\n%system touch CANARY",
    "\\u000a!touch CANARY", "?x", "x?", "\t=1+1", "`touch CANARY`", "$(touch CANARY)",
    "&lt;script&gt;&#60;svg onload=window.canary=1&#62;", "]]><svg onload=window.canary=1>",
    "javascript:window.canary=1", "\x00", "\ud800", "a" * 3000,
)
Path = tuple[str | int, ...]


def full_campaign() -> dict[str, Any]:
    """Return a campaign with its kit inside it, one entry of every kind of key filled."""
    kit = deepcopy(small_survey.KIT)
    return {
        "format": 1, "campaign": "yard", "title": "Yard", "date": small_survey.DAY,
        "site": {**small_survey.SITE, "walls": {"temperature_degC": {"value": 20, "u": 5}}},
        "instruments": {"pair": {**kit["pair"], "serial": "S-1"}, "thermal": kit["thermal"]},
        "data_folder": "data", "field_sheet": "sheet.csv", "watch": {"offset_s": 0, "u_s": 0},
        "loggers": {"pair": {"files": ["pair_*.csv"], "clock": {"offset_s": 0, "u_s": 0}}},
        "surfaces": {name: {
            "label": name, "emissivity": {"value": 0.95, "u": 0.01, "source": "invented"},
            "emissivity_broadband": {"value": 0.95, "u": 0.01, "source": "invented"},
            "around": {"albedo": 0.16, "u": 0.03}} for name in ("court", "lawn")},
        "conditions": {"sky": "clear", "rain_48h_mm": 0}, "settings": {},
        "comparison": {"control": "court"}, "crew": ["AB"], "notes": "A day.",
        "interventions": [{"date": "2025-06-01", "surface": "court", "text": "Swept."}],
    }


def text_places(document: dict[str, Any]) -> list[Path]:
    """Return every place where the schema allows a text: what the document holds and what not."""
    schema = campaign_schema()
    found = dict.fromkeys(_walk(schema, schema, document, ()))
    return [*found]


def put(document: dict[str, Any], place: Path, value: Any) -> dict[str, Any]:
    """Return the document with the value at a place, what lies between made where absent."""
    changed = deepcopy(document)
    inner: Any = changed
    for step, after in zip(place[:-1], place[1:], strict=True):
        below = inner[step] if isinstance(inner, list) else inner.get(step)
        if not isinstance(below, dict | list):
            inner[step] = [None] if isinstance(after, int) else {}
        inner = inner[step]
    inner[place[-1]] = value
    return changed


def _walk(whole: dict[str, Any], node: dict[str, Any], held: Any, here: Path,
          depth: int = 0) -> Iterator[Path]:
    if depth > 12:
        return
    if "$ref" in node:
        target: Any = whole
        for step in node["$ref"].removeprefix("#/").split("/"):
            target = target[step]
        yield from _walk(whole, target, held, here, depth + 1)
    for kind in ("anyOf", "oneOf", "allOf"):
        for branch in node.get(kind, ()):
            yield from _walk(whole, branch, held, here, depth + 1)
    if node.get("type") == "string" or "enum" in node or isinstance(node.get("const"), str):
        yield here
    for name, inner in node.get("properties", {}).items():
        below = held.get(name) if isinstance(held, dict) else None
        yield from _walk(whole, inner, below, (*here, name), depth + 1)
    for free in (node.get("additionalProperties"), *node.get("patternProperties", {}).values()):
        if isinstance(free, dict):
            names = [*held] if isinstance(held, dict) and held else ["entry"]
            below = held[names[0]] if isinstance(held, dict) and held else None
            yield from _walk(whole, free, below, (*here, names[0]), depth + 1)
    if isinstance(node.get("items"), dict):
        below = held[0] if isinstance(held, list) and held else None
        yield from _walk(whole, node["items"], below, (*here, 0), depth + 1)


def read_document(document: dict[str, Any], path: File) -> None:
    """Write a campaign's file and read it as any file is read; InputError if it is refused."""
    path.write_text(yaml.safe_dump(document, sort_keys=False), encoding="utf-8")
    load(path)
