"""The plan's tables and figures, and its page and the field sheet to print."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import matplotlib.dates as mdates
import numpy as np
import pandas as pd
from nbformat import NotebookNode

from . import wording as w
from .figures_passes import heights_drawn
from .markup import Cell, Html, bullets, grouped_table, table
from .page import render
from .style import INK, PALETTE, Drawing, clock_axis, dress, panels, styled
from .typeset import typeset

Labels = Mapping[str, str] | None


@styled
def sun_plot(course: pd.DataFrame, windows: pd.DataFrame, time_zone: str) -> Drawing:
    """Draw the sun's height over the day with the limits of the zenith angle.

    Parameters
    ----------
    course : DataFrame
        `time_utc` and `zenith_deg` [deg].
    windows : DataFrame
        `limit_deg`, `meaning`, `first`, `last` and `hours`.
    time_zone : str
        IANA name of the zone of the time axis.
    """
    up = course[course["zenith_deg"] < 90]
    if up.empty:
        return Drawing(None, "The sun does not rise on this day, so there is no window to draw.")
    figure, (axis,) = panels([2.3])
    axis.plot(mdates.date2num(up["time_utc"]), 90 - up["zenith_deg"], color=INK, linewidth=1.4)
    for place, row in enumerate(windows.to_dict("records")):
        axis.axhline(90 - row["limit_deg"], color=PALETTE[place % 8], linewidth=1.1,
                     linestyle=("--", ":", "-.")[place % 3],
                     label=f"{row['limit_deg']:.0f}° from the zenith: {row['meaning']}")
    axis.set_ylim(0, max(95 - up["zenith_deg"].min(), 50))
    dress(axis, "Sun height, °", grid="x", plain=True)
    figure.legend(loc="outside upper left", ncols=1, borderaxespad=0, handlelength=2.2)
    clock_axis(axis, time_zone)
    noon = up.iloc[int(up["zenith_deg"].argmin())]
    told = [f"within {row['limit_deg']:.0f}° of the zenith " + (
        f"from {row['first']} to {row['last']}" if row["hours"] else "never")
        for row in windows.to_dict("records")]
    return Drawing(figure, f"The sun is highest, {90 - noon['zenith_deg']:.0f}° above the horizon, "
                           f"at {noon['time_utc'].tz_convert(time_zone):%H:%M} ({time_zone}); "
                           f"{'; '.join(told)}.",
                   "Height of the sun over the day and the limits of the methods.")


def height_plot(curves: pd.DataFrame) -> Drawing:
    """Draw own shade and foreign ground over the height, a panel a size of patch.

    `curves` holds `patch`, `across_m` and what `figures_passes.heights_drawn` asks for.
    """
    if curves.empty:
        return Drawing(None, "No albedo over a patch of known size: no height to weigh.")
    return heights_drawn((f"Patch {name}, {w.figures(block['across_m'].iloc[0])} m across", block)
                         for name, block in curves.groupby("patch", sort=False))


def window_table(windows: pd.DataFrame) -> Html:
    """Return one row a limit of the zenith angle with its window."""
    rows = [[row["meaning"], f"{row['limit_deg']:.0f}", row["first"], row["last"],
             w.number(row["hours"], 1)] for row in windows.to_dict("records")]
    return table("Sun windows at the site.", {
        "What it allows": "text", f"Zenith up to,{w.NO_BREAK}°": "number", "From": "number",
        "To": "number", "Hours": "number"}, rows, empty="No limit of the sun’s height is set.")


def height_table(heights: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a kind of patch and way of reading: height, footprint, lanes, speed, wait."""
    groups: dict[str, list[list[str | Cell]]] = {}
    alike = [name for name in heights if name != "patch"]
    told = heights.groupby(alike, sort=False, dropna=False)["patch"].agg(", ".join).reset_index() \
        if len(heights) else heights
    for row in told.to_dict("records"):
        known = np.isfinite(row["height_m"])
        values = [w.number(100 * row["height_m"], 0), w.number(100 * row["footprint_m"], 0),
                  w.number(100 * row["margin_m"], 0), w.number(row["lanes"], 0),
                  w.number(row["speed_m_s"], 2),
                  w.number(row["settle_s"], 0)] if known else [""] * 6
        groups.setdefault(str(row["reading"]).replace("ndvi", "NDVI"), []).append(
            [row["patch"], w.label(row["surface"], labels), *values, row["note"]])
    heads = {"Patch": "text", "Surface": "short", f"Height,{w.NO_BREAK}cm": "number",
             f"Footprint,{w.NO_BREAK}cm": "number", f"Margin,{w.NO_BREAK}cm": "number",
             "Lanes": "number", f"Walk at most,{w.NO_BREAK}m{w.NO_BREAK}s⁻¹": "number",
             f"Wait,{w.NO_BREAK}s": "number", "Note": "long"}
    return grouped_table("Best height of the head (of a narrow one the greatest, up to 100 cm), "
                         "the ground that matters to it, how far to stay from the edge, lanes, "
                         "speed, and how long to wait after a placement until the head has "
                         "settled.", heads, [*groups.items()],
                         empty="No reading that stands off is planned, so there is no height to "
                               "choose.")


