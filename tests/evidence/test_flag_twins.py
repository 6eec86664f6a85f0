"""Flags of a pass: a survey with one fault raises the flag, the same without the fault does not."""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import HEADS, UNTOUCHED, WEATHER, albedo, changed, made, stand_off
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

CALM = np.resize([0.01, -0.01], 400)
EARLIER = STAND_OFF | {"start": "12:00:20", "stop": "12:02:20"}
HOURLY = {"weather": lines("weather", n=8, step_s=60)}


def west(longitude):
    return SITE | {"longitude": longitude}


def with_row(root, sheet, *, value=None, more=None):
    """A stand-off pass, then 40 s of another reading under a row of the sheet."""
    target = np.full(400, 47.0) + CALM
    if value is not None:
        target[200:240] = value + CALM[:40]
    logs = HOURLY | {"thermal": lines("thermal", n=400, target=target)} | (more or {})
    return small(root, [row(**EARLIER), *sheet], logs).by_name()["C1-standoff-1"]


def foil(root, value):
    sheet = row(entry="foil", instrument="thermal", start="12:03:20", stop="12:04:00", reading="35")
    return with_row(root, [sheet], value=value)


def sky_of(root, share):
    """The same pass under a share of the clear sky's light."""
    return with_row(root, [], more={"pair": lines("pair", n=400, sky=share * readings(
        "sky", 400, 1), ground=share * readings("ground", 400, 1))})


def green(root, nir):
    """Emissivity from NDVI, of ground whose near infrared is so much brighter than its red."""
    logs = WEATHER | {"thermal": lines("thermal")} | {
        name: lines(name, **{b: level * (1 + 0.02 * CALM[:160]) for b, level in some.items()})
        for name, some in zip(HEADS, ({"red": 70.0, "nir": 70.0}, {"red": 7.0, "nir": nir}),
                              strict=True)}
    sheet = [row(**STAND_OFF), row(**NDVI)]
    surfaces = {"court": {"label": "Court", "emissivity": {
        "from": "ndvi", "vegetation": 0.99, "soil": 0.95, "u": 0.01}}}
    return small(root, sheet, logs, surfaces=surfaces).by_name()["C1-standoff-1"]


def over_panels(root, second):
    """Two panel rows, the second read `second` times as bright in the near infrared."""
    at = np.arange(330)
    ground = {b: np.where(at < 150, readings(f"rednir-ground.{b}", 330, 1), 0.5 * np.where(
        (at > 240) & (b == "nir"), second, 1.0) * readings(f"rednir-sky.{b}", 330, 1))
        for b in ("red", "nir")}
    panels = [row(entry="panel", instrument="rednir-ground", start=a, stop=b, reading="0.5")
              for a, b in (("12:02:35", "12:03:50"), ("12:04:10", "12:05:20"))]
    logs = {"rednir-sky": lines("rednir-sky", n=330),
            "rednir-ground": lines("rednir-ground", n=330, **ground)}
    return small(root, [row(**NDVI), *panels], logs).by_name()["C1-ndvi-1"]


def pressed(root, sun, **settings):
    off = CERTAIN | {"temperature": {"correct_head_cooling": False, **settings}}
    target = 47 + 0.02 * (readings("target", 160, 1) - 47)
    log = {"pair": lines("pair", sky=sun * readings("sky", 160, 1),
                         ground=sun * readings("ground", 160, 1))}
    return stand_off(root, CONTACT, logs=WEATHER | log | {"thermal": lines(
        "thermal", target=target)}, settings=off)


def capped(root, dark):
    """A cap on for the first seconds, written on the sheet or not."""
    sheet = [row(**ALBEDO)] + [row(entry="dark", instrument="pair", start="12:00:02",
                                   stop="12:00:12")] * dark
    off = np.arange(160) < 15
    log = {"pair": lines("pair", **{c: np.where(off, 0.5 * CALM[:160], readings(c, 160, 1))
                                    for c in ("sky", "ground")})}
    return small(root, sheet, log).by_name()["C1-albedo-1"]


DIM = {"pair": lines("pair", sky=0.4 * readings("sky", 160, 1),
                     ground=0.4 * readings("ground", 160, 1))}
