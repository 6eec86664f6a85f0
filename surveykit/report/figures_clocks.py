"""Figure of the clocks that were found: covers before and after, and what correlated."""

from __future__ import annotations

import matplotlib.dates as mdates
import numpy as np
import pandas as pd

from . import wording as w
from .style import INK, MARKERS, MUTED, PALETTE, Drawing, clock_axis, dress, panels, styled

EDGES = ("covered", "uncovered")


def clock_plots(events: pd.DataFrame, lags: pd.DataFrame,
                time_zone: str = "UTC") -> tuple[Drawing, ...]:
    """Return one drawing for each clock that was found, or tried, from the records.

    Parameters
    ----------
    events : DataFrame
        Edges of covers: logger, reference, status, edge, time_utc, offset_s, fitted_s,
        residual_s, u_s.
    lags : DataFrame
        Correlation curves: logger, reference, status, lag_s, r, found_s, peak, second.
    time_zone : str
        IANA name of the zone of the time axis.
    """
    names = dict.fromkeys([*events["logger"], *lags["logger"]])
    drawings = []
    for name in names:
        edges, curve = events[events["logger"] == name], lags[lags["logger"] == name]
        if not edges.empty:
            drawings.append(_covers(name, edges, time_zone))
        if not curve.empty:
            drawings.append(_correlation(name, curve))
    return tuple(drawings) or (Drawing(None, "No clock was found from the records: each was stated "
                                             "or taken as it was."),)


@styled
def _covers(name: str, edges: pd.DataFrame, time_zone: str) -> Drawing:
    """Draw offsets at the edges of covers with the line, and what is left of them."""
    reference = edges["reference"].iloc[0]
    figure, (before, after) = panels([1.5, 1.5], sharex=True)
    edges = edges.sort_values("time_utc")
    before.plot(mdates.date2num(edges["time_utc"]), edges["fitted_s"], color=MUTED, linewidth=1)
    for place, edge in enumerate(EDGES):
        some = edges[edges["edge"] == edge]
        when = mdates.date2num(some["time_utc"])
        look = {"color": PALETTE[place], "marker": MARKERS[place], "markersize": 5,
                "linestyle": "none", "label": edge}
        before.plot(when, some["offset_s"], **look)
        after.errorbar(when, some["residual_s"], yerr=some["u_s"], elinewidth=1, capsize=2.5,
                       **look)
    after.axhline(0, color=MUTED, linewidth=1)
    figure.legend(*before.get_legend_handles_labels(), loc="outside upper left", ncols=2,
                  handlelength=1.0, borderaxespad=0)
    for axis, title in ((before, f"Before: {reference} minus {name}, s"),
                        (after, "After: what is left, with u of each edge, s")):
        dress(axis, title, plain=True)
        axis.margins(0.06, 0.15)
    clock_axis(after, time_zone)
    low, high = (w.number(edges["offset_s"].agg(f), 1, sign=True) for f in ("min", "max"))
    left = w.number(float(np.abs(edges["residual_s"]).max()), 2)
    fate = " The clock was refused." if edges["status"].iloc[0] == "refused" else ""
    alt = (f"{name}: {w.plural(len(edges), 'edge')} of "
           f"{w.plural(edges['cover'].nunique(), 'cover')} give offsets from {low} to {high} s "
           f"against {reference}; after the line at most {left} s is left.{fate}")
    return Drawing(figure, alt, f"Clock of {name}: seconds to add at each edge of a cover with the "
                                "line through them, and the distance of each edge from it.")


@styled
def _correlation(name: str, curve: pd.DataFrame) -> Drawing:
    """Draw the correlation of two loggers' light over the lag, with its two peaks."""
    one = curve.iloc[0]
    figure, (axis,) = panels([1.9])
    axis.plot(curve["lag_s"], curve["r"], color=INK, linewidth=0.9)
    axis.axvline(one["found_s"], color=PALETTE[0], linewidth=1.1, linestyle="--")
    axis.axhline(one["peak"], color=PALETTE[0], linewidth=1, label="peak")
    axis.axhline(one["second"], color=PALETTE[1], linewidth=1, linestyle=":", label="second peak")
    axis.set_xlabel(f"Seconds added to {name}")
    axis.legend(loc="upper right", handlelength=1.6)
    dress(axis, label="Correlation of changes")
    refused = one["status"] == "refused"
    alt = (f"{name} against {one['reference']}: the correlation of their changes peaks at "
           f"{w.number(one['peak'], 2)} with {w.number(one['found_s'], 1, sign=True)} s added; the "
           f"second peak is {w.number(one['second'], 2)}. The clock was "
           f"{'refused' if refused else 'set by it'}.")
    return Drawing(figure, alt, f"Clock of {name}: correlation of its changes with those of "
                                f"{one['reference']}; a clear single peak sets the clock.")
