"""Albedo and NDVI passes: sizes and scopes of their inputs, flags, refusals."""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import DAY_SCOPE, HEADS, UNTOUCHED, albedo, changed, changed_column, inputs, made
from pass_values import sensitivities
from small_survey import ALBEDO, CERTAIN, KIT, NDVI, lines, readings, row, small

from surveykit.evidence.views import footprint_share
from surveykit.physics.footprint import disc_share, self_shade
from surveykit.physics.shortwave import patch_albedo

# ---- albedo

def test_albedo_is_the_ratio_of_sums(tmp_path):
    """A bright and a dim half: 200 + 20 over 1000 + 50, not the mean of .2 and .4."""
    half = np.arange(160) < 80
    log = {"pair": lines("pair", sky=np.where(half, 1000, 60), ground=np.where(half, 200, 24))}
    one = albedo(tmp_path, logs=log, settings=CERTAIN | UNTOUCHED)
    assert one.value == pytest.approx(224 / 1060, abs=1e-6)


def test_more_light_back_than_came_is_no_albedo(tmp_path):
    """Up and down exchanged: 900 over 180."""
    columns = {"sky": KIT["pair"]["columns"]["ground"], "ground": KIT["pair"]["columns"]["sky"]}
    one = albedo(tmp_path, kit=changed("pair", columns=columns))
    assert not one.evaluated
    assert "check which" in one.note


def test_the_height_enters_as_the_passs_own(tmp_path):
    """Disc of 1 m, head at 12 cm, radius 3 cm: slopes by differences of the shares themselves."""
    cells = {"quantity": "albedo", "height_cm": "12", "length_m": "1"}
    one = albedo(tmp_path, cells, kit=changed("pair", head_radius_cm=3),
                 surfaces={"court": {"label": "Court", "around": {"albedo": 0.10, "u": 0.02}}})
    i = inputs(one)
    assert i["height_error"].scope == f"{DAY_SCOPE}:pass:C1-albedo-1"
    assert i["height_error"].u == 0.01
    footprint = (disc_share(0.5, 0.13) - disc_share(0.5, 0.11)) / 0.02
    shade = (self_shade(0.03, 0.13, one.zenith_deg, 0.85)
             - self_shade(0.03, 0.11, one.zenith_deg, 0.85)) / 0.02
    # higher than written: less shade to add, more of the darker surroundings to make up for
    share, lost = disc_share(0.5, 0.12), self_shade(0.03, 0.12, one.zenith_deg, 0.85)
    high, low = (patch_albedo(0.2, 0.10, share + e * footprint, lost + e * shade)
                 for e in (0.01, -0.01))
    want = (high - low) / 2
    assert sensitivities("albedo", one.inputs)["height_error"] == pytest.approx(want, rel=1e-3)
    assert i["footprint_share"].value == pytest.approx(0.9455, abs=5e-5)


def test_what_surrounds_the_patch_keeps_its_scope_and_weight(tmp_path):
    """Even where it is as bright as the patch: (1 - F) u / (F - S), here .0545 * .05 / .94."""
    cells = {"quantity": "albedo", "height_cm": "12", "length_m": "1"}
    stated = {"court": {"label": "Court", "around": {"albedo": 0.2, "u": 0.05}}}
    one = albedo(tmp_path / "a", cells, surfaces=stated)
    moved = sensitivities("albedo", one.inputs)
    lit = inputs(one)["footprint_share"].value - inputs(one)["shade_share"].value
    assert abs(moved["around_error"]) == pytest.approx(0.0545 * 0.05 / lit, rel=1e-3)
    assert "contamination_error" not in moved
    again = albedo(tmp_path / "b", cells, surfaces=stated)
    other = albedo(tmp_path / "c", cells, surfaces={
        "court": {"label": "Court", "around": {"albedo": 0.2, "u": 0.04}}})
    scopes = [inputs(x)["around_error"].scope for x in (one, again, other)]
    assert scopes[0] == scopes[1] != scopes[2]


def test_unstated_surroundings_are_assumed_and_flagged(tmp_path):
    one = albedo(tmp_path, surfaces={"court": {"label": "Court"}})
    assert "albedo around the patch not stated" in one.flags
    assert inputs(one)["around_error"].u == 0.15


@pytest.mark.parametrize(("height", "flag"), [("20", None), ("24", "small footprint share")])
def test_a_small_footprint_is_flagged_below_nine_tenths(tmp_path, height, flag):
    """Disc of 1.4 m: .925 at 20 cm, .895 at 24 cm (R^2 / (R^2 + h^2))."""
    one = albedo(tmp_path, {"quantity": "albedo", "height_cm": height, "length_m": "1.4"})
    assert ("small footprint share" in one.flags) == (flag is not None)


def test_a_head_that_sees_too_little_of_its_patch_is_refused(tmp_path):
    """Disc of 1 m at 50 cm fills half the view."""
    one = albedo(tmp_path, {"quantity": "albedo", "height_cm": "50", "length_m": "1"})
    assert one.note.startswith("the head sees 50% foreign ground and 0% of its own shade: less "
                               "than 75% of its view is lit patch")


def test_zero_without_darks_is_the_calibrations_and_what_no_cap_shows(tmp_path):
    """hypot(1, 3) W m-2 for the sky, a third of the hidden part for the ground."""
    i = inputs(albedo(tmp_path))
    assert i["down_zero_error"].u == pytest.approx(np.hypot(1, 3))
    assert i["up_zero_error"].u == pytest.approx(np.hypot(1, 1))


