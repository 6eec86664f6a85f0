"""Every interval of the invented demo against the truth it was made from.

demo_data/make_demo.py shares no code with the package; its truths stand in demo_data/truth.json.
"""

import json

import pandas as pd
import pytest
from projects import DEMO, ROOT

KEY = ["campaign", "surface", "quantity", "kind"]
SHOWN = ("higher", "lower", "higher, small", "lower, small")


@pytest.fixture(scope="module")
def truth():
    held = json.loads((ROOT / "demo_data/truth.json").read_text(encoding="utf-8"))
    return {name: pd.DataFrame(held[name]) for name in ("surfaces", "changes")}


def tables(demo, name):
    folder, _ = demo
    frames = [pd.read_csv(folder / "reports" / one / "tables" / f"{name}.csv",
                          keep_default_na=False, na_values={
                              c: [""] for c in ("value", "lower", "upper", "change", "difference")})
              for one in DEMO]
    return pd.concat(frames, ignore_index=True)


def test_at_least_nine_in_ten_intervals_cover_the_truth(demo, truth):
    both = tables(demo, "surfaces").merge(truth["surfaces"], on=KEY, suffixes=("", "_true"))
    assert len(both) == len(truth["surfaces"]) == 60
    assert both["lower"].notna().all()
    covered = (both["lower"] <= both["value_true"]) & (both["value_true"] <= both["upper"])
    assert covered.groupby(both["campaign"]).mean().min() >= 0.9
    assert covered.mean() >= 0.9


def test_no_change_has_the_wrong_sign(demo, truth):
    changes = tables(demo, "changes")
    both = changes.merge(truth["changes"], on=[*KEY, "earlier"], suffixes=("", "_true"))
    judged = both[both["verdict"] != ""]
    assert len(judged) == 48  # 4 surfaces, 4 quantities and kinds, 3 pairs of dates
    shown = judged[judged["verdict"].isin(SHOWN)]
    assert len(shown) >= 8
    assert (shown["change"] * shown["change_true"] > 0).all()
    covered = (judged["lower"] <= judged["change_true"]) & (
        judged["change_true"] <= judged["upper"])
    assert covered.mean() >= 0.9


def test_no_difference_has_the_wrong_sign(demo, truth):
    values = truth["surfaces"].set_index(KEY)["value"]
    rows = tables(demo, "differences")
    shown = rows[rows["verdict"].isin(SHOWN)]
    assert len(shown) > 60
    for row in shown.to_dict("records"):
        pair = [values[row["campaign"], row[end], row["quantity"], row["kind"]]
                for end in ("surface", "other")]
        assert row["difference"] * (pair[0] - pair[1]) > 0, row


def test_the_coated_court_changed_and_the_lawn_did_not(demo):
    changes = tables(demo, "changes")
    albedo = changes[(changes["quantity"] == "albedo") & (changes["verdict"] != "")
                     & (changes["earlier"] == DEMO[0])]
    for later in DEMO[1:]:
        now = albedo[albedo["campaign"] == later].set_index("surface")["verdict"]
        assert now["coated-court"] == "higher"
        assert now["lawn"] in ("no difference shown", "equivalent")


def test_a_wrong_method_would_have_called_the_lawn_changed(demo):
    """The additive difference of temperatures from June to September excludes the true 0."""
    changes = tables(demo, "changes")
    row = changes[(changes["campaign"] == DEMO[2]) & (changes["earlier"] == DEMO[0])
                  & (changes["surface"] == "lawn") & (changes["kind"] == "stand-off")]
    row = row.set_index("method")
    assert row.lower["difference in differences"] > 0
    assert row.verdict["difference in differences"] == ""
    assert row.lower["ratio to control"] < 0 < row.upper["ratio to control"]
