"""How often intervals hold the truth and verdicts are right: the package beside a spreadsheet.

    python tests/coverage/study.py 2000            # all cells, two processes, prints the table
    python tests/coverage/study.py 2000 common     # what a common scatter costs an unlike surface

Each seed is a survey of six surfaces on two dates with other weather (simulator.py); its pass
estimates go straight to the evidence stage, with 2,000 draws.
"""

# ruff: noqa: E402
from __future__ import annotations

import sys
import time
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

sys.path[:0] = [str(Path(__file__).parents[1]), str(Path(__file__).parents[1] / "evidence"),
                str(Path(__file__).parent)]

from collections.abc import Iterable
from itertools import combinations
from typing import Any

import numpy as np
import pandas as pd
from pass_values import parameters
from scipy import stats
from simulator import CHANGED, DATES, QUANTITIES, RELEVANT, SURFACES, WIDER, simulate

from surveykit.evidence.comparability import Date
from surveykit.evidence.compare import changes, differences
from surveykit.evidence.surfaces import groups, surface_table
from surveykit.statistics.draws import Draws

PASSES, SKIES = (2, 3, 4, 8), ("clear", "mixed")
SHOWN = ("higher", "lower", "higher, small", "lower, small")
DRAWS = Draws(20251, 2000)


def one_seed(seed: int, k: int, sky: str, **settings: Any) -> list[dict[str, Any]]:
    """Return what became of one survey: a row a question, with `hit` 1 or 0."""
    survey = simulate(seed, k, sky)
    dates = {}
    for date, passes in survey.passes.items():
        given = parameters(date, date[5:], sky="clear" if sky == "clear" else "broken",
                           settings=settings)
        statistics = given.campaign.settings.statistics
        found = groups(date, passes, DRAWS, coverage=0.95,
                       between_passes=statistics.between_passes)
        dates[date] = Date(given, {g.key: g for g in found})
    rows: list[dict[str, Any]] = []

    def note(question: str, quantity: str, hit: bool, **more: Any) -> None:
        rows.append({"question": question, "quantity": quantity, "hit": float(hit)} | more)

    for date, held in dates.items():
        table = surface_table(list(held.groups.values()), 0.95)
        zero = np.where(table["quantity"] == "temperature", 273.15, 0.0)
        for row, shift in zip(table.to_dict("records"), zero, strict=True):
            where = date, row["surface"], row["quantity"]
            true = survey.value[where]
            values = [p.value for p in held.groups[row["surface"], row["quantity"],
                                                   row["kind"]].used]
            student = stats.t.ppf(0.975, k - 1) * np.std(values, ddof=1) / np.sqrt(k)
            note("value", row["quantity"], row["lower"] + shift <= true <= row["upper"] + shift,
                 half=(row["upper"] - row["lower"]) / 2, student=student)
            mean, half = survey.plain[where]
            note("value, plain", row["quantity"], abs(mean - true) <= half)
    now = DATES[1]
    for row in differences(dates[now], DRAWS).to_dict("records"):
        q, pair = row["quantity"], (row["surface"], row["other"])
        true = survey.at_common[now, pair[0], q] - survey.at_common[now, pair[1], q]
        note("difference", q, row["lower"] <= true <= row["upper"])
        if row["verdict"] in SHOWN:
            note("difference, wrong sign", q, row["difference"] * true < 0)
        if row["verdict"] == "equivalent":
            note("difference, wrongly equivalent", q, abs(true) > RELEVANT[q])
    for one, other in combinations(SURFACES, 2):
        for q in QUANTITIES:
            a, b = survey.plain[now, one, q], survey.plain[now, other, q]
            true = survey.at_common[now, one, q] - survey.at_common[now, other, q]
            note("difference, plain", q, abs(a[0] - b[0] - true) <= np.hypot(a[1], b[1]))
    table = changes(dates[now], (dates[DATES[0]],), DRAWS)
    for row in table[table["verdict"] != ""].to_dict("records"):
        q, true = row["quantity"], survey.change[row["surface"], row["quantity"]]
        note("change", q, row["lower"] <= true <= row["upper"])
        shown = row["verdict"] in SHOWN
        if true:
            note("detected", q, shown and row["change"] * true > 0)
            note("change, wrong sign", q, shown and row["change"] * true < 0)
        else:
            note("false changed", q, shown)
        then, later = (survey.plain[d, row["surface"], q] for d in DATES)
        plain, half = later[0] - then[0], float(np.hypot(then[1], later[1]))
        note("change, plain", q, abs(plain - true) <= half)
        note("detected, plain" if true else "false changed, plain", q,
             abs(plain) > half and (not true or plain * true > 0))
    assert {r for r in CHANGED} <= set(SURFACES)
    return rows


