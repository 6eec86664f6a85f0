"""The checks on measured days: nothing is found on a good one, swapped heads are.

Data: SURFRAD network (NOAA), station Alamosa CO, 1 January 2016, one-minute means
(tests/data/valley-winter-day/SOURCE.txt): albedo .176, ground 10 K above the air at noon.
"""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest
from small_survey import read

DATA = Path(__file__).resolve().parents[1] / "data" / "valley-winter-day"
HERE = "tests/data/valley-winter-day"


def survey(root, *swapped):
    """Copy the day into a project; exchange the quantities of two of its columns."""
    shutil.copytree(DATA, root / HERE)
    for folder in ("params", "notebooks"):
        (root / folder).mkdir()
    kit = root / HERE / "instruments.yml"
    text = kit.read_text(encoding="utf-8")
    if swapped:
        one, other = swapped
        text = text.replace(one, "*").replace(other, one).replace("*", other)
    kit.write_text(text, encoding="utf-8")
    return read(root / HERE / "valley-winter-day.yml").quality()


def test_a_good_day_passes_every_check(tmp_path):
    quality = survey(tmp_path)
    assert quality.checks.empty
    assert all(not chosen.refusal and not chosen.flags for chosen in quality.passes.values())
    used = quality.ledger[quality.ledger.disposition == "used"]
    assert used.records.sum() == 121


def test_swapped_shortwave_heads_are_refused(tmp_path):
    quality = survey(tmp_path, "quantity: shortwave_down", "quantity: shortwave_up")
    refused = [chosen.refusal for name, chosen in quality.passes.items() if "albedo" in name]
    assert refused
    assert all("100 % of the records: check which column is shortwave_up" in why
               for why in refused)


def test_swapped_longwave_heads_are_refused(tmp_path):
    quality = survey(tmp_path, "quantity: longwave_down", "quantity: longwave_up")
    refused = [chosen.refusal for name, chosen in quality.passes.items() if "longwave" in name]
    assert refused
    assert all("longwave against air" in why for why in refused)


@pytest.mark.parametrize("column", ["ghi", "uw_solar", "dw_ir", "uw_ir", "temp_air"])
def test_every_channel_of_the_day_is_accounted_for(tmp_path, column):
    """1440 lines below the file's header."""
    rows = survey(tmp_path).waterfall
    assert rows[rows.column == column].records.sum() == 1440
