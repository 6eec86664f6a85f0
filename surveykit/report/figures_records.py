"""Figures of how the numbers came about: the day, the record ledger, the shares of variance."""

from __future__ import annotations

from collections.abc import Mapping

import matplotlib.dates as mdates
import numpy as np
import pandas as pd
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from . import wording as w
from .style import (
    HATCHES,
    INK,
    MUTED,
    PALETTE,
    PAPER,
    Drawing,
    clock_axis,
    dress,
    of_each,
    panels,
    shorten,
    styled,
)

Labels = Mapping[str, str] | None
TRACKS = (("irradiance_w_m2", "irradiance", "W m⁻²"), ("zenith_deg", "sun height", "°"),
          ("air_temperature_degc", "air temperature", "°C"),
          ("body_temperature_degc", "body temperature", "°C"))
POINTS, FEW, MANY = 600, 40, 6
LOGGED, USED, LOSSES = "logged", "used", 4


@styled
def day_timeline(passes: pd.DataFrame, sky: pd.DataFrame | None = None,
                 weather: pd.DataFrame | None = None, time_zone: str = "UTC",
                 labels: Labels = None, excluded: pd.DataFrame | None = None) -> Drawing:
    """Draw the passes as bars by surface over irradiance, sun height, air and body temperature.

    Parameters
    ----------
    passes : DataFrame
        Table `passes`; a cross stands over one that could not be evaluated.
    sky, weather : DataFrame, optional
        `time_utc` with `irradiance_w_m2` and `zenith_deg` [deg]; with `air_temperature_degc`.
    time_zone : str
        IANA name of the zone of the time axis.
    excluded : DataFrame, optional
        `start_utc`, `stop_utc` and `reason` of stretches whose records were left out.
    """
    if passes.empty:
        return Drawing(None, "No pass could be matched with records, so there is no day to draw.")
    first, last = passes["start_utc"].min(), passes["stop_utc"].max()
    margin = max(0.04 * (last - first), pd.Timedelta(minutes=5))
    window = (first - margin, last + margin)
    tracks = [(_thinned(frame, column, window), name, unit) for column, name, unit in TRACKS
              for frame in (sky, weather) if frame is not None and column in frame
              and frame.loc[frame["time_utc"].between(*window), column].notna().any()]
    names = list(dict.fromkeys(passes["surface"]))[::-1]
    figure, axes = panels([0.75 + 0.36 * len(names), *[0.9] * len(tracks)],
                          sharex=True)
    families = w.families(passes)
    lane = 0.76 / len(families)  # a quantity keeps its lane in each surface's row
    for place, (pair, block) in enumerate(families):
        rows = block["surface"].map(names.index).to_numpy(float)
        rows += 0.38 - lane * (place + 0.5)
        start, stop = (mdates.date2num(block[end]) for end in ("start_utc", "stop_utc"))
        axes[0].barh(rows, stop - start, left=start, height=0.9 * lane, color=PALETTE[place % 8],
                     linewidth=0, label=w.quantity_text(*pair))
        gone = (block["status"] == "not evaluated").to_numpy(bool)
        axes[0].plot(((start + stop) / 2)[gone], rows[gone], "x", color=INK, markersize=4.5)
    axes[0].set_yticks(range(len(names)), [shorten(w.label(n, labels)) for n in names])
    axes[0].set_ylim(-0.6, len(names) - 0.4)
    figure.legend(*axes[0].get_legend_handles_labels(), loc="outside upper left", ncols=2,
                  borderaxespad=0, handlelength=1.4)
    axes[0].set_xlim(*mdates.date2num(window))
    spans = []
    for axis, ((when, what), name, unit) in zip(axes[1:], tracks, strict=True):
        axis.plot(when, what, color=INK, linewidth=1.1,
                  marker="o" if len(what) <= FEW else None, markersize=3)
        dress(axis, f"{w.sentence_case(name)[:-1]}, {unit}", grid="x", plain=True)
        spans.append(f"{name} from {w.figures(what.min(), 3)} to {w.figures(what.max(), 3)} {unit}")
    dress(axes[0], grid="x")
    for axis in axes:
        axis.tick_params(axis="y", length=2)
    reasons = _stretches(axes[0], excluded, window)
    clock_axis(axes[-1], time_zone)
    begin, end = (f"{time.tz_convert(time_zone):%H:%M}" for time in (first, last))
    unused = int((passes["status"] == "not evaluated").sum())
    alt = (f"{w.plural(len(passes), 'pass', 'passes')} on {w.plural(len(names), 'surface')} from "
           f"{begin} to {end} ({time_zone})" + "".join(f"; {span}" for span in spans) + ".")
    if unused:
        alt += f" {w.plural(unused, 'pass', 'passes')} could not be evaluated."
    alt += f" Left out: {reasons}." if reasons else ""
    return Drawing(figure, alt, "The day: passes by surface" + (
        " over " + w.listing(name for _, name, _ in tracks) if tracks else "") + (
        "; a cross marks one that could not be evaluated" if unused else "") + (
        f". Grey stretches were left out: {reasons}." if reasons else "."))


