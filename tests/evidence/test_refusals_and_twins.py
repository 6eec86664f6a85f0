"""Refusals and gates of a pass that no other file reaches: each with its fault and its clean twin.

Limits are engineering defaults of the settings; light, temperatures and readings are invented.
"""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import HEADS, WEATHER, albedo, changed, changed_column, made, stand_off
from small_survey import (
    ALBEDO,
    CERTAIN,
    CONTACT,
    NDVI,
    SITE,
    STAND_OFF,
    lines,
    readings,
    row,
    small,
)

from surveykit.physics.bands import band
from surveykit.physics.surroundings import sky_radiance

ICE = 273.15
B = band(8.0, 14.0)
SKY = float(sky_radiance(B, 303.15, 0.30))
CALM = np.resize([0.01, -0.01], 400)


# ---- temperature

def paired(root, emissivity):
    """A pass on ground of an emissivity that a reference thermometer on the spot tells."""
    read = float(B.temperature_k(emissivity * B.radiance(50 + ICE) + (1 - emissivity) * SKY)) - ICE
    reference = row(entry="reference", surface="court", patch="C1", instrument="thermal",
                    start="12:03:20", stop="12:04:00", reading="50.0", reading_u="0.3")
    logs = {"thermal": lines("thermal", n=400, target=read + CALM),
            "weather": lines("weather", n=8, step_s=60)}
    wide = CERTAIN | {"temperature": {"pair_max_half_width": 0.3}}
    return small(root, [row(**STAND_OFF), reference], logs, settings=wide, surfaces={"court": {
        "label": "Court", "emissivity": {"from": "reference_pairs"}}}).by_name()["C1-standoff-1"]


def placed(root, *records, colder=0.0):
    """Placements of so many records, one in 2 s, on ground in the sun, lifted for 6 s in between.

    Those of fewer than 8 records are `colder` by so many kelvins.
    """
    target = np.resize(np.concatenate([np.append(
        47 - 0.1 * np.sqrt(2.0 * np.arange(n)) - colder * (n < 8), [32.0] * 3)
        for n in records]), 80)
    logs = {"thermal": lines("thermal", n=80, step_s=2, target=target + CALM[:80]),
            "pair": lines("pair"), "weather": lines("weather", n=5, step_s=60)}
    kit = changed("thermal", interval_s=2)
    settings = CERTAIN | {"quality": {"flatline_max_repeat": 0.999}}
    cells = CONTACT | {"start": "12:00:01", "stop": "12:02:30"}
    (one,) = small(root, [row(**cells)], logs, kit=kit, settings=settings).estimates()
    return one


# ---- albedo

DISC = {"quantity": "albedo", "height_cm": "12", "length_m": "1"}


def beside(root, around):
    """A patch of 1 m below a head at 12 cm, in ground of another albedo: 5.5 % of the view."""
    return albedo(root, DISC, kit=changed("pair", head_radius_cm=1.2), surfaces={
        "court": {"label": "Court", "around": {"albedo": around, "u": 0.02}}})


def with_dark(root, level):
    """Little light, and a cap below which the sky head reads `level`."""
    capped = np.arange(160) < 15
    sky = np.where(capped, level + 0.01 * CALM[:160], 60 + 0.1 * CALM[:160])
    ground = np.where(capped, 0.01 * CALM[:160], 12 + 0.1 * CALM[:160])
    dark = row(entry="dark", instrument="pair", start="12:00:02", stop="12:00:12")
    return small(root, [row(**ALBEDO), dark], {"pair": lines("pair", sky=sky, ground=ground)},
                 settings=CERTAIN | {"quality": {"flatline_max_repeat": 0.999}}
                 ).by_name()["C1-albedo-1"]


# ---- index

def bands(root, *, ground=1.0, sky=None, shake=0.0, site=SITE, zero=0.0):
    """Two heads; `ground` scales what comes up, `sky` the light, `shake` the dark reading."""
    share = np.ones(160) if sky is None else sky
    capped = (np.arange(160) < 15) & (shake > 0)
    wobble = shake * np.random.default_rng(4).standard_normal(160)
    logs = {name: lines(name, **{b: np.where(
        capped, 0.05 + wobble, share * readings(f"{name}.{b}", 160, 1) * (
            ground if name.endswith("ground") else 1.0) - (
            zero if name.endswith("ground") else 0.0)) for b in ("red", "nir")}) for name in HEADS}
    sheet = [row(**NDVI)] + [row(entry="dark", instrument=name, start="12:00:02", stop="12:00:12")
                             for name in HEADS if shake > 0]
    return small(root, sheet, logs, site=site).by_name()["C1-ndvi-1"]


