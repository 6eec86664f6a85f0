"""NDVI of other bands, other skies and bright panels: what may be held against each other."""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import HEADS, changed, inputs, made
from pass_values import CLEAR, CLOUD, DRAWS, date, ndvi, one_pass
from small_survey import CERTAIN, KIT, NDVI, flux, head, lines, row, small

from surveykit.core import Input
from surveykit.evidence.compare import differences
from surveykit.evidence.vegetation import bands_of

OTHER = {"band_centres_nm": {"red": 670, "nir": 780}}
TO_OTHER = {"slope": 0.95, "intercept": 0.02, "u": 0.01, "source": "invented",
            "centres_nm": {"red": 670, "nir": 780}, "widths_nm": {"red": 50, "nir": 50}}
CONVERTED = (Input("conversion_slope", 0.95, 0, "", ""),
             Input("conversion_intercept", 0.02, 0, "", ""))
DOWN, UP, N = {"red": 100.0, "nir": 120.0}, {"red": 4.2, "nir": 55.0}, 420


def passes(surface, n=3, skies=(), more=(), **kit):
    return [one_pass(ndvi(0.05, 0.4, *more), surface=surface, patch=f"{surface}{i}", n=i,
                     quantity="ndvi", u_within=0.001, sky=[*skies, *[CLEAR] * n][i], **kit)
            for i in range(n)]


def judged(*some):
    return differences(date([p for one in some for p in one], "june"), DRAWS).iloc[0]


def test_surfaces_of_other_bands_are_not_compared_on_one_date():
    row = judged(passes("court"), passes("lawn", **OTHER))
    assert (row.verdict, row.note.split("; ")[0]) == ("not comparable", "the bands differ")
    assert np.isfinite(row.difference)
    assert np.isnan(row.lower_all)
    assert judged(passes("court"), passes("lawn")).verdict != "not comparable"


def test_passes_of_other_bands_are_not_pooled():
    (group,) = date([*passes("court", 4)[:2], *passes("court", 4, **OTHER)[2:]],
                    "june").groups.values()
    assert group.status == "not evaluated"
    assert group.notes == ("the bands differ between its passes",)


def test_a_conversion_joins_the_bands():
    lawn = passes("lawn", more=CONVERTED, band_conversion=TO_OTHER)
    assert judged(passes("court", **OTHER), lawn).verdict != "not comparable"
    assert judged(passes("court"), lawn).verdict == "not comparable"
    switched_off = passes("lawn", band_conversion=TO_OTHER)
    assert bands_of(switched_off[0].this, switched_off[0].inputs) == bands_of(
        passes("court")[0].this, ())


def test_a_conversion_is_a_line_with_an_error_of_its_own(tmp_path):
    """.02 + .95 times the index; u as stated; the records' scatter times .95 (hand arithmetic)."""
    plain = made(tmp_path / "a", NDVI, *HEADS)
    one = made(tmp_path / "b", NDVI, *HEADS, kit=changed("rednir-ground", band_conversion=TO_OTHER))
    assert one.value == pytest.approx(0.02 + 0.95 * plain.value, abs=1e-12)
    assert one.u_within == pytest.approx(0.95 * plain.u_within)
    assert dict(one.steps)["bands converted"] == one.value
    assert inputs(one)["conversion_error"].u == 0.01
    assert inputs(one)["conversion_error"].source == "conversion of NDVI to other bands (invented)"


def test_surfaces_under_clear_and_overcast_sky_are_not_compared():
    row = judged(passes("court"), passes("lawn", skies=[CLOUD] * 3))
    assert row.verdict == "not comparable"
    assert row.note.startswith("the sky differs: clear over court, overcast over lawn")


def test_passes_under_both_skies_are_said_of_their_surface():
    def notes(skies):
        (group,) = date(passes("court", 4, skies), "june").groups.values()
        return group.notes

    told = "passes under a clear and under an overcast sky"
    assert told in notes([CLEAR, CLEAR, CLOUD, CLOUD])
    assert told not in notes([CLEAR] * 4)
    assert told not in notes([CLOUD] * 4)


def over_panel(root, reflectance):
    """A pass at noon over dense turf, then 90 s over a panel."""
    there = (np.arange(N) >= 200) & (np.arange(N) < 300)
    logs = {}
    for name in HEADS:
        level = DOWN if name == "rednir-sky" else UP
        logs[name] = lines(name, n=N, **{b: np.where(
            there & (name == "rednir-ground"), reflectance * DOWN[b], level[b]) * (
                1 + 1e-3 * np.random.default_rng([len(name), len(b)]).standard_normal(N))
            for b in DOWN})
    panel = row(entry="panel", instrument="rednir-ground", start="12:03:25", stop="12:04:55",
                reading=str(reflectance), reading_u="0.005")
    first = row(**NDVI | {"start": "12:00:05", "stop": "12:02:00"})
    (one,) = small(root, [first, panel], logs, settings=CERTAIN).estimates()
    return one


def test_an_index_does_not_hang_on_how_white_the_panel_is(tmp_path):
    grey, white = over_panel(tmp_path / "grey", 0.05), over_panel(tmp_path / "white", 0.99)
    assert grey.evaluated, grey.note
    assert white.evaluated, white.note
    assert white.value == pytest.approx(grey.value, abs=1e-3)
    u = [inputs(one)["red_up_zero_error"].u for one in (grey, white)]
    assert u[1] == pytest.approx(u[0], rel=0.01)


@pytest.mark.parametrize(("capped", "flagged"), [
    ((), True), (("down",), True), (("up", "down"), False)])
def test_a_pair_of_which_a_head_was_not_capped_is_flagged(tmp_path, capped, flagged):
    kit = dict(KIT)
    for name, column, quantity in (("up", "sky", "shortwave_down"),
                                   ("down", "ground", "shortwave_up")):
        kit[name] = {**head(**{column: flux(quantity)}), "head_radius_cm": 1.2,
                     "calibration": KIT["pair"]["calibration"] | {"id": name}}
    logs = {name: lines(name, kit=kit) for name in ("up", "down")}
    for name in capped:
        logs[name][1:16] = [f"{line.split(',')[0]},{0.2 + 0.01 * (i % 3):.4f}"
                            for i, line in enumerate(logs[name][1:16])]
    rows = [row(entry="dark", instrument=name, start="12:00:02", stop="12:00:12")
            for name in capped]
    albedo = row(quantity="albedo", height_cm="40", width_m="4", length_m="4")
    (one,) = small(tmp_path, [albedo, *rows], logs, kit=kit).estimates()
    assert ("no dark reading" in one.flags) == flagged
