"""Figures of results: intervals by surface, differences between surfaces, changes since a date."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd
import seaborn as sns
from matplotlib.axes import Axes

from . import wording as w
from .style import INK, MARKERS, MUTED, PALETTE, PAPER, RAMP, Drawing, panels, shorten, styled

Labels = Mapping[str, str] | None
ROW_IN, FRAME_IN = 0.34, 0.75


def interval_plots(surfaces: pd.DataFrame, labels: Labels = None) -> tuple[Drawing, ...]:
    """Return one interval plot a quantity of the table `surfaces`."""
    quantities = dict.fromkeys(quantity for (quantity, _), _ in w.families(surfaces))
    return tuple(interval_plot(surfaces, quantity, labels) for quantity in quantities) or (
        Drawing(None, "No surface was surveyed, so there is no interval to draw."),)


@styled
def interval_plot(surfaces: pd.DataFrame, quantity: str, labels: Labels = None) -> Drawing:
    """Draw value and interval by surface, a panel a kind, on one scale.

    Filled marks are unqualified, hollow ones qualified or without an interval; a surface that was
    not evaluated keeps its row, with these words in it.
    """
    families = [(kind, block) for (name, kind), block in w.families(surfaces) if name == quantity]
    if not any(block["value"].notna().any() for _, block in families):
        return Drawing(None, f"No {w.inside_sentence(quantity)} could be evaluated, so there is "
                             "no interval to draw.")
    unit = families[0][1]["unit"].iloc[0]
    figure, axes = panels(len(families), [FRAME_IN + ROW_IN * len(b) for _, b in families],
                          sharex=True)
    findings = []
    for place, (axis, (kind, block)) in enumerate(zip(axes, families, strict=True)):
        rows = block.sort_values("value", na_position="first", kind="stable")
        _rows(axis, [w.label(name, labels) for name in rows["surface"]])
        for y, row in enumerate(rows.to_dict("records")):
            _mark(axis, y, row, "value", place, hollow=row["status"] != "ok")
        if len(families) > 1:
            axis.set_title(w.quantity_text(quantity, kind))
        told = [f"{w.label(row['surface'], labels)} "
                + w.with_unit(w.interval(row["value"], row["lower"], row["upper"],
                                         w.places(quantity)), unit)
                for row in rows[rows["value"].notna()].iloc[::-1].to_dict("records")]
        findings.append(f"{w.quantity_text(quantity, kind)}: "
                        f"{w.listing(told) or 'none evaluated'}.")
    axes[-1].set_xlabel(_axis(quantity, unit))
    hollow = surfaces[surfaces["quantity"] == quantity]["status"].isin(["qualified", "value only"])
    caption = f"{w.quantity_text(quantity)} of each surface with its interval" + (
        "; hollow marks are qualified or have no interval." if hollow.any() else ".")
    return Drawing(figure, "From high to low. " + " ".join(findings), caption)


def difference_matrices(differences: pd.DataFrame, labels: Labels = None) -> tuple[Drawing, ...]:
    """Return one matrix for each quantity and kind of the table `differences`."""
    return tuple(difference_matrix(differences, quantity, kind, labels)
                 for (quantity, kind), _ in w.families(differences)) or (
        Drawing(None, "No two surfaces could be compared, so there is no matrix to draw."),)


@styled
def difference_matrix(differences: pd.DataFrame, quantity: str, kind: str | None = None,
                      labels: Labels = None) -> Drawing:
    """Draw the differences row minus column, shaded by size, each with its verdict."""
    families = {k: block for (name, k), block in w.families(differences) if name == quantity}
    kind = next(iter(families), "") if kind is None else kind
    block = families.get(kind, differences.iloc[:0])
    if not block["difference"].notna().any():
        return Drawing(None, f"No difference of {w.inside_sentence(quantity, kind)} between "
                             "surfaces could be evaluated, so there is no matrix to draw.")
    names = list(dict.fromkeys([*block["surface"], *block["other"]]))
    size = np.full((len(names), len(names)), np.nan)
    words = np.full(size.shape, "", dtype=object)
    for row in block.to_dict("records"):
        i, j = names.index(row["surface"]), names.index(row["other"])
        sign = 1 if i < j else -1
        written = w.number(sign * row["difference"], w.places(quantity), sign=True)
        size[min(i, j), max(i, j)] = abs(row["difference"])
        words[min(i, j), max(i, j)] = "\n".join(filter(None, (
            written, shorten(row["verdict"] if sign > 0 else _turned(row["verdict"]), 13))))
    size, words = size[:-1, 1:], words[:-1, 1:]
    figure, (axis,) = panels(1, [0.7 + 0.66 * len(size)])
    small = 8.0 if len(size) < 5 else 6.5
    sns.heatmap(size, ax=axis, cmap=RAMP, cbar=False, linewidths=1.5, linecolor=PAPER, vmin=0)
    for i, j in zip(*np.nonzero(words != ""), strict=True):
        axis.text(j + 0.5, i + 0.5, words[i, j], ha="center", va="center", color=INK,
                  fontsize=small, linespacing=1.25)
    axis.set_yticks(np.arange(len(size)) + 0.5,
                    [shorten(w.label(n, labels), 16, 3) for n in names[:-1]], rotation=0)
    axis.set_xticks(np.arange(len(size)) + 0.5,
                    [shorten(w.label(n, labels), 13, 3) for n in names[1:]], rotation=0)
    axis.tick_params(length=0, labelsize=small + 0.5, labeltop=True, labelbottom=False)
    unit = w.unit_text(block["unit"].iloc[0])
    told = [f"{w.label(row['surface'], labels)} minus {w.label(row['other'], labels)} "
            + (w.with_unit(w.number(row["difference"], w.places(quantity), sign=True), row["unit"])
               or "no number") + f", {row['verdict']}" for row in block.to_dict("records")]
    return Drawing(figure, f"{w.quantity_text(quantity, kind)}: {'; '.join(told)}.",
                   f"Differences of {w.inside_sentence(quantity, kind)}"
                   f"{f' in {unit}' if unit else ''}, row minus column, darker for larger, each "
                   "with its verdict.")


def change_plots(changes: pd.DataFrame, relevant: Mapping[str, float] | None = None,
                 labels: Labels = None) -> tuple[Drawing, ...]:
    """Return one change plot for each earlier campaign of the table `changes`."""
    return tuple(change_plot(changes, earlier, relevant, labels)
                 for earlier in dict.fromkeys(changes["earlier"])) or (
        Drawing(None, "No earlier campaign was named, so there is no change to draw."),)


@styled
def change_plot(changes: pd.DataFrame, earlier: str, relevant: Mapping[str, float] | None = None,
                labels: Labels = None) -> Drawing:
    """Draw the judged changes since one earlier campaign; the band is the relevant change."""
    judged = changes[(changes["earlier"] == earlier) & (changes["verdict"] != "")]
    families = w.families(judged)
    if not judged["change"].notna().any():
        return Drawing(None, f"No change since {earlier} could be evaluated, so there is none to "
                             "draw.")
    figure, axes = panels(len(families), [0.95 + ROW_IN * len(b) for _, b in families])
    findings = []
    for place, (axis, ((quantity, kind), block)) in enumerate(zip(axes, families, strict=True)):
        rows = block.iloc[::-1]
        _rows(axis, [w.label(name, labels) for name in rows["surface"]])
        limit = (relevant or {}).get(quantity)
        if limit is not None:
            axis.axvspan(-limit, limit, color=MUTED, alpha=0.16, linewidth=0)
        axis.axvline(0, color=MUTED, linewidth=0.9)
        for y, row in enumerate(rows.to_dict("records")):
            _mark(axis, y, row, "change", place, hollow=row["verdict"] not in ("higher", "lower"))
        axis.set_title(w.quantity_text(quantity, kind))
        unit = block["unit"].iloc[0]
        axis.set_xlabel(f"Change{f', {w.unit_text(unit)}' if w.unit_text(unit) else ''}")
        reach = max(*(abs(end) for end in axis.get_xlim()), 1.5 * (limit or 0))
        axis.set_xlim(-reach, reach)
        told = [f"{w.label(row['surface'], labels)} "
                + w.with_unit(w.interval(row["change"], row["lower"], row["upper"],
                                         w.places(quantity), sign=True), unit)
                + f" {row['verdict']}" for row in block.to_dict("records")]
        findings.append(f"{w.quantity_text(quantity, kind)}: {w.listing(told)}.")
    band = "; the grey band is the change that was declared relevant" if relevant else ""
    return Drawing(figure, f"Change since {earlier}. " + " ".join(findings),
                   f"Changes since {earlier} with their intervals{band}; filled marks are judged "
                   "higher or lower, hollow ones small, equivalent or not shown.")


def _rows(axis: Axes, names: list[str]) -> None:
    axis.set_yticks(range(len(names)), [shorten(name) for name in names])
    axis.set_ylim(-0.6, len(names) - 0.4)
    axis.locator_params(axis="x", nbins=6, steps=[1, 2, 5, 10])
    axis.grid(axis="x")
    axis.tick_params(axis="y", length=0)
    axis.tick_params(axis="x", labelbottom=True)
    sns.despine(ax=axis, left=True)


def _mark(axis: Axes, y: int, row: Any, column: str, place: int, *, hollow: bool) -> None:
    value, lower, upper = (float(row[key]) for key in (column, "lower", "upper"))
    colour, marker = PALETTE[place % len(PALETTE)], MARKERS[place % len(MARKERS)]
    if np.isnan(value):
        word = row["verdict"] if "verdict" in row else row["status"]
        axis.text(0.01, y, str(word), transform=axis.get_yaxis_transform(), va="center",
                  color=MUTED, style="italic", fontsize=8.5)
        return
    if not np.isnan(lower):
        axis.plot([lower, upper], [y, y], color=colour, linewidth=1.6, solid_capstyle="butt",
                  marker="|", markersize=8)
    axis.plot(value, y, marker=marker, markersize=6.5, color=colour,
              markerfacecolor=axis.get_facecolor() if hollow else colour, markeredgewidth=1.4)


def _turned(verdict: str) -> str:
    """The verdict on a pair named the other way round."""
    return {"higher": "lower", "lower": "higher", "higher, small": "lower, small",
            "lower, small": "higher, small"}.get(verdict, verdict)


def _axis(quantity: str, unit: str) -> str:
    written = w.unit_text(unit)
    return w.quantity_text(quantity) + (f", {written}" if written else "")