def _stretches(axis: Axes, excluded: pd.DataFrame | None,
               window: tuple[pd.Timestamp, pd.Timestamp]) -> str:
    """Shade what was left out inside the window; return the reasons with their counts."""
    if excluded is None or excluded.empty:
        return ""
    inside = excluded[(excluded["stop_utc"] > window[0]) & (excluded["start_utc"] < window[1])]
    for start, stop in zip(inside["start_utc"], inside["stop_utc"], strict=True):
        axis.axvspan(mdates.date2num(start), mdates.date2num(stop), color=MUTED, alpha=0.3,
                     linewidth=0, zorder=0)
    counts = inside["reason"].value_counts(sort=False)
    return w.listing(f"{reason} ({w.plural(int(n), 'stretch', 'stretches')})"
                     for reason, n in counts.items()) if len(inside) else ""


@styled
def ledger_plot(ledger: pd.DataFrame) -> Drawing:
    """Draw for each logger the way from its logged records to those used, loss by loss."""
    if ledger.empty or not ledger["records"].sum():
        return Drawing(None, "No record was logged, so there is no ledger to draw.")
    ways = {str(logger): _losses(block) for logger, block in ledger.groupby("logger")}
    figure, axes = panels([0.4 + 0.18 * len(way) for way in ways.values()],
                          sharex=True)
    told = []
    for axis, (logger, way) in zip(axes, ways.items(), strict=True):
        total = left = way[LOGGED]
        for y, (word, n) in enumerate(way.items()):
            whole = word in (LOGGED, USED)
            start, left = (0, left) if whole else (left - n, left - n)
            axis.barh(-y, 100 * n / total, left=100 * start / total, height=0.72, linewidth=0.6,
                      color=PALETTE[0] if whole else PAPER, edgecolor=INK if not whole else PAPER,
                      hatch="" if whole else HATCHES[1])
            axis.text(100 * (start + n) / total + 1, -y, w.count(n), va="center", fontsize=8)
        axis.set_yticks(-np.arange(len(way)), [*way], fontsize=8.5)
        axis.set_xlim(0, 112)
        axis.set_xticks(range(0, 101, 20))
        axis.tick_params(axis="y", length=0)
        dress(axis, logger, grid="", left=True)
        told.append(f"{logger}: {w.plural(total, 'record')}, " + w.listing(
            f"{w.percent(n / total)} {word}" for word, n in way.items() if word != LOGGED) + ".")
    axes[-1].set_xlabel("Share of a logger’s records, %")
    return Drawing(figure, " ".join(told), "From the records of each logger to those used: hatched "
                   "bars are what is left out, each record once, by its first reason.")


def _losses(block: pd.DataFrame) -> dict[str, int]:
    """Records logged, outside passes, left out by reason (the largest first), and used."""
    total = int(block["records"].sum())
    outside = int(block.loc[block["disposition"] == "outside passes", "records"].sum())
    reasons = block[block["disposition"] == "excluded"].groupby("reason")["records"].sum()
    reasons = reasons[reasons > 0].sort_values(ascending=False, kind="stable")
    kept, rest = reasons.iloc[:LOSSES], int(reasons.iloc[LOSSES:].sum())
    way = {LOGGED: total, "outside passes": outside} | {str(k): int(n) for k, n in kept.items()}
    way |= {"other reasons": rest, USED: total - outside - int(reasons.sum())}
    return {word: n for word, n in way.items() if n or word in (LOGGED, USED)}


