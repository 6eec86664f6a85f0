"""Figures of the way to a value: correction steps, values over the dates."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import matplotlib.dates as mdates
import numpy as np
import pandas as pd

from . import wording as w
from .figures_results import _axis, _rows
from .style import INK, MARKERS, MUTED, PALETTE, Drawing, dress, of_each, panels, shorten, styled

Labels = Mapping[str, str] | None
RAW = "raw"


def correction_plots(corrections: pd.DataFrame, labels: Labels = None) -> tuple[Drawing, ...]:
    """Return for each quantity one plot of the table `corrections`, from raw to final value."""
    return of_each(corrections, lambda quantity: _correction_plot(corrections, quantity, labels),
                   "No pass has a value, so there are no corrections to draw.")


@styled
def _correction_plot(corrections: pd.DataFrame, quantity: str, labels: Labels) -> Drawing:
    """Draw by surface how far each correction step takes the mean of its passes from raw."""
    families = [(kind, block.dropna(subset=["value"])) for (name, kind), block
                in w.families(corrections) if name == quantity]
    families = [(kind, block) for kind, block in families if len(block)]
    if not families:
        return Drawing(None, f"No pass has a value of {w.inside_sentence(quantity)}, so there are "
                             "no corrections to draw.")
    steps = [s for s in dict.fromkeys(corrections.loc[corrections["quantity"] == quantity, "step"])
             if s != RAW]
    figure, axes = panels(len(families), [0.7 + 0.34 * b["surface"].nunique() for _, b in families])
    findings, drawn = [], set()
    for axis, (kind, block) in zip(axes, families, strict=True):
        means = block.pivot_table(index="surface", columns="step", values="value", sort=False)
        rows = means.iloc[::-1]
        _rows(axis, [w.label(name, labels) for name in rows.index])
        axis.axvline(0, color=MUTED, linewidth=0.9)
        shift = rows.sub(rows[RAW], axis="index")
        for place, step in enumerate(steps):
            if step in shift:
                known = shift[step].dropna()
                axis.plot(known, np.flatnonzero(shift[step].notna()), linestyle="",
                          marker=MARKERS[place % 8], color=PALETTE[place % 8], markersize=6.5,
                          label=f"after {step}" if step not in drawn else None)
                drawn.add(step)
        if len(families) > 1:
            axis.set_title(w.quantity_text(quantity, kind))
        last = rows.ffill(axis="columns").iloc[:, -1]
        unit = block["unit"].iloc[0]
        told = [f"{w.label(str(name), labels)} {w.number(rows.loc[name, RAW], w.places(quantity))} "
                f"to {w.with_unit(w.number(last[name], w.places(quantity)), unit)}"
                for name in means.index]
        findings.append(f"{w.quantity_text(quantity, kind)}, from raw to final: "
                        f"{w.listing(told)}.")
    unit = w.unit_text("K" if quantity == "temperature" else families[0][1]["unit"].iloc[0])
    axes[-1].set_xlabel(f"Shift from the raw mean{f', {unit}' if unit else ''}")
    figure.legend(loc="outside upper left", ncols=1, handlelength=1.2, borderaxespad=0)
    return Drawing(figure, " ".join(findings),
                   f"What the corrections did to {w.inside_sentence(quantity)}: mean over the "
                   "passes of a surface, after each step less the raw mean (the line at 0).")


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
    known = series[(series["quantity"] == quantity) & series["value"].notna()]
    if known.empty:
        return Drawing(None, f"No {w.inside_sentence(quantity)} could be evaluated on any date.")
    families = [(kind, block) for (_, kind), block in w.families(known)]
    names = list(dict.fromkeys(known["surface"]))
    dates = sorted({*series["date"]})
    figure, axes = panels(len(families), [1.7 + 0.45 * (len(names) + 1) // 2 / len(families)]
                          * len(families), sharex=True)
    days = {date: float(mdates.datestr2num(date)) for date in dates}
    step = (max(days.values()) - min(days.values())) / 60  # surfaces stand side by side
    done = [f"{w.date_text(one['date'])}, {w.label(one['surface'], labels)}: {one['text']}"
            for one in interventions]
    told = []
    for axis, (kind, block) in zip(axes, families, strict=True):
        for place, name in enumerate(names):
            rows = block[block["surface"] == name].sort_values("date")
            if rows.empty:
                continue
            colour, marker = PALETTE[place % 8], MARKERS[place % 8]
            x = rows["date"].map(days).to_numpy(float) + (place - (len(names) - 1) / 2) * step
            axis.plot(x, rows["value"], marker=marker, color=colour, linewidth=0.8, markersize=5,
                      label=shorten(w.label(name, labels), 26) if axis is axes[0] else None)
            axis.vlines(x, rows["lower"], rows["upper"], color=colour, linewidth=1.3)
            what = f"{w.quantity_text(quantity, kind)} of {w.label(name, labels)} "
            told.append(what + ", ".join(
                f"{w.interval(r['value'], r['lower'], r['upper'], w.places(quantity))} "
                f"on {w.date_text(r['date'])}" for r in rows.to_dict("records")))
        for one in interventions:
            axis.axvline(float(mdates.datestr2num(one["date"])), color=MUTED, linestyle=":")
        dress(axis, w.quantity_text(quantity, kind),
              _axis(quantity, block["unit"].iloc[0]).rpartition(", ")[2])
    axes[-1].set_xticks([days[date] for date in dates],
                        [w.date_text(date).rpartition(" ")[0] for date in dates], color=INK)
    axes[-1].set_xlabel(f"Date in {' and '.join(dict.fromkeys(date[:4] for date in dates))}")
    figure.legend(loc="outside upper left", ncols=2, handlelength=1.8, borderaxespad=0)
    dotted = f" Dotted: {'; '.join(done)}." if done else ""
    return Drawing(figure, "; ".join(told) + "." + dotted,
                   f"{w.quantity_text(quantity)} over the dates, raw values with their intervals: "
                   "weather differs between dates, so read changes from the table below, not "
                   f"here.{dotted}")