def dimmed(share):
    """Light that falls to a share of the day's largest for all of the pass."""
    return np.where(np.arange(160) < 18, 1.0, share)


# what is told of the fault: (with the fault, without it)
TWINS = {
    "outside what is supported": (lambda r: paired(r, 0.50), lambda r: paired(r, 0.70)),
    "no placement has 5 records and five time constants": (
        lambda r: placed(r, 5), lambda r: placed(r, 8)),
    "foreign ground and the head's own shade change the albedo by": (
        lambda r: beside(r, 0.90), lambda r: beside(r, 0.25)),
    "the irradiance of the pass does not sum to more than zero": (
        lambda r: with_dark(r, 70.0), lambda r: with_dark(r, 0.5)),
    "red and near-infrared of the pass do not sum to more than zero": (
        lambda r: bands(r, ground=0.02, zero=0.6), bands),
    "20 times the scatter of its dark reading": (
        lambda r: bands(r, shake=0.25), lambda r: bands(r, shake=0.005)),
    "most as: too little light": (
        lambda r: bands(r, sky=dimmed(0.09)), lambda r: bands(r, sky=dimmed(0.5))),
    "degrees high, lower than the method's limit": (
        lambda r: bands(r, site=SITE | {"longitude": -95.0}), bands),
}


@pytest.mark.parametrize("told", TWINS)
def test_a_fault_refuses_its_pass_and_its_twin_has_a_value(tmp_path, told):
    faulty, clean = (make(tmp_path / name) for make, name in zip(
        TWINS[told], ("faulty", "clean"), strict=True))
    assert told in faulty.note
    assert np.isnan(faulty.value)
    assert clean.evaluated, clean.note
    assert np.isfinite(clean.value)


@pytest.mark.parametrize(("around", "effect"), [(0.30, 0.03), (0.60, 0.13)])
def test_shade_and_surroundings_up_to_ten_per_cent_are_corrected(tmp_path, around, effect):
    """Corrected up to 10 %, left in the uncertainty up to 20: by the view factor .9455 and the
    contrast (hand arithmetic: c (1 - F), and some .3 % of shade)."""
    one = beside(tmp_path, around)
    corrected = not any("not corrected" in f for f in one.flags)
    patch = (0.2 - 0.0545 * around) / 0.9455
    assert 0.0545 * abs(around - patch) / patch == pytest.approx(effect, abs=0.005)
    assert corrected == (effect < 0.10)
    if corrected:
        assert one.value == pytest.approx(patch, abs=0.002)


def test_head_without_its_setting_and_with_it(tmp_path):
    """An unknown emissivity setting is refused; stated as 1, the same log has its temperature."""
    none = made(tmp_path / "a", STAND_OFF, "thermal", logs=WEATHER,
                kit=changed_column("thermal", "target", emissivity_setting=None))
    assert none.note == "emissivity_setting of thermal, target is missing"
    assert stand_off(tmp_path / "b").evaluated


def test_a_placement_too_short_for_the_fit_is_left_out_whole(tmp_path):
    """Of 8 and 5 records in turn, the short ones 6 K colder: they neither move the mean nor give
    their times to others (each 8 records long, less one a side)."""
    alike, colder = placed(tmp_path / "a", 8, 5), placed(tmp_path / "b", 8, 5, colder=6.0)
    long = placed(tmp_path / "c", 8)
    for one in (alike, colder):
        assert one.evaluated, one.note
        assert one.n_effective == len(one.dwells) == 4
        assert {d[4] for d in one.dwells} == {d[4] for d in long.dwells}
        assert one.value == pytest.approx(long.value, abs=0.06)
    assert [d[:3] for d in alike.dwells] == [d[:3] for d in colder.dwells]
    assert alike.value_raw == colder.value_raw
