"""Figures of the way to a value: correction steps, values over the dates."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import matplotlib.dates as mdates
import numpy as np
import pandas as pd

from . import wording as w
from .figures_results import surface_rows
from .style import (
    INK,
    MARKERS,
    MUTED,
    PALETTE,
    Drawing,
    dress,
    kinds,
    of_each,
    panels,
    shorten,
    styled,
)

Labels = Mapping[str, str] | None
RAW = "raw"


def correction_plots(corrections: pd.DataFrame, labels: Labels = None) -> tuple[Drawing, ...]:
    """Return for each quantity one plot of the table `corrections`, from raw to final value."""
    return of_each(corrections, lambda quantity: _correction_plot(corrections, quantity, labels),
                   "No pass has a value, so there are no corrections to draw.")


@styled
def _correction_plot(corrections: pd.DataFrame, quantity: str, labels: Labels) -> Drawing:
    """Draw by surface how far each correction step takes the mean of its passes from raw."""
    families = kinds(corrections.dropna(subset=["value"]), quantity)
    if not families:
        return Drawing(None, f"No pass has a value of {w.inside_sentence(quantity)}, so there are "
                             "no corrections to draw.")
    steps = [s for s in dict.fromkeys(corrections.loc[corrections["quantity"] == quantity, "step"])
             if s != RAW]
    figure, axes = panels([0.7 + 0.34 * b["surface"].nunique() for _, b in families])
    findings, drawn = [], set()
    for axis, (kind, block) in zip(axes, families, strict=True):
        own = [block["surface"], block["pass"]]
        raw = block["value"].where(block["step"] == RAW).groupby(own).transform("first")
        shifts = block.assign(shift=block["value"] - raw).pivot_table(
            index="surface", columns="step", values="shift", sort=False).iloc[::-1]
        surface_rows(axis, [w.label(name, labels) for name in shifts.index])
        axis.axvline(0, color=MUTED, linewidth=0.9)
        for place, step in enumerate(steps):
            if step in shifts:
                known = shifts[step].dropna()
                axis.plot(known, np.flatnonzero(shifts[step].notna()), linestyle="",
                          marker=MARKERS[place % 8], color=PALETTE[place % 8], markersize=6.5,
                          label=f"after {step}" if step not in drawn else None)
                drawn.add(step)
        if len(families) > 1:
            axis.set_title(w.quantity_text(quantity, kind))
        first, last = (block["value"].groupby(own, sort=False).agg(end).groupby(
            "surface", sort=False).mean() for end in ("first", "last"))
        told = [f"{w.label(str(name), labels)} {w.number(start, w.places(quantity))} to "
                + w.with_unit(w.number(end, w.places(quantity)), block["unit"].iloc[0])
                for (name, start), end in zip(first.items(), last, strict=True)]
        findings.append(f"{w.quantity_text(quantity, kind)}, from raw to final: "
                        f"{w.listing(told)}.")
    axes[-1].set_xlabel(w.heading("Shift from the raw mean", "", w.difference_unit(quantity)))
    figure.legend(loc="outside upper left", ncols=1, handlelength=1.2, borderaxespad=0)
    return Drawing(figure, " ".join(findings),
                   f"What the corrections did to {w.inside_sentence(quantity)}: mean over the "
                   "passes of a surface, after each step less the raw value (the line at 0).")


def series_plots(series: pd.DataFrame, labels: Labels = None,
                 interventions: Sequence[Mapping[str, str]] = ()) -> tuple[Drawing, ...]:
    """Return for each quantity one plot of its values over the dates of several campaigns.

    `series` is the table `surfaces` of all of them with a column `date` (ISO text);
    `interventions` have `date`, `surface` and `text`. One date gives none: there is no course to
    draw.
    """
    if series.empty or series["date"].nunique() < 2:
        return ()
    quantities = dict.fromkeys(quantity for (quantity, _), _ in w.families(series))
    return tuple(_series_plot(series, quantity, labels, interventions) for quantity in quantities)


@styled
def _series_plot(series: pd.DataFrame, quantity: str, labels: Labels,
                 interventions: Sequence[Mapping[str, str]]) -> Drawing:
    families = kinds(series.dropna(subset=["value"]), quantity)
    if not families:
        return Drawing(None, f"No {w.inside_sentence(quantity)} could be evaluated on any date.")
    names = [*dict.fromkeys(name for _, block in families for name in block["surface"])]
    dates = sorted({*series["date"]})
    figure, axes = panels([1.7 + 0.45 * (len(names) + 1) // 2 / len(families)]
                          * len(families), sharex=True)
    days = {date: float(mdates.datestr2num(date)) for date in dates}
    step = (max(days.values()) - min(days.values())) / 60  # surfaces stand side by side
    done = [f"{w.date_text(one['date'])}, {w.label(one['surface'], labels)}: {one['text']}"
            for one in interventions]
    told, drawn = [], set()
    for axis, (kind, block) in zip(axes, families, strict=True):
        for place, name in enumerate(names):
            rows = block[block["surface"] == name].sort_values("date")
            if rows.empty:
                continue
            colour, marker = PALETTE[place % 8], MARKERS[place % 8]
            x = rows["date"].map(days).to_numpy(float) + (place - (len(names) - 1) / 2) * step
            axis.plot(x, rows["value"], marker=marker, color=colour, linewidth=0.8, markersize=5,
                      label=shorten(w.label(name, labels), 26) if name not in drawn else None)
            drawn.add(name)
            axis.vlines(x, rows["lower"], rows["upper"], color=colour, linewidth=1.3)
            what = f"{w.quantity_text(quantity, kind)} of {w.label(name, labels)} "
            told.append(what + ", ".join(
                w.with_unit(w.interval(r["value"], r["lower"], r["upper"], w.places(quantity)),
                            r["unit"]) + f" on {w.date_text(r['date'])}"
                for r in rows.to_dict("records")))
        for one in interventions:
            axis.axvline(float(mdates.datestr2num(one["date"])), color=MUTED, linestyle=":")
        dress(axis, w.quantity_text(quantity, kind),
              w.unit_text(block["unit"].iloc[0]) or w.quantity_text(quantity))
    years = {date[:4] for date in dates}
    days_of = [w.date_text(date).rpartition(" ") for date in dates]
    axes[-1].set_xticks([days[date] for date in dates],
                        [day if len(years) == 1 else f"{day}\n{year}" for day, _, year in days_of],
                        color=INK)
    axes[-1].set_xlabel(f"Date in {dates[0][:4]}" if len(years) == 1 else "Date")
    figure.legend(loc="outside upper left", ncols=2, handlelength=1.8, borderaxespad=0)
    dotted = f" Dotted: {'; '.join(done)}." if done else ""
    return Drawing(figure, "; ".join(told) + "." + dotted,
                   f"{w.quantity_text(quantity)} over the dates, values as they were measured with "
                   "their intervals: weather differs between dates, so read changes from the table "
                   f"below, not here.{dotted}")