def _block(job: tuple[int, str, range, dict[str, Any]]) -> pd.DataFrame:
    k, sky, seeds, settings = job
    frame = pd.DataFrame([row for seed in seeds for row in one_seed(seed, k, sky, **settings)])
    frame["half"] = frame.get("half", np.nan)
    made = frame.groupby(["question", "quantity"]).agg(
        n=("hit", "size"), hits=("hit", "sum"), half=("half", "median"),
        student=("student", "median")).reset_index()
    return made.assign(passes=k, sky=sky, seeds=len(seeds))


def study(seeds: int, *, passes: Iterable[int] = PASSES, skies: Iterable[str] = SKIES,
          workers: int = 1, **settings: Any) -> pd.DataFrame:
    """Return share, number and median widths by cell (passes, sky), quantity and question."""
    jobs = [(k, sky, range(start, min(start + 50, seeds)), settings)
            for k in passes for sky in skies for start in range(0, seeds, 50)]
    if workers > 1:
        with ProcessPoolExecutor(workers) as pool:
            blocks = list(pool.map(_block, jobs))
    else:
        blocks = [_block(job) for job in jobs]
    return gathered(blocks)


def gathered(blocks: Iterable[pd.DataFrame]) -> pd.DataFrame:
    """Return the same of blocks of seeds."""
    made = pd.concat(blocks).groupby(["passes", "sky", "quantity", "question"]).agg(
        n=("n", "sum"), hits=("hits", "sum"), half=("half", "median"),
        student=("student", "median"), seeds=("seeds", "sum")).reset_index()
    return made.assign(share=made["hits"] / made["n"])


def printed(made: pd.DataFrame) -> str:
    """Return the table of README: one line a cell, shares in per cent."""
    wide = made.pivot_table(index=["quantity", "sky", "passes"], columns="question",
                            values="share") * 100
    ours = ["value", "difference", "change", "false changed", "detected"]
    lines = ["| quantity | sky | passes | value | difference | change | false change | found at 2x "
             "| plain: value | difference | change | false change | found at 2x | half-width "
             "| Student |", "|" + "---|" * 15]
    widths = made[made["question"] == "value"].set_index(["quantity", "sky", "passes"])
    for key, row in wide.iterrows():
        cells = [f"{row[name]:.1f}" for name in (*ours, *(f"{name}, plain" for name in ours))]
        digits = 2 if key[0] == "temperature" else 4
        sky = "broken" if key[1] == "mixed" else key[1]
        lines.append("| " + " | ".join([
            key[0], sky, str(key[2]), *cells, f"{widths.half[key]:.{digits}f}",
            f"{widths.student[key]:.{digits}f}"]) + " |")
    return "\n".join(lines)


def common_cells(seeds: int, factors: Iterable[float] = (1.0, 2.0, 3.0)) -> pd.DataFrame:
    """Return the share of values held under either way of counting the scatter between passes.

    Three passes under a broken sky; one surface scatters so many times as widely as the others.
    """
    rows = []
    for factor in factors:
        for seed in range(seeds):
            survey = simulate(seed, 3, "mixed", factor)
            for way in ("own", "common"):
                found = groups(DATES[0], survey.passes[DATES[0]], DRAWS, coverage=0.95,
                               between_passes=way)
                table = surface_table(found, 0.95)
                zero = np.where(table["quantity"] == "temperature", 273.15, 0.0)
                for row, shift in zip(table.to_dict("records"), zero, strict=True):
                    true = survey.value[DATES[0], row["surface"], row["quantity"]] - shift
                    rows.append({"times": factor, "between_passes": way,
                                 "surface": "the wider" if row["surface"] == WIDER else "others",
                                 "quantity": row["quantity"],
                                 "hit": row["lower"] <= true <= row["upper"]})
    return pd.DataFrame(rows).pivot_table(
        index=["times", "between_passes", "surface"], columns="quantity", values="hit") * 100


def unchanged(seed: int, k: int, sky: str) -> dict[str, list[bool]]:
    """Return by quantity which unchanged surfaces were called changed between two weathers."""
    survey = simulate(seed, k, sky)
    dates = []
    for date, passes in survey.passes.items():
        given = parameters(date, date[5:], sky="clear" if sky == "clear" else "broken")
        dates.append(Date(given, {g.key: g for g in groups(date, passes, DRAWS, coverage=0.95)}))
    table = changes(dates[1], (dates[0],), DRAWS)
    still = table[(table["verdict"] != "") & ~table["surface"].isin(list(CHANGED))]
    return {q: some["verdict"].isin(SHOWN).tolist() for q, some in still.groupby("quantity")}


if __name__ == "__main__":
    began, count = time.time(), int(sys.argv[1]) if len(sys.argv) > 1 else 200
    if sys.argv[2:] == ["common"]:
        print(common_cells(count).round(1).to_string())  # noqa: T201
    else:
        print(printed(study(count, workers=2)))  # noqa: T201
    print(f"\n{count} seeds a cell, {DRAWS.size} draws, {time.time() - began:.0f} s")  # noqa: T201
