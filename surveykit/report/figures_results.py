"""Figures of results: intervals by surface, places, differences, changes since a date."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import pandas as pd
import seaborn as sns
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from . import wording as w
from .style import (
    INK,
    MARKERS,
    MUTED,
    PALETTE,
    PAPER,
    RAMP,
    Drawing,
    dress,
    kinds,
    of_each,
    panels,
    shorten,
    styled,
)

Labels = Mapping[str, str] | None
ROW_IN, FRAME_IN = 0.34, 0.75


def interval_plots(surfaces: pd.DataFrame, labels: Labels = None) -> tuple[Drawing, ...]:
    """Return one interval plot a quantity of the table `surfaces`."""
    return of_each(surfaces, lambda quantity: _interval_plot(surfaces, quantity, labels),
                   "No surface was surveyed, so there is no interval to draw.")


@styled
def _interval_plot(surfaces: pd.DataFrame, quantity: str, labels: Labels = None) -> Drawing:
    """Draw value and interval by surface, a panel a kind, on one scale.

    Filled marks are unqualified, hollow ones qualified or without an interval; a surface that was
    not evaluated keeps its row, with these words in it.
    """
    families = kinds(surfaces, quantity)
    if not any(block["value"].notna().any() for _, block in families):
        return Drawing(None, f"No {w.inside_sentence(quantity)} could be evaluated, so there is "
                             "no interval to draw.")
    figure, axes = panels([FRAME_IN + ROW_IN * len(b) for _, b in families],
                          sharex=True)
    findings = []
    for place, (axis, (kind, block)) in enumerate(zip(axes, families, strict=True)):
        rows = block.sort_values("value", na_position="first", kind="stable")
        _draw_rows(axis, rows, "value", place, labels, rows["status"] != "ok")
        if len(families) > 1:
            axis.set_title(w.quantity_text(quantity, kind))
        findings.append(f"{w.quantity_text(quantity, kind)}: " + (_told(
            rows[rows["value"].notna()].iloc[::-1], "value", labels) or "none evaluated") + ".")
    axes[-1].set_xlabel(w.heading(quantity, "", families[0][1]["unit"].iloc[0]))
    hollow = any(block["status"].isin(["qualified", "value only"]).any() for _, block in families)
    caption = f"{w.quantity_text(quantity)} of each surface with its interval" + (
        "; hollow marks are qualified or have no interval." if hollow else ".")
    return Drawing(figure, "From high to low. " + " ".join(findings), caption)


def rank_plots(ranks: pd.DataFrame, labels: Labels = None) -> tuple[Drawing, ...]:
    """Return for each quantity and kind of the table `ranks` the probability of each place."""
    return tuple(_rank_plot(pair, block, labels) for pair, block in w.families(ranks)
                 if len({*block["surface"]}) > 1) or (
        Drawing(None, "No two surfaces have a value, so there are no places to draw."),)


@styled
def _rank_plot(pair: tuple[str, str], block: pd.DataFrame, labels: Labels) -> Drawing:
    shares = block.pivot_table(index="surface", columns="place", values="probability")
    shares = shares.loc[(shares * shares.columns).sum(axis="columns").sort_values().index]
    size = shares.to_numpy(float)
    words = np.array([[w.percent(share) if share >= 0.005 else "" for share in row]
                      for row in size], dtype=object)
    figure = _matrix(size, words, [w.label(name, labels) for name in shares.index],
                     [str(place) for place in shares], 0.36, vmax=1.0)
    told = [f"{w.label(name, labels)} place {row.idxmax()} with probability "
            f"{w.number(row.max(), 2)}" for name, row in shares.iterrows()]
    return Drawing(figure, f"{w.quantity_text(*pair)}, most probable place from the highest down: "
                           f"{w.listing(told)}.",
                   f"Probability that a surface stands at each place of {w.inside_sentence(*pair)},"
                   " place 1 the highest; empty cells are below 0.5 %.")


def difference_matrices(differences: pd.DataFrame, labels: Labels = None) -> tuple[Drawing, ...]:
    """Return one matrix for each quantity and kind of the table `differences`."""
    return tuple(_difference_matrix(pair, block, labels)
                 for pair, block in w.families(differences)) or (
        Drawing(None, "No two surfaces could be compared, so there is no matrix to draw."),)


@styled
def _difference_matrix(pair: tuple[str, str], block: pd.DataFrame, labels: Labels) -> Drawing:
    """Draw the differences row minus column, shaded by size, each with its verdict."""
    if not block["difference"].notna().any():
        return Drawing(None, f"No difference of {w.inside_sentence(*pair)} between surfaces could "
                             "be evaluated, so there is no matrix to draw.")
    names = list(dict.fromkeys([*block["surface"], *block["other"]]))
    size = np.full((len(names), len(names)), np.nan)
    words = np.full(size.shape, "", dtype=object)
    for row in block.to_dict("records"):
        i, j = names.index(row["surface"]), names.index(row["other"])
        sign = 1 if i < j else -1
        written = w.number(sign * row["difference"], w.places(pair[0]), sign=True)
        size[min(i, j), max(i, j)] = abs(row["difference"])
        words[min(i, j), max(i, j)] = "\n".join(filter(None, (
            written, shorten(row["verdict"] if sign > 0 else _turned(row["verdict"]), 13))))
    figure = _matrix(size[:-1, 1:], words[:-1, 1:], [w.label(n, labels) for n in names[:-1]],
                     [w.label(n, labels) for n in names[1:]], 0.6)
    unit = w.unit_text(block["unit"].iloc[0])
    told = [f"{w.label(row['surface'], labels)} minus {w.label(row['other'], labels)} "
            + (w.with_unit(w.number(row["difference"], w.places(pair[0]), sign=True), row["unit"])
               or "no number") + f", {row['verdict']}" for row in block.to_dict("records")]
    return Drawing(figure, f"{w.quantity_text(*pair)}: {'; '.join(told)}.",
                   f"Differences of {w.inside_sentence(*pair)}{f' in {unit}' if unit else ''}, row "
                   "minus column, darker for larger, each with its verdict.")


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
    families, since = w.families(judged), w.label(earlier, labels)
    if not judged["change"].notna().any():
        return Drawing(None, f"No change since {since} could be evaluated, so there is none to "
                             "draw.")
    figure, axes = panels([0.95 + ROW_IN * len(b) for _, b in families])
    findings = []
    for place, (axis, ((quantity, kind), block)) in enumerate(zip(axes, families, strict=True)):
        limit = (relevant or {}).get(quantity)
        if limit is not None:
            axis.axvspan(-limit, limit, color=MUTED, alpha=0.16, linewidth=0)
        axis.axvline(0, color=MUTED, linewidth=0.9)
        rows = block.iloc[::-1]
        _draw_rows(axis, rows, "change", place, labels, ~rows["verdict"].isin(["higher", "lower"]))
        axis.set_title(w.quantity_text(quantity, kind))
        axis.set_xlabel(w.heading("Change", "", block["unit"].iloc[0]))
        reach = max(*(abs(end) for end in axis.get_xlim()), 1.5 * (limit or 0))
        axis.set_xlim(-reach, reach)
        findings.append(f"{w.quantity_text(quantity, kind)}: "
                        f"{_told(block, 'change', labels, 'verdict')}.")
    band = "; the grey band is the change that was declared relevant" if relevant else ""
    return Drawing(figure, f"Change since {since}. " + " ".join(findings),
                   f"Changes since {since} with their intervals{band}; filled marks are judged "
                   "higher or lower, hollow ones small, equivalent or not shown.")


def _matrix(size: np.ndarray, words: np.ndarray, rows: Sequence[str], columns: Sequence[str],
            row_in: float, vmax: float | None = None) -> Figure:
    """Draw cells shaded in one hue by size, words in them, columns named above."""
    figure, (axis,) = panels([0.6 + row_in * len(size)])
    small = 8.0 if size.shape[1] < 6 else 7.0
    sns.heatmap(size, ax=axis, cmap=RAMP, cbar=False, linewidths=1.5, linecolor=PAPER, vmin=0,
                vmax=vmax)
    for i, j in zip(*np.nonzero(words != ""), strict=True):
        axis.text(j + 0.5, i + 0.5, words[i, j], ha="center", va="center", color=INK,
                  fontsize=small, linespacing=1.25)
    axis.set_yticks(np.arange(len(size)) + 0.5, [shorten(name, 16, 3) for name in rows],
                    rotation=0)
    axis.set_xticks(np.arange(size.shape[1]) + 0.5, [shorten(name, 13, 3) for name in columns],
                    rotation=0)
    axis.tick_params(length=0, labelsize=small + 0.5, labeltop=True, labelbottom=False)
    return figure


def _draw_rows(axis: Axes, rows: pd.DataFrame, column: str, place: int, labels: Labels,
               hollow: pd.Series) -> None:
    """Draw a row's value and interval each, or in words why there is none."""
    surface_rows(axis, [w.label(name, labels) for name in rows["surface"]])
    colour, marker = PALETTE[place % len(PALETTE)], MARKERS[place % len(MARKERS)]
    for y, (row, open_) in enumerate(zip(rows.to_dict("records"), hollow, strict=True)):
        value, lower, upper = (float(row[key]) for key in (column, "lower", "upper"))
        if np.isnan(value):
            axis.text(0.01, y, str(row.get("verdict", row.get("status"))), va="center",
                      transform=axis.get_yaxis_transform(), color=MUTED, style="italic",
                      fontsize=8.5)
            continue
        if not np.isnan(lower):
            axis.plot([lower, upper], [y, y], color=colour, linewidth=1.6, solid_capstyle="butt",
                      marker="|", markersize=8)
        axis.plot(value, y, marker=marker, markersize=6.5, color=colour,
                  markerfacecolor=axis.get_facecolor() if open_ else colour, markeredgewidth=1.4)


def surface_rows(axis: Axes, names: list[str]) -> None:
    """Name the rows of a panel from the bottom up, with a grid across them."""
    axis.set_yticks(range(len(names)), [shorten(name) for name in names])
    axis.set_ylim(-0.6, len(names) - 0.4)
    axis.locator_params(axis="x", nbins=6, steps=[1, 2, 5, 10])
    axis.tick_params(axis="y", length=0)
    axis.tick_params(axis="x", labelbottom=True)
    dress(axis, grid="x", left=True)


def _told(rows: pd.DataFrame, column: str, labels: Labels, last: str = "") -> str:
    """Tell surface, value and interval of each row."""
    return w.listing(" ".join(filter(None, (
        w.label(row["surface"], labels), w.with_unit(w.interval(
            row[column], row["lower"], row["upper"], w.places(row["quantity"]),
            sign=column == "change"), row["unit"]), row.get(last, ""))))
        for row in rows.to_dict("records"))


def _turned(verdict: str) -> str:
    """The verdict on a pair named the other way round."""
    return {"higher": "lower", "lower": "higher", "higher, small": "lower, small",
            "lower, small": "higher, small"}.get(verdict, verdict)
