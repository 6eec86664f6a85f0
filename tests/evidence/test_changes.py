"""Changes between dates: methods, verdicts, what is not judged.

The linear energy balance of the temperature cases: surface less air = [(1 - albedo) G (1 - .30)
- .95 * 70] / (5.7 + 3.8 wind + 4 * .95 sigma 310^3); albedo .10, control .35. The excesses and the
errors of the methods quoted with it are computed (two scripts), the wind function from memory.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from pass_values import (
    CLEAR,
    CLOUD,
    DRAWS,
    bright,
    date,
    error,
    heat,
    kelvin,
    ndvi,
    one_pass,
)

from surveykit.evidence.changes import DOUBLE, MATCHED, RATIO, RAW, ratio_to_control
from surveykit.evidence.comparability import Date
from surveykit.evidence.compare import changes
from surveykit.evidence.conditions import Sky

AIR = 303.15


def excess(reflected, light, wind):
    loss = 5.7 + 3.8 * wind + 4 * 0.95 * 5.670374e-8 * 310**3
    return ((1 - reflected) * light * 0.7 - 0.95 * 70) / loss


@pytest.mark.parametrize(("light", "wind", "kelvins"), [
    (900, 1, 31.4), (900, 4, 18.3), (600, 1, 19.6), (600, 4, 11.4)])
def test_the_balance_is_the_quoted_one(light, wind, kelvins):
    assert excess(0.1, light, wind) == pytest.approx(kelvins, abs=0.06)


def balance(light, wind):
    return AIR + excess(0.1, light, wind), AIR, AIR + excess(0.35, light, wind), AIR


@pytest.mark.parametrize(("now", "additive"), [((800, 2), -2.8), ((600, 4), -6.1)])
def test_ratio_to_control_against_additive(now, additive):
    """Nothing has changed but the weather: the ratio errs by .2 to .4 K, the additive method by
    -2.8 and -6.1 K (computed).
    """
    new, old = balance(*now), balance(900, 1)
    assert (new[0] - new[2]) - (old[0] - old[2]) == pytest.approx(additive, abs=0.06)
    assert 0.15 < abs(ratio_to_control(*new, *old)) < 0.45


def rows_of(table, surface):
    return table[table.surface == surface].set_index("method")


# ---- changes of temperature

def test_an_unchanged_surface_on_a_milder_day():
    """Raw -9.3 K, additive -2.8 K, ratio +.2 K (computed); only the ratio is judged."""
    then = dict(zip(("court", "air", "control"), balance(900, 1)[:3], strict=True))
    now = dict(zip(("court", "air", "control"), balance(800, 2)[:3], strict=True))
    made = changes(
        heat("june", {k: now[k] for k in ("court", "control")},
             sky=replace(CLEAR, irradiance_w_m2=800.0)),
        (heat("may", {k: then[k] for k in ("court", "control")}),), DRAWS)
    rows = rows_of(made, "court")
    assert rows.change[RAW] == pytest.approx(-9.3, abs=0.06)
    assert rows.change[DOUBLE] == pytest.approx(-2.8, abs=0.06)
    assert rows.change[RATIO] == pytest.approx(0.2, abs=0.06)
    assert rows.verdict.to_dict() == {RATIO: "equivalent", DOUBLE: "", RAW: ""}
    assert rows.could_have_missed[RATIO] > 0
    assert rows.comparability[RATIO] == "partly matched"
    assert "irradiance differs by 11%" in rows.note[RATIO]
    control = rows_of(made, "control")
    assert list(control.index) == [RAW]
    assert control.verdict[RAW] == ""


def test_the_model_form_doubles_where_plants_grow():
    """.02 |Tc - Ta| of a partly matched pair, .04 with an NDVI above .3; nothing else is unsure."""
    def width(index):
        green = [one_pass(ndvi(1 - index, 1 + index), surface="court", patch=f"g{i}", n=i,
                          quantity="ndvi", u_within=1e-4) for i in range(3)]
        now = heat("june", {"court": 320.0, "control": AIR + 20}, u=1e-6, rain=None)
        now = Date(now.parameters, now.groups | date(green, "june").groups)
        made = changes(now, (heat("may", {"court": 320.0, "control": AIR + 20}, u=1e-6),), DRAWS)
        return rows_of(made, "court").u[RATIO]

    assert width(0.1) == pytest.approx(0.02 * 20, rel=0.01)
    assert width(0.6) == pytest.approx(0.04 * 20, rel=0.01)


def test_the_airs_error_is_one_error_on_both_dates():
    """theta 1.5: a wrong air moves the prediction by (1 - theta) twice, nearly alike."""
    pair = {"court": AIR + 30, "control": AIR + 20}
    made = changes(heat("june", pair, u=1e-6, air_u=1.0),
                   (heat("may", pair, u=1e-6, air_u=1.0),), DRAWS)
    assert rows_of(made, "court").u[RATIO] == pytest.approx(0.01 * 20, rel=0.02)


def test_a_control_near_the_air_leaves_the_change_empty():
    pair = {"court": AIR + 12, "control": AIR + 7}
    made = changes(heat("june", pair), (heat("may", pair),), DRAWS)
    row = rows_of(made, "court").loc[RATIO]
    assert (row.verdict, row.comparability) == ("not comparable", "not matched")
    assert "the control is only 7.0 K above the air" in row.note
    assert np.isnan([row.change, row.u, row.lower, row.upper]).all()
    assert np.isfinite(rows_of(made, "court").change[RAW])


def test_no_control_no_verdict_on_temperature():
    made = changes(heat("june", {"court": 320.0}, control=None),
                   (heat("may", {"court": 321.0}, control=None),), DRAWS)
    rows = rows_of(made, "court")
    assert list(rows.index) == [RATIO, RAW]
    assert rows.verdict[RATIO] == "not comparable"
    assert rows.note[RATIO] == "no control with an interval on both dates"


def test_a_surface_without_air_is_told_not_guessed():
    now = heat("june", {"court": 320.0, "control": AIR + 20})
    key = ("court", "temperature", "stand-off")
    bare = replace(now.groups[key], used=tuple(replace(p, air=None) for p in now.groups[key].used))
    made = changes(Date(now.parameters, now.groups | {key: bare}),
                   (heat("may", {"court": 320.0, "control": AIR + 20}),), DRAWS)
    row = rows_of(made, "court").loc[RATIO]
    assert row.verdict == "not comparable"
    assert "air temperature on june is missing" in row.note


# ---- changes of albedo and NDVI

def test_albedo_with_a_control_is_the_difference_in_differences():
    gain = error("up_gain_error", 0.03, "pair-2025:ground:gain")
    made = changes(bright("june", {"court": 0.30, "control": 0.12}, shared=(gain,)),
                   (bright("may", {"court": 0.10, "control": 0.12}, shared=(gain,)),), DRAWS)
    rows = rows_of(made, "court")
    assert rows.change[DOUBLE] == pytest.approx(0.20, abs=1e-6)
    assert rows.verdict[DOUBLE] == "higher"
    # gain of .03 on .20, sampling of .001 / 2 four times (hand arithmetic)
    assert rows.u[DOUBLE] == pytest.approx(np.hypot(0.006, 0.001), rel=0.01)
    assert rows.comparability[DOUBLE] == "matched"


def test_albedo_without_a_control_holds_the_instruments_drift():
    """1.5 % a year, half a year: .0075 of .30; nothing where the calibration was renewed."""
    then = bright("may", {"court": 0.30}, day="2024-12-10", control=None, u=1e-6)
    now = bright("june", {"court": 0.30}, control=None, u=1e-6)
    made = rows_of(changes(now, (then,), DRAWS), "court")
    assert list(made.index) == [MATCHED, RAW]
    assert made.u[MATCHED] == pytest.approx(0.30 * 0.015 * 183 / 365.25, rel=0.02)
    renewed = {"id": "pair-2026", "date": "2025-05-01", "valid_days": 730}
    now = bright("june", {"court": 0.30}, control=None, u=1e-6, calibration=renewed)
    assert rows_of(changes(now, (then,), DRAWS), "court").u[MATCHED] < 1e-5


def test_albedo_under_another_sun_holds_the_suns_height():
    """From 60 to 30 deg a weak dependence changes .20 by 6.3 % (1.1 / 1.1732 less 1; computed)."""
    now = bright("june", {"court": 0.20}, zenith_deg=30.0, control=None, u=1e-6)
    then = bright("may", {"court": 0.20}, zenith_deg=60.0, control=None, u=1e-6)
    row = rows_of(changes(now, (then,), DRAWS), "court").loc[MATCHED]
    assert row.u == pytest.approx(0.20 * (1 - 1.1 / (1 + 0.2 * np.cos(np.pi / 6))), rel=0.02)
    assert "cosine of the zenith angle differs by 0.37" in row.note


def test_clear_and_diffuse_albedo_are_not_compared():
    """The same lawn reads .0325 more under an overcast sky: the sky differs, not the lawn."""
    made = changes(bright("june", {"lawn": 0.198, "control": 0.12}),
                   (bright("may", {"lawn": 0.2305, "control": 0.12}, sky=CLOUD),), DRAWS)
    rows = made[made.surface == "lawn"]
    assert rows.verdict.tolist() == ["not comparable"]
    assert rows.note.item() == "the sky differs: diffuse albedo on may, clear on june"
    assert rows.change.isna().all()


def test_an_albedo_refused_before_its_sky_was_known_is_not_called_another_sky():
    refused = date([one_pass((), surface="court", quantity="albedo", sky=Sky(), n=n,
                             note="computed sun below the horizon") for n in (1, 2)], "may")
    made = changes(bright("june", {"court": 0.2}), (refused,), DRAWS)
    row = made[made.surface == "court"].iloc[0]
    assert row.verdict == "not evaluated"
    assert row.note == "may: computed sun below the horizon"


def test_bands_that_differ_forbid_a_verdict_but_show_the_numbers():
    def green(name, **kit):
        return date([one_pass(ndvi(0.05, 0.4), surface=s, patch=f"{s}{i}", n=i, quantity="ndvi",
                              u_within=0.001, **kit)
                     for s in ("lawn", "control") for i in range(3)], name)

    made = changes(green("june", band_centres_nm={"red": 670, "nir": 810}), (green("may"),), DRAWS)
    row = rows_of(made, "lawn").loc[DOUBLE]
    assert (row.verdict, row.note) == ("not comparable", "the bands differ")
    assert np.isfinite(row.change)


# ---- what cannot be judged

def test_value_only_on_one_date_is_not_evaluated():
    now = heat("june", {"court": 320.0, "control": AIR + 20})
    then = heat("may", {"control": AIR + 20})
    alone = date([one_pass(kelvin(320.0), surface="court")], "may")
    made = changes(now, (Date(then.parameters, then.groups | alone.groups),), DRAWS)
    row = rows_of(made, "court").loc[RATIO]
    assert (row.verdict, row.note) == ("not evaluated", "may: one pass")


def test_a_refused_date_still_has_its_row():
    now = heat("june", {"court": 320.0, "control": AIR + 20})
    refused = date([one_pass((), surface=s, note="air temperature during the pass is missing")
                    for s in ("court", "control")], "may")
    made = changes(now, (refused,), DRAWS)
    row = rows_of(made, "court").loc[RATIO]
    assert (row.verdict, row.note) == (
        "not evaluated", "may: air temperature during the pass is missing")
    assert made[made.surface == "control"].empty


def test_a_surface_of_one_date_only():
    made = changes(heat("june", {"court": 320.0, "control": AIR + 20}),
                   (heat("may", {"control": AIR + 20}),), DRAWS)
    assert rows_of(made, "court").note[RATIO] == "no such passes on may"


def test_each_earlier_date_is_compared_on_its_own():
    pair = {"court": 320.0, "control": AIR + 20}
    made = changes(heat("july", pair), (heat("june", pair), heat("may", pair)), DRAWS)
    assert made.earlier.unique().tolist() == ["june", "may"]
    assert len(made) == 2 * 4