def budget_plot(budget: pd.DataFrame, labels: Labels = None) -> tuple[Drawing, ...]:
    """Return one plot of variance shares a quantity of the table `budget`."""
    return of_each(budget, lambda quantity: _budget_of(budget, quantity, labels),
                   "No uncertainty budget could be drawn up, so there are no shares to draw.")


@styled
def _budget_of(budget: pd.DataFrame, quantity: str, labels: Labels) -> Drawing:
    """Draw for each surface and kind of one quantity the shares of variance by source."""
    known = budget[(budget["quantity"] == quantity) & budget["share"].notna()]
    if known.empty:
        return Drawing(None, f"No uncertainty budget of {w.inside_sentence(quantity)} could be "
                             "drawn up, so there are no shares to draw.")
    known = known.assign(row=known[["kind", "surface"]].apply(tuple, axis="columns"))
    shares = known.pivot_table(index="row", columns="source", values="share", aggfunc="sum",
                               fill_value=0.0, sort=False)
    order = [(kind, name) for (_, kind), block in w.families(known)
             for name in dict.fromkeys(block["surface"])]
    ranked = shares.sum().sort_values(ascending=False, kind="stable").index
    shares = shares.reindex(order)[ranked]
    if len(ranked) > MANY + 1:
        rest = shares.iloc[:, MANY:].sum(axis="columns")
        shares = shares.iloc[:, :MANY].assign(**{"other sources": rest})
    names = [shorten(w.label(name, labels)) + (f"\n{kind}" if kind else "")
             for kind, name in order]
    told = [f"{w.label(name, labels)}{f' ({kind})' if kind else ''} "
            f"{w.percent(row.max())} {row.idxmax()}"
            for (kind, name), (_, row) in zip(order, shares.iterrows(), strict=True)]
    return Drawing(_stack(shares, names, "Share of variance, %"),
                   f"{w.quantity_text(quantity)}, largest source of variance: {'; '.join(told)}.",
                   f"Where the uncertainty of {w.inside_sentence(quantity)} comes from: shares of "
                   "variance by source.")


def _stack(shares: pd.DataFrame, names: list[str], title: str) -> Figure:
    wide = max(len(str(key)) for key in shares) > 25
    lines = sum(1 + (len(str(key)) > 40) for key in shares)
    figure, (axis,) = panels([0.75 + 0.19 * (lines if wide else (lines + 1) // 2)
                                 + 0.44 * len(shares)])
    left = np.zeros(len(shares))
    rows = np.arange(len(shares))[::-1]
    for place, key in enumerate(shares):
        part = 100 * shares[key].to_numpy(float)
        axis.barh(rows, part, left=left, height=0.66, color=PALETTE[place % 8], edgecolor=PAPER,
                  linewidth=0.8, hatch=HATCHES[place % 8], label=shorten(str(key), 40))
        for y, start, size in zip(rows, left, part, strict=True):
            if size >= 12:
                axis.text(start + size / 2, y, f"{size:.0f}", ha="center", va="center",
                          fontsize=8.5, color=INK,
                          bbox={"facecolor": PAPER, "edgecolor": "none", "pad": 1.2})
        left += part
    axis.set_yticks(rows, names, fontsize=8.5, linespacing=1.2)
    axis.set_xlim(0, 100)
    axis.set_ylim(-0.5, len(shares) - 0.5)
    axis.set_xlabel(title)
    axis.tick_params(axis="y", length=0)
    figure.legend(loc="outside upper left", ncols=1 if wide else 2, handlelength=1.6,
                  columnspacing=1.2, borderaxespad=0)
    dress(axis, grid="", left=True)
    return figure


def _thinned(frame: pd.DataFrame, column: str,
             window: tuple[pd.Timestamp, pd.Timestamp]) -> tuple[np.ndarray, np.ndarray]:
    """Means over at most POINTS stretches of time; zenith becomes height above the horizon."""
    inside = frame["time_utc"].between(*window)
    known = frame.loc[inside, ["time_utc", column]].dropna().sort_values("time_utc")
    if len(known) > POINTS:
        time = known["time_utc"].dt.as_unit("ns").astype("int64")
        stretch = (time - time.iloc[0]) * POINTS // max(int(time.iloc[-1] - time.iloc[0]), 1)
        known = known.groupby(stretch.to_numpy()).mean()
    values = known[column].to_numpy(float)
    return (mdates.date2num(known["time_utc"].to_numpy()),
            90 - values if column == "zenith_deg" else values)
