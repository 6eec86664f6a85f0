"""Published and computed check values of tests/data/check_values.json, by name."""

from __future__ import annotations

import json
from functools import cache
from pathlib import Path
from typing import Any, NamedTuple

DATA = Path(__file__).parent / "data"


class Check(NamedTuple):
    """One check: what goes in, what must come out, how near, and who says so."""

    input: dict[str, Any]
    expected: Any
    tol: float
    source: str


@cache
def _checks() -> dict[str, Check]:
    held = json.loads((DATA / "check_values.json").read_text(encoding="utf-8"))["checks"]
    return {item["id"]: Check(item["input"], item["expected"], item["tol"], item["source"])
            for item in held}


def check(name: str) -> Check:
    """Return the check `name`; its tolerance is absolute."""
    return _checks()[name]


def names(prefix: str) -> list[str]:
    """Return the names of the checks that begin with `prefix`, for parametrized tests."""
    found = [name for name in _checks() if name.startswith(prefix)]
    assert found, f"no check begins with {prefix!r}"
    return found
