"""Classes A, B and C of a pair of dates: each reason alone, and none.

The limits are engineering defaults of the settings.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from pass_values import CLEAR, CLOUD, albedo, date, kelvin, ndvi, one_pass

from surveykit.evidence.comparability import comparability, sky_of
from surveykit.evidence.conditions import Sky

BROKEN = Sky(700.0, 0.7, "mixed")
UNSEEN = Sky()
MAKE = {"temperature": lambda: kelvin(320.0), "albedo": lambda: albedo(0.2),
        "ndvi": lambda: ndvi(0.05, 0.4)}


def one_date(name, quantity="temperature", *, control=True, kit=None, stated=None, **passes):
    """Return a date with a court and, unless said otherwise, a control 15 K above the air."""
    some = [one_pass(MAKE[quantity](), surface=surface, patch=f"{surface}{n}", n=n,
                     quantity=quantity, kind="clear" if quantity == "albedo" else None,
                     **({"air_k": 305.0} | passes), **(kit or {}))
            for surface in (("court", "control") if control else ("court",)) for n in (1, 2)]
    return date(some, name, **(stated or {}))


def graded(now, then, quantity="temperature"):
    kind = {"temperature": "stand-off", "albedo": "clear", "ndvi": ""}[quantity]
    new, old = now.groups["court", quantity, kind], then.groups["court", quantity, kind]
    pair = [d.groups.get(("control", quantity, kind)) for d in (now, then)]
    return comparability(now, then, new, old, tuple(pair) if all(pair) else None)


def test_matched_dates_have_no_reason():
    for quantity in MAKE:
        grade = graded(one_date("june", quantity), one_date("may", quantity), quantity)
        assert (grade.letter, grade.word, grade.reasons) == ("A", "matched", ())


CASES = {  # what the later date has otherwise: letter, the reason
    "another sky": ({"sky": CLOUD, "zenith_deg": 30},
                    "C", "the sky differs: overcast now, clear on may"),
    "wet ground": ({"stated": {"rain": 1.5}}, "C", "wet ground on june: 1.5 mm of rain in 48 h"),
    "some rain": ({"stated": {"rain": 0.5}}, "B", "0.5 mm of rain in the 48 h before june"),
    "rain not stated": ({"stated": {"rain": None}}, "B", "rain before june not stated"),
    "sun": ({"zenith_deg": 36.0}, "B", "cosine of the zenith angle differs by 0.06"),
    "irradiance": ({"sky": replace(CLEAR, irradiance_w_m2=1000.0)}, "B",
                   "irradiance differs by 11%"),
    "wind": ({"wind_m_s": 3.1}, "B", "wind differs by 1.1 m s-1"),
    "wind not known": ({"wind_m_s": np.nan}, "B", "wind not known on both dates"),
    "no control": ({"control": False}, "C", "no control with an interval on both dates"),
    "control near the air": ({"air_k": 312.5}, "C",
                             "the control is only 7.5 K above the air on june"),
    "air missing": ({"air_k": None}, "C", "air temperature on june is missing"),
}


@pytest.mark.parametrize("name", CASES)
def test_each_reason_alone(name):
    changed, letter, reason = CASES[name]
    sky = changed.get("sky", CLEAR)
    then = one_date("may")
    grade = graded(one_date("june", **changed), then)
    others = [r for r in grade.reasons if r != reason]
    assert grade.letter == letter
    assert reason in grade.reasons
    if sky.kind == "clear":
        assert others == []
    else:  # an overcast sky has another irradiance too
        assert others == ["irradiance differs by 67%"]


@pytest.mark.parametrize("name", ["sun", "irradiance", "wind"])
def test_just_within_the_limits_is_matched(name):
    near = {"sun": {"zenith_deg": 35.0}, "irradiance": {"sky": replace(
        CLEAR, irradiance_w_m2=985.0)}, "wind": {"wind_m_s": 2.9}}[name]
    assert graded(one_date("june", **near), one_date("may")).letter == "A"


def test_both_rain_limits_count():
    """Matched up to rain_max_mm, wet above wet_rain_mm, lowered in between."""
    limits = {"comparison": {"rain_max_mm": 0.6, "wet_rain_mm": 2.0}}

    def letter(rain):
        return graded(one_date("june", stated={"rain": rain, "settings": limits}),
                      one_date("may")).letter

    assert [letter(rain) for rain in (0.6, 0.7, 2.0, 2.1)] == ["A", "B", "B", "C"]


def test_the_earlier_dates_rain_counts_too():
    grade = graded(one_date("june"), one_date("may", stated={"rain": 5.0}))
    assert grade.reasons == ("wet ground on may: 5 mm of rain in 48 h",)


def test_broken_sky_on_both_dates_is_partly_matched():
    grade = graded(one_date("june", sky=BROKEN), one_date("may", sky=BROKEN))
    assert (grade.letter, grade.reasons) == ("B", ("broken sky on both dates",))


def test_the_stated_sky_stands_in_where_nobody_watched():
    seen = one_date("may", sky=UNSEEN, stated={"sky": "overcast"})
    assert sky_of(seen, seen.groups["court", "temperature", "stand-off"]) == "diffuse"
    grade = graded(one_date("june"), seen)
    assert "the sky differs: clear now, overcast on may" in grade.reasons
    unknown = one_date("may", sky=UNSEEN, stated={"sky": None})
    assert "the sky was neither watched nor stated on both dates" in graded(
        one_date("june"), unknown).reasons


def test_irradiance_and_wind_do_not_matter_to_albedo_and_ndvi():
    changed = {"sky": replace(CLEAR, irradiance_w_m2=500.0), "wind_m_s": 8.0, "air_k": None}
    for quantity in ("albedo", "ndvi"):
        grade = graded(one_date("june", quantity, **changed), one_date("may", quantity), quantity)
        assert grade.letter == "A"


def test_albedo_without_control_is_partly_matched_at_best():
    grade = graded(one_date("june", "albedo", control=False), one_date("may", "albedo"), "albedo")
    assert (grade.letter, grade.reasons) == ("B", ("no control with an interval on both dates",))


def test_ndvi_of_other_bands_is_not_comparable():
    other = {"band_centres_nm": {"red": 670, "nir": 810}}
    grade = graded(one_date("june", "ndvi", kit=other), one_date("may", "ndvi"), "ndvi")
    assert (grade.letter, grade.reasons) == ("C", ("the bands differ",))


def test_ndvi_of_unstated_bands_is_partly_matched():
    none = {"band_centres_nm": None, "band_widths_nm": None}
    grade = graded(one_date("june", "ndvi", kit=none), one_date("may", "ndvi", kit=none), "ndvi")
    assert (grade.letter, grade.reasons) == ("B", ("the bands are not stated",))