def green_under(root, share):
    """NDVI with a shortwave head beside it that watches the sky."""
    pair = {c: share * readings(c, 160, 1) for c in ("sky", "ground")}
    return made(root, NDVI, *HEADS, logs={name: lines(name) for name in HEADS} | {
        "pair": lines("pair", **pair)})


NARROW = changed("rednir-ground", half_angle_deg=30)
# flag: (with the fault, without it)
TWINS = {
    "NDVI outside the range of the vegetation fraction": (
        lambda r: green(r, 7.7), lambda r: green(r, 14.0)),  # NDVI .05 and .33, from .2
    "cloud in the sky model": (lambda r: sky_of(r, 0.6), lambda r: sky_of(r, 1.0)),
    "sky neither clear nor overcast: 60% of a clear one": (
        lambda r: green_under(r, 0.65), lambda r: green_under(r, 1.0)),
    "foil reading outside the instrument's range": (
        lambda r: foil(r, -60.0), lambda r: foil(r, -8.0)),
    "head cooling not corrected": (
        lambda r: pressed(r, 0.3, head_cooling_max_k=9.0), lambda r: pressed(r, 0.03)),
    "walls not measured": (
        lambda r: stand_off(r, site=SITE | {"sky_view": 0.8}),
        lambda r: stand_off(r, site=SITE | {"sky_view": 0.8, "walls": {"temperature_degC": 40}})),
    "sun lower than 45 degrees": (
        lambda r: albedo(r, site=west(-60.0)), lambda r: albedo(r, site=west(-7.75))),
    "sun lower than 30 degrees: indicative only": (
        lambda r: albedo(r, site=west(-75.0), logs=DIM),
        lambda r: albedo(r, site=west(-60.0), logs=DIM)),
    "no dark reading": (lambda r: capped(r, False), lambda r: capped(r, True)),
    "panel rows not used: their ratios scatter by more than 1%": (
        lambda r: over_panels(r, 1.05), lambda r: over_panels(r, 1.0)),
    "gain ratio not checked by panel or swap": (
        lambda r: made(r, NDVI, *HEADS), lambda r: over_panels(r, 1.0)),
    "albedo around the patch not stated": (
        lambda r: albedo(r, surfaces={"court": {"label": "Court"}}), albedo),
    "head radius not stated": (
        lambda r: albedo(r, kit=changed("pair", head_radius_cm=None)), albedo),
    "field of view of pair not stated: a hemisphere taken": (
        lambda r: albedo(r, kit=changed("pair", half_angle_deg=None)), albedo),
    "no calibration stated": (lambda r: albedo(r, kit=changed("pair", calibration=None)), albedo),
    "calibration expired": (
        lambda r: albedo(r, kit=changed("pair", calibration={
            "id": "pair", "date": "2020-01-20", "valid_days": 365})), albedo),
    "surroundings not corrected": (
        lambda r: made(r, NDVI, *HEADS), lambda r: made(r, NDVI, *HEADS, kit=NARROW)),
    "own shade not corrected": (lambda r: albedo(r, settings=CERTAIN | UNTOUCHED), albedo),
    "side of the rod not written: its shade is left out": (
        lambda r: albedo(r, kit=changed("pair", rod_width_cm=1.5)),
        lambda r: albedo(r, ALBEDO | {"rod_side": "away"}, kit=changed("pair", rod_width_cm=1.5))),
    "shade and surroundings above 10%: not corrected": (
        lambda r: albedo(r, ALBEDO | {"height_cm": "5"}, kit=changed("pair", head_radius_cm=2.4)),
        lambda r: albedo(r, ALBEDO | {"height_cm": "5"})),
}


@pytest.mark.parametrize("flag", TWINS)
def test_a_fault_raises_its_flag_and_its_twin_does_not(tmp_path, flag):
    faulty, clean = (make(tmp_path / name) for make, name in zip(
        TWINS[flag], ("faulty", "clean"), strict=True))
    assert faulty.evaluated, faulty.note
    assert clean.evaluated, clean.note
    assert flag in faulty.flags
    assert flag not in clean.flags
