"""Reading a log costs little more than pandas' own reader with dates, for the same values."""

from __future__ import annotations

import statistics
import time

import numpy as np
import pandas as pd
import pytest
from invented import THERMAL, instrument
from numpy.testing import assert_allclose, assert_array_equal

from surveykit.intake.loggers import read_logger

ROWS = 300_000
MOST = 1.3  # of bare pandas.read_csv with dates; this test allows twice that on a busy machine


@pytest.mark.slow
def test_reading_costs_at_most_a_third_more_than_bare_pandas(tmp_path):
    rng = np.random.default_rng(1)
    times = pd.date_range("2025-07-24T08:00", periods=ROWS, freq="200ms")
    frame = pd.DataFrame({"time": times.strftime("%Y-%m-%dT%H:%M:%S.%f").str[:-3]})
    for name, level in (("target", 40), ("body", 30), ("battery", 12)):
        frame[name] = np.round(level + rng.normal(size=ROWS), 2)
    path = tmp_path / "big.csv"
    frame.to_csv(path, index=False)
    bare, ours = [], []
    for _ in range(5):
        start = time.perf_counter()
        plain = pd.read_csv(path, parse_dates=["time"])
        bare.append(time.perf_counter() - start)
        start = time.perf_counter()
        records = read_logger("thermal", instrument(THERMAL), [path], tmp_path)
        ours.append(time.perf_counter() - start)
    assert_allclose(records.channels["target"], plain["target"] + 273.15, rtol=1e-12)
    assert_array_equal(records.time_ns, plain["time"].dt.as_unit("ns").astype("int64"))
    ratio = statistics.median(ours) / statistics.median(bare)
    assert ratio <= 2 * MOST, f"{ratio:.2f} of bare pandas"
