"""Surveys of one pass for the tests of this folder, and its estimate."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from small_survey import ALBEDO, DAY, KIT, STAND_OFF, lines, row, small

from surveykit.core import Input
from surveykit.evidence.estimates import PassEstimate

DAY_SCOPE = f"yard-{DAY}"
HEADS = ("rednir-sky", "rednir-ground")
WEATHER = {"weather": lines("weather", n=5, step_s=60)}


UNTOUCHED = {"albedo": {"correct_surroundings": False, "correct_self_shade": False}}


def changed(logger: str, **entry: Any) -> dict[str, Any]:
    return KIT | {logger: {k: v for k, v in (KIT[logger] | entry).items() if v is not None}}


def changed_column(logger: str, column: str, **more: Any) -> dict[str, Any]:
    columns = KIT[logger]["columns"]
    return changed(logger, columns=columns | {column: columns[column] | more})


def made(root: Path, cells: dict[str, str], *loggers: str,
         logs: dict[str, list[str]] | None = None, **more: Any) -> PassEstimate:
    """Return the one estimate of a survey with one pass."""
    logs = {name: lines(name) for name in loggers} | (logs or {})
    (one,) = small(root, [row(**cells)], logs, **more).estimates()
    return one


def albedo(root: Path, cells: dict[str, str] = ALBEDO, **more: Any) -> PassEstimate:
    return made(root, cells, "pair", **more)


def stand_off(root: Path, cells: dict[str, str] = STAND_OFF,
              logs: dict[str, list[str]] = WEATHER, **more: Any) -> PassEstimate:
    return made(root, cells, "thermal", logs=logs, **more)


def inputs(estimate: PassEstimate) -> dict[str, Input]:
    return {i.name: i for i in estimate.inputs}
