"""The figure of clocks: what it says of covers and of a correlation, and of none."""

from __future__ import annotations

import numpy as np
import pandas as pd

from surveykit.intake.clocks.evidence import EVENTS, LAGS
from surveykit.report.figures import clock_plots
from surveykit.report.style import png

TIMES = pd.to_datetime(["2025-06-11T11:00:00Z", "2025-06-11T11:00:10Z", "2025-06-11T13:00:00Z",
                        "2025-06-11T13:00:11Z"])


def events(status="ok"):
    return pd.DataFrame({
        "logger": "thermal", "reference": "the field sheet", "status": status,
        "cover": [1, 1, 2, 2], "edge": ["covered", "uncovered"] * 2, "time_utc": TIMES,
        "offset_s": [12.1, 11.8, 12.4, 12.6], "fitted_s": [12.0, 12.0, 12.5, 12.5],
        "residual_s": [0.1, -0.2, -0.1, 0.1], "u_s": 0.4})[list(EVENTS)]


def lags(status="ok"):
    lag_s = np.arange(-120.0, 121.0)
    return pd.DataFrame({
        "logger": "rednir-ground", "reference": "rednir-sky", "status": status, "lag_s": lag_s,
        "r": 0.1 * np.cos(lag_s) + 0.5 * (lag_s == -57), "found_s": -57.2, "peak": 0.58,
        "second": 0.1})[list(LAGS)]


def test_covers_are_told_with_their_numbers():
    (one,) = clock_plots(events(), lags().iloc[:0], "Europe/Lisbon")
    assert one.alt == ("thermal: 4 edges of 2 covers give offsets from +11.8 to +12.6 s against "
                       "the field sheet; after the line at most 0.20 s is left.")
    assert png(one.figure) == png(clock_plots(events(), lags().iloc[:0],
                                              "Europe/Lisbon")[0].figure)


def test_a_correlation_is_told_with_its_peaks():
    one, two = clock_plots(events("refused"), lags("refused"))
    assert one.alt.endswith("The clock was refused.")
    assert "peaks at 0.58 with −57.2 s added; the second peak is 0.10" in two.alt
    assert two.alt.endswith("The clock was refused.")
    assert len(png(two.figure)) > 1000


def test_without_evidence_a_sentence_stands_in():
    (one,) = clock_plots(events().iloc[:0], lags().iloc[:0])
    assert one.figure is None
    assert "each was stated" in one.alt
