"""The evidence behind clocks that were found, as frames for figure and reader."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd

from surveykit.intake.clocks.clock import Clock
from surveykit.intake.records import NS

EVENTS = ("logger", "reference", "status", "cover", "edge", "time_utc", "offset_s", "fitted_s",
          "residual_s", "u_s")
LAGS = ("logger", "reference", "status", "lag_s", "r", "found_s", "peak", "second")


def frames(clocks: Sequence[Clock]) -> dict[str, pd.DataFrame]:
    """Return the frames `events` (edges of covers) and `lags` (correlation curves).

    `offset_s` is reference time minus logger's time at an edge, `fitted_s` the line there and
    `residual_s` what is left; `found_s` is the lag at the peak.
    """
    events, lags = [], []
    for clock in clocks:
        reference = clock.reference.logger if clock.reference else "the field sheet"
        base = (clock.logger, reference, clock.status)
        for event in clock.events:
            offset = (event.reference_ns - event.log_ns) / NS
            events.append((*base, event.cover + 1, event.edge, event.reference_ns, offset,
                           offset - event.residual_s, event.residual_s, event.u_s))
        if clock.lag is not None and clock.lag.r.size:
            lag = clock.lag
            lags += [(*base, s, r, lag.lag_s, lag.peak, lag.second)
                     for s, r in zip(lag.lags_s.tolist(), lag.r.tolist(), strict=True)]
    found = pd.DataFrame(events, columns=list(EVENTS))
    found["time_utc"] = pd.to_datetime(found["time_utc"].astype(np.int64), utc=True)
    return {"events": found, "lags": pd.DataFrame(lags, columns=list(LAGS))}
