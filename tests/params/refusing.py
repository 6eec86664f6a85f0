"""A parameter file or kit with one thing wrong: refused by one sentence, and its mended twin."""

from __future__ import annotations

import pytest

from surveykit.core import InputError
from surveykit.intake.params import load


def refused(path):
    with pytest.raises(InputError) as caught:
        load(path)
    return caught.value.faults


def loads(path):
    return load(path).campaign.campaign == "mill-yard-2025-07-24"


def refused_once(path, begin, pieces):
    """Hold a file to be refused by one sentence that begins so and holds the pieces."""
    faults = refused(path)
    assert len(faults) == 1, faults
    assert faults[0].startswith(begin)
    for piece in pieces:
        assert piece in faults[0]
