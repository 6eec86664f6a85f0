"""Figures from inside the passes: placements, cooling under the head, maps, heights."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import matplotlib.dates as mdates
import numpy as np
import pandas as pd

from . import wording as w
from .style import (
    HAIRLINE,
    INK,
    MAP_RAMP,
    MARKERS,
    PALETTE,
    Drawing,
    clock_axis,
    dress,
    panels,
    styled,
)

Labels = Mapping[str, str] | None
PANELS = 6  # of one figure: it still fits a page


@styled
def placement_plot(dwells: pd.DataFrame, labels: Labels = None,
                   time_zone: str = "UTC") -> Drawing:
    """Draw the placements of the contact head over the time of day, a panel a surface.

    Parameters
    ----------
    dwells : DataFrame
        Table `dwells`: one row a placement that counted.
    labels : mapping, optional
        Surface to label.
    time_zone : str
        IANA name of the zone of the time axis.
    """
    known = dwells[dwells["value"].notna()]
    if known.empty:
        return Drawing(None, "No placement of a contact head was evaluated, so there is none to "
                             "draw.")
    names = list(dict.fromkeys(known["surface"]))
    figure, axes = panels([1.05] * len(names), sharex=True)
    told = []
    for axis, name in zip(axes, names, strict=True):
        block = known[known["surface"] == name]
        for place, (_, patch) in enumerate(block.groupby("patch", sort=False)):
            axis.plot(mdates.date2num(patch["start_utc"]), patch["value"], linestyle="",
                      marker=MARKERS[place % 8], color=PALETTE[place % 8], markersize=3.2,
                      markeredgewidth=0)
        axis.locator_params(axis="y", nbins=4)
        dress(axis, w.label(name, labels), "°C")
        spread = block.groupby("pass")["value"].std().mean()
        told.append(f"{w.label(name, labels)} {w.plural(len(block), 'placement')} from "
                    f"{w.number(block['value'].min(), 1)} to {w.number(block['value'].max(), 1)} °C"
                    + (f", standard deviation within a pass {w.number(spread, 1)} K"
                       if np.isfinite(spread) else ""))
    clock_axis(axes[-1], time_zone)
    return Drawing(figure, f"Contact placements: {'; '.join(told)}.",
                   "Settled placements of the contact head over the day; equal marks within a "
                   "panel are one patch.")


@styled
def cooling_plot(courses: pd.DataFrame, labels: Labels = None) -> Drawing:
    """Draw how the ground cools under a pressed head, a panel a surface.

    Parameters
    ----------
    courses : DataFrame
        A row a record: surface, pass, placement, seconds [s] since the touch, below_k [K] under
        the value fitted before the touch, law_k [K] of the fitted law at that time, and rate
        [K s-1/2] of its pass.
    """
    if courses.empty:
        return Drawing(None, "No contact placement was fitted for the cooling under the head, so "
                             "there is none to draw.")
    names = [*dict.fromkeys(courses["surface"])]
    figure, axes = panels([1.15] * len(names), sharex=True, sharey=True)
    told = []
    for axis, name in zip(axes, names, strict=True):
        block = courses[courses["surface"] == name]
        axis.plot(block["seconds"], -block["below_k"], linestyle="", marker=".", color=PALETTE[0],
                  markersize=2.6, label="readings")
        law = block.groupby(block["seconds"].round(1))["law_k"].mean()
        axis.plot(law.index, -law, color=INK, linewidth=1.3, label="fitted law, mean of the passes")
        dress(axis, w.label(name, labels), "K")
        rates = block.groupby("pass")["rate"].first()
        told.append(f"{w.label(name, labels)} {w.number(float(rates.mean()), 2)} K s⁻¹ᐟ² over "
                    f"{w.plural(len(rates), 'pass', 'passes')}, so "
                    f"{w.number(float(law.abs().max()), 1)} K after {law.index.max():.0f} s")
    high, low = -courses["below_k"].quantile([0.01, 0.99])  # but for stray ones all are seen
    axes[0].set_ylim(min(-1.15 * float(courses["law_k"].max()) - 0.3, low), max(high, 0.3))
    axes[-1].set_xlabel("Seconds since the touch")
    figure.legend(*axes[0].get_legend_handles_labels(), loc="outside upper left", ncols=2,
                  borderaxespad=0, handlelength=1.4)
    return Drawing(figure, f"Cooling under the contact head: {'; '.join(told)}.",
                   "Readings of the placements against the temperature fitted before the touch, "
                   "and the law of cooling under the head.")


def map_plots(readings: pd.DataFrame, labels: Labels = None) -> tuple[Drawing, ...]:
    """Return for each quantity and kind maps of the patches that were walked in lanes.

    `readings` has a row a record: surface, patch, pass, quantity, kind, unit, x_m, y_m [m] and
    value.
    """
    return () if readings.empty else tuple(
        _map_plot(pair, block, labels) for pair, block in w.families(readings))


@styled
def _map_plot(pair: tuple[str, str], block: pd.DataFrame, labels: Labels) -> Drawing:
    patches, rest = _first(
        dict.fromkeys(zip(block["surface"], block["patch"], strict=True)), "patches")
    low, high = block["value"].quantile([0.02, 0.98])
    spans = block.groupby(["surface", "patch"])[["x_m", "y_m"]].agg(np.ptp).clip(lower=0.5)
    figure, axes = panels([0.4 + float(np.clip(2.7 * y / x, 0.8, 3.0)) for x, y in (
        spans.loc[patch] for patch in patches)])  # as high as a map of the column's width needs
    told = []
    for axis, (surface, patch) in zip(axes, patches, strict=True):
        some = block[(block["surface"] == surface) & (block["patch"] == patch)]
        drawn = axis.scatter(some["x_m"], some["y_m"], c=some["value"], cmap=MAP_RAMP, s=14,
                             marker="s", linewidths=0, vmin=low, vmax=high)
        axis.set_aspect("equal")
        dress(axis, f"{w.label(surface, labels)}, {patch}", "Across the lanes, m", "")
        ends = [w.number(float(some["value"].quantile(q)), w.places(pair[0])) for q in (0.05, 0.95)]
        told.append(f"{w.label(surface, labels)}, patch {patch}, nine tenths of "
                    f"{w.plural(len(some), 'record')} from {ends[0]} to "
                    f"{w.with_unit(ends[1], block['unit'].iloc[0])}")
    axes[-1].set_xlabel("Along the lanes, m")
    figure.colorbar(drawn, ax=axes, label=w.heading(*pair, block["unit"].iloc[0]), shrink=0.8)
    return Drawing(figure, f"{w.quantity_text(*pair)} over the ground: {'; '.join(told)}.",
                   f"Readings of {w.inside_sentence(*pair)} where the lanes were walked, before "
                   f"corrections; darker is higher{rest}.")


def histogram_plots(histograms: pd.DataFrame, labels: Labels = None) -> tuple[Drawing, ...]:
    """Return the table `histograms` drawn, a panel a pass whose readings fall into two groups."""
    return () if histograms.empty else (_histogram_plot(histograms, labels),)


@styled
def _histogram_plot(histograms: pd.DataFrame, labels: Labels) -> Drawing:
    names, rest = _first(dict.fromkeys(histograms["pass"]), "passes")
    figure, axes = panels([1.3] * len(names))
    told = []
    for axis, name in zip(axes, names, strict=True):
        bars = histograms[histograms["pass"] == name]
        first, low, high = bars.iloc[0], bars["lower"].min(), bars["upper"].max()
        axis.bar(bars["lower"], bars["n_records"], bars["upper"] - bars["lower"], align="edge",
                 color=PALETTE[0], edgecolor="white", linewidth=0.4)
        axis.set_xlabel(w.heading(first["quantity"], "", first["unit"]))
        dress(axis, f"{name}, {w.label(first['surface'], labels)}", "Records", "")
        ends = [w.number(end, w.places(first["quantity"])) for end in (low, high)]
        told.append(f"{name}, {w.plural(int(bars['n_records'].sum()), 'record')} from {ends[0]} to "
                    f"{w.with_unit(ends[1], first['unit'])}")
    return Drawing(figure, f"Readings in two groups: {'; '.join(told)}.",
                   "Readings of passes that look like two kinds of ground: their mean stands for "
                   f"neither{rest}.")


def height_plot(geometry: pd.DataFrame, labels: Labels = None) -> tuple[Drawing, ...]:
    """Draw what the head's height costs an albedo, of each surface the pass that loses most.

    `geometry` is the table of that name; without a row there is no drawing: its table says so.
    """
    used = geometry[geometry["role"] == "used"].sort_values("effect", kind="stable")
    worst = used.groupby("surface", sort=False)["pass"].last()
    return () if used.empty else (heights_drawn([
        (f"{w.label(name, labels)}, {worst[name]}", geometry[geometry["pass"] == worst[name]])
        for name in dict.fromkeys(geometry["surface"]) if name in worst.index]),)


@styled
def heights_drawn(curves: Iterable[tuple[str, pd.DataFrame]]) -> Drawing:
    """Draw own shade and foreign ground over the height, a panel a curve with its title.

    A curve has `height_m` [m], `shade`, `contamination` and `effect` (relative errors of the
    albedo [1]) and `role`: used, best or empty.
    """
    shown, rest = _first(curves, "patches")
    figure, axes = panels([1.45] * len(shown), sharex=True)
    told = []
    for axis, (title, rows) in zip(axes, shown, strict=True):
        block = rows.sort_values("height_m")
        for column, label, colour, line, width in (
                ("effect", "both", HAIRLINE, "-", 5.0),
                ("shade", "own shade", PALETTE[0], "--", 1.5),
                ("contamination", "foreign ground", PALETTE[1], ":", 1.8)):
            axis.plot(100 * block["height_m"], 100 * block[column], color=colour, linestyle=line,
                      linewidth=width, label=label)
        marks = {}
        for place, role in enumerate(("used", "best")):
            for row in block[block["role"] == role].to_dict("records"):
                axis.plot(100 * row["height_m"], 100 * row["effect"], marker=MARKERS[place],
                          color=INK, linestyle="", markersize=6, label=role,
                          markerfacecolor=INK if role == "used" else "white")
                marks[role] = f"{w.percent(row['effect'])} at {100 * row['height_m']:.0f} cm"
        axis.set_xscale("log")
        axis.xaxis.set_major_formatter(lambda value, _: f"{value:g}")
        axis.set_ylim(0, 100 * min(0.6, 1.2 * float(block["effect"].max())))
        dress(axis, title, "%")
        told.append(f"{title}: " + w.listing(f"{role} {text}" for role, text in marks.items()))
    axes[-1].set_xlabel("Height of the head, cm")
    seen = dict(pair for axis in axes for pair in zip(
        *axis.get_legend_handles_labels()[::-1], strict=True))
    figure.legend(seen.values(), seen.keys(), loc="outside upper left", ncols=3, borderaxespad=0)
    return Drawing(figure, f"Error of albedo against the height of the head: {'; '.join(told)}.",
                   "What the head’s own shade and the ground beyond the patch would take from "
                   f"albedo without correction, in per cent of it{rest}.")


def _first(items: Iterable[Any], what: str) -> tuple[list[Any], str]:
    """Return as many items as fit a figure, and for the caption how many there are."""
    found = [*items]
    return found[:PANELS], f"; the first {PANELS} of {len(found)} {what}" if found[PANELS:] else ""