def test_directional_and_level(tmp_path):
    """At 60 deg: .85 * 20 / 500 / sqrt 3 and .85 tan 60 * 1 deg / sqrt 2 (hand arithmetic)."""
    site = {"name": "West", "latitude": 41.3, "longitude": -69.7, "elevation_m": 120,
            "time_zone": "UTC"}
    one = albedo(tmp_path, site=site, settings=CERTAIN)
    assert one.zenith_deg == pytest.approx(60, abs=0.5)
    i = inputs(one)
    both = i["directional_error"], i["directional_error_next"]
    assert np.hypot(*(one.u for one in both)) == pytest.approx(0.0196, abs=0.0004)
    assert i["levelling_error"].u == pytest.approx(0.0182, abs=0.0004)
    assert i["levelling_error"].scope.startswith(f"{DAY_SCOPE}:pass:")
    assert any(flag.startswith("sun lower than") for flag in one.flags)


def test_the_sun_may_be_allowed_down_to_the_horizon(tmp_path):
    """zenith_max 90: the sun sets within the pass and nothing breaks."""
    log = {"pair": lines("pair", start="19:56:00", n=600, sky=readings("sky", 600, 1) / 15,
                         ground=readings("ground", 600, 1) / 15)}
    one = albedo(tmp_path, ALBEDO | {"start": "19:56:20", "stop": "20:05:50"}, logs=log,
                 settings=CERTAIN | {"albedo": {"zenith_max_deg": 90.0, "min_down_w_m2": 0.0}})
    assert 80 < one.zenith_deg <= 90
    assert all(i.u >= 0 for i in one.inputs)


# ---- NDVI

def test_ndvi_zero_holds_a_share_of_the_largest_reading(tmp_path):
    """.001 of the channel's largest in a pass, beside .02 of the calibration."""
    one = made(tmp_path, NDVI, *HEADS)
    largest = readings("rednir-sky.red", 160, 1)[20:140].max()
    assert inputs(one)["red_down_zero_error"].u == pytest.approx(
        np.hypot(0.02, 0.001 * largest), rel=1e-4)


def test_ndvi_zero_with_darks_is_the_darks_own_and_the_share(tmp_path):
    capped = np.arange(160) < 15
    logs = {name: lines(name, **{band: np.where(
        capped, 0.5 + 0.001 * np.resize([1, -1], 160), readings(f"{name}.{band}", 160, 1) + 0.5)
        for band in ("red", "nir")}) for name in HEADS}
    sheet = [row(**NDVI), row(entry="dark", quantity="ndvi", start="12:00:02", stop="12:00:12")]
    one = small(tmp_path, sheet, logs).by_name()["C1-ndvi-1"]
    largest = readings("rednir-sky.red", 160, 1)[20:140].max()
    zero = inputs(one)["red_down_zero_error"]
    assert zero.u == pytest.approx(0.001 * largest, rel=0.01)
    assert zero.scope == f"{DAY_SCOPE}:rednir-sky:red:zero"
    assert one.value == pytest.approx((20 / 50 - 3.5 / 70) / (20 / 50 + 3.5 / 70), abs=1e-3)
    assert one.value_raw < one.value


def test_ndvi_in_too_little_light_is_refused(tmp_path):
    """A red reading of 3.5 with a zero known to more than 2 % of it (.07) is no index."""
    clean = made(tmp_path / "b", NDVI, *HEADS, kit=changed_column(
        "rednir-ground", "red", u_offset=0.069))
    assert clean.evaluated
    kit = changed_column("rednir-ground", "red", u_offset=0.071)
    one = made(tmp_path, NDVI, *HEADS, kit=kit)
    assert "less than 50 times the uncertainty of its zero" in one.note


def test_a_cone_that_lies_within_the_patch_sees_no_foreign_ground(tmp_path):
    """30 deg half-angle at 40 cm: a circle of 46 cm in a patch of 4 m."""
    one = made(tmp_path, NDVI, *HEADS, kit=changed("rednir-ground", half_angle_deg=30))
    assert inputs(one)["footprint_share"].value == 1.0
    assert sensitivities("ndvi", one.inputs)["around_error"] == 0.0


def test_an_unstated_field_of_view_is_taken_as_a_hemisphere_and_flagged(tmp_path):
    one = made(tmp_path, NDVI, *HEADS, kit=changed("rednir-ground", half_angle_deg=None))
    assert "field of view of rednir-ground not stated: a hemisphere taken" in one.flags
    assert inputs(one)["footprint_share"].value < 1


def test_a_patch_without_size_has_no_footprint(tmp_path):
    survey = small(tmp_path, [row(quantity="albedo", height_cm="40")], {"pair": lines("pair")})
    assert survey.estimates()[0].note == "width_m and length_m of patch 'C1' are missing"


def test_footprint_of_a_square(tmp_path):
    """4 m square below a cosine head at .5 m: .951 (ASTM E1918's geometry, computed)."""
    survey = small(tmp_path, [row(**ALBEDO)], {"pair": lines("pair")})
    (this,) = survey.passes
    assert footprint_share(this, this.channels["shortwave_up"], 0.5) == pytest.approx(
        0.9514, abs=5e-5)
