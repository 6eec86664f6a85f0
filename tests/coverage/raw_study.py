"""The same question through raw files: whole campaigns of other seeds, read, reduced and compared.

    python tests/coverage/raw_study.py 60          # seeds 1 to 60, prints the lines of the table

Each seed is a yard of three dates written by demo_data/make_demo.py, which shares no code with the
package: other errors of the kit, other clocks, patches, passes and faults in the logs, the same
grounds and weather. The stages run as a campaign's do, without notebooks, with 2,000 draws.
"""

from __future__ import annotations

import json
import shutil
import sys
import tempfile
import time
import warnings
from pathlib import Path
from typing import Any

import pandas as pd

ROOT = Path(__file__).parents[2]
KEY = ["campaign", "surface", "quantity", "kind"]
SHOWN = ("higher", "lower", "higher, small", "lower, small")
UNCHANGED = 1e-9


def written(seed: int, root: Path) -> dict[str, pd.DataFrame]:
    """Write a project with the yard of this seed; return its truths."""
    if str(ROOT / "demo_data") not in sys.path:
        sys.path.append(str(ROOT / "demo_data"))
    import make_demo
    import yard

    was, errors = yard.SEED, dict(yard.ERRORS)
    yard.SEED = seed
    yard.ERRORS.clear()
    try:
        with warnings.catch_warnings():
            warnings.filterwarnings("ignore", "DatetimeIndex.dayofyear")  # pvlib, pandas 3.1
            built = make_demo.build()
    finally:
        yard.SEED = was
        yard.ERRORS.clear()
        yard.ERRORS.update(errors)
    for name, content in built.items():
        path = root / "demo_data" / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content)
    (root / "notebooks").mkdir(exist_ok=True)
    (root / "params").mkdir(exist_ok=True)
    for path in (ROOT / "params").glob("*.yml"):
        text = path.read_text(encoding="utf-8")
        (root / "params" / path.name).write_text(text.replace(
            "settings: {} ", "settings: {statistics: {draws: 2000}} "), encoding="utf-8")
    held = json.loads(built["truth.json"])
    return {name: pd.DataFrame(held[name]) for name in ("surfaces", "changes")}


def one_seed(seed: int) -> list[dict[str, Any]]:
    """Return what became of one yard: a row a question, with `hit` 1 or 0."""
    from surveykit import pipeline

    folder = Path(tempfile.mkdtemp(prefix="yard-"))
    try:
        truth = written(seed, folder)
        rows: list[dict[str, Any]] = []
        for name in dict.fromkeys(truth["surfaces"]["campaign"]):
            survey = pipeline.open_file(folder / "params" / f"{name}.yml")
            assert survey.campaign.settings.statistics.draws == 2000
            found = pipeline.surfaces(survey).tables["surfaces"].merge(
                truth["surfaces"], on=KEY, suffixes=("", "_true"))
            rows += [{"question": "value", "quantity": row["quantity"],
                      "hit": row["lower"] <= row["value_true"] <= row["upper"]}
                     for row in found.to_dict("records")]
            changes = pipeline.comparison(survey)["changes"].merge(
                truth["changes"], on=[*KEY, "earlier"], suffixes=("", "_true"))
            for row in changes[changes["verdict"] != ""].to_dict("records"):
                true, shown = row["change_true"], row["verdict"] in SHOWN
                about = {"quantity": row["quantity"]}
                if pd.notna(row["change"]):
                    rows.append(about | {"question": "change",
                                         "hit": row["lower"] <= true <= row["upper"]})
                if abs(true) < UNCHANGED:
                    rows.append(about | {"question": "false changed", "hit": shown})
                else:
                    rows.append(about | {"question": "wrong sign",
                                         "hit": shown and row["change"] * true < 0})
        return rows
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def study(seeds: range) -> pd.DataFrame:
    """Return share and number by quantity and question."""
    frame = pd.DataFrame([row | {"seed": seed} for seed in seeds for row in one_seed(seed)])
    return frame.groupby(["quantity", "question"]).agg(
        share=("hit", "mean"), n=("hit", "size"), seeds=("seed", "nunique")).reset_index()


def printed(made: pd.DataFrame) -> str:
    """Return one line a quantity, shares in per cent."""
    questions = ["value", "change", "false changed", "wrong sign"]
    wide = made.pivot_table(index="quantity", columns="question", values="share") * 100
    lines = ["| quantity | " + " | ".join(questions) + " |", "|" + "---|" * 5]
    lines += ["| " + " | ".join([str(name), *(f"{row[q]:.1f}" for q in questions)]) + " |"
              for name, row in wide.iterrows()]
    return "\n".join(lines)


if __name__ == "__main__":
    began = time.time()
    last = int(sys.argv[1]) if len(sys.argv) > 1 else 3
    print(printed(study(range(1, last + 1))))  # noqa: T201
    print(f"{last} seeds in {time.time() - began:.0f} s")  # noqa: T201