def needed_table(passes: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a surface, grouped by quantity: the passes that the wanted U needs."""
    groups = [(w.heading(*pair, block["unit"].iloc[0]), [
        [w.label(row["surface"], labels), w.figures(row["between"]), w.figures(row["within"]),
         w.figures(row["wanted"]), w.count(row["passes"]), w.label(row["source"], labels)]
        for row in block.to_dict("records")]) for pair, block in w.families(passes)]
    heads = {"Surface": "short", "Between passes": "number", "Within a pass": "number",
             "Wanted U": "number", "Passes": "number", "Spread from": "short"}
    return grouped_table("Passes of a surface that make the U of repeating no wider than the "
                         "relevant change (95 %); between and within are standard deviations.",
                         heads, groups, empty="No quantity is planned.")


def order_table(visits: pd.DataFrame, labels: Labels = None) -> Html:
    """Return the visits in order, grouped by round."""
    numbered = visits.assign(visit=range(1, len(visits) + 1))
    groups = [(f"Round {number}", [[w.count(row["visit"]), row["patch"],
                                    w.label(row["surface"], labels),
                                    w.number(row["starts_min"], 0)]
                                   for row in block.to_dict("records")])
              for number, block in numbered.groupby("round", sort=True)]
    heads = {"Visit": "number", "Patch": "short", "Surface": "short",
             "Minutes from the start": "number"}
    return grouped_table("Order of the visits; every other round runs backwards.", heads, groups,
                         empty="There is no patch to visit.")


SHEET = {"entry": "Entry", "surface": "Surface", "patch": "Patch", "quantity": "Quantity",
         "mode": "Mode", "instrument": "Instrument", "start": "Start", "stop": "Stop",
         "height_cm": "Height, cm", "lanes": "Lanes", "reading": "Reading", "note": "Note"}


def sheet_table(sheet: pd.DataFrame) -> Html:
    """Return the field sheet as a table to fill in by hand."""
    rows = [["" if pd.isna(row[name]) else str(row[name]) for name in SHEET]
            for row in sheet.to_dict("records")]
    heads = {text: "text" if text == "Note" else "short" for text in SHEET.values()}
    return table("Field sheet: times to the second, by a watch photographed beside each logger’s "
                 "clock at the start and the end.", heads, rows, empty="There is no pass to note.")


def plan_page(notebook: NotebookNode, facts: Mapping[str, Any], visits: str) -> str:
    """Return the executed planning notebook as one HTML page, what the visits take first."""
    about = [("Date", [w.date_text(facts["date"])]), ("Site", [facts["site"]["name"]]),
             ("In short", [typeset(visits)])]
    return render("plan.html.j2", facts, [notebook], title_block=about, kind="Plan of a survey day")


def sheet_page(sheet: pd.DataFrame, safety: Sequence[str], facts: Mapping[str, Any]) -> str:
    """Return the field sheet as one HTML page for print, with the safety text first."""
    about = [("Date", [w.date_text(facts["date"])]), ("Site", [facts["site"]["name"]]),
             ("Crew", [", ".join(facts.get("crew") or []) or "................"]),
             ("Clock photo", ["start ................", "end ................"])]
    return render("sheet.html.j2", facts, [], title_block=about, kind="Field sheet",
                  sheet=sheet_table(sheet), safety=bullets(safety))
