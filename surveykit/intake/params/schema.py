"""The published JSON Schemas, generated from the models."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from pydantic import TypeAdapter
from pydantic.json_schema import GenerateJsonSchema

from surveykit.intake.params.campaign import Campaign, Kit

DIALECT = "https://json-schema.org/draft/2020-12/schema"


class _Untitled(GenerateJsonSchema):
    def field_title_should_be_set(self, schema: Any) -> bool:
        return False


def campaign_schema() -> dict[str, Any]:
    """Return the JSON Schema of a campaign's parameter file."""
    return _finish(Campaign.model_json_schema(schema_generator=_Untitled),
                   "Parameter file of a campaign")


def instruments_schema() -> dict[str, Any]:
    """Return the JSON Schema of an instruments file."""
    return _finish(TypeAdapter(Kit).json_schema(schema_generator=_Untitled), "Kit of instruments")


def write_schemas(folder: Path) -> None:
    """Write campaign.schema.json and instruments.schema.json into `folder`."""
    for name, schema in (("campaign", campaign_schema()), ("instruments", instruments_schema())):
        text = json.dumps(schema, indent=1, ensure_ascii=False, sort_keys=True) + "\n"
        (Path(folder) / f"{name}.schema.json").write_text(text, encoding="utf-8", newline="\n")


def _finish(schema: dict[str, Any], title: str) -> dict[str, Any]:
    _tidy(schema)
    return {"$schema": DIALECT, **schema, "title": title}


def _tidy(node: Any) -> None:
    # What to write goes into the description, which editors show; names of keys are the keys'.
    if isinstance(node, list):
        for child in node:
            _tidy(child)
    if not isinstance(node, dict):
        return
    if "write" in node and isinstance(node["write"], str):
        node["description"] = f"{node.get('description', '')} Write {node.pop('write')}.".strip()
    if node.get("default", ...) is None:
        del node["default"]
    if "patternProperties" in node:
        node["additionalProperties"] = False
    for child in list(node.values()):
        _tidy(child)
