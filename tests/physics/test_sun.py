"""The sun against the published example, astropy, and open data."""

from __future__ import annotations

import astropy.units as units
import numpy as np
import pytest
from astropy.coordinates import AltAz, EarthLocation, get_sun
from astropy.time import Time
from astropy.utils import iers
from checks import check

from surveykit.physics import sun

SECOND = 1_000_000_000


def ns(*texts):
    return np.array(texts, dtype="datetime64[ns]").astype(np.int64)


def test_sun_position_published_example():
    # NREL/TP-560-34302, appendix A.5
    one = check("spa")
    given = one.input
    got = sun.sun_position(ns(given["utc"]), given["lat"], given["lon"], given["alt_m"],
                           given["p_Pa"], given["T_C"], delta_t=given["delta_t"])
    assert got.apparent_zenith_deg[0] == pytest.approx(one.expected["apparent_zenith"], abs=one.tol)
    assert got.zenith_deg[0] == pytest.approx(one.expected["zenith"], abs=one.tol)
    assert got.azimuth_deg[0] == pytest.approx(one.expected["azimuth"], abs=one.tol)


@pytest.mark.parametrize(("latitude", "longitude"),
                         [(37.70, -105.92), (-33.0, 151.0), (60.0, 10.0)])
def test_sun_position_against_astropy(latitude, longitude):
    rng = np.random.default_rng(7)
    times = ns("2005-01-01") + rng.integers(0, 15 * 365 * 86_400, 40) * SECOND
    with iers.conf.set_temp("auto_download", False):
        place = EarthLocation.from_geodetic(longitude, latitude, 500.0)
        moment = Time(times.astype("datetime64[ns]"), scale="utc")
        seen = get_sun(moment).transform_to(AltAz(obstime=moment, location=place))
        azimuth, distance = seen.az.to_value(units.deg), get_sun(moment).distance.to_value(units.au)
    got = sun.sun_position(times, latitude, longitude, 500.0, 0.0, 12.0)
    np.testing.assert_allclose(got.zenith_deg, 90 - seen.alt.to_value(units.deg), atol=0.005)
    turn = (got.azimuth_deg - azimuth + 180) % 360 - 180
    np.testing.assert_allclose(turn * np.sin(np.radians(got.zenith_deg)), 0, atol=0.005)
    track = sun.sun_track(times, latitude, longitude, 500.0)
    np.testing.assert_allclose(track.extraterrestrial_w_m2, 1361 / distance**2, rtol=2e-4)


def test_track_against_a_station():
    # SURFRAD (NOAA), Alamosa CO, 37.70 N 105.92 W, 2317 m, 2016-01-01: apparent zenith as filed;
    # morning and afternoon agree best with the middle of the averaged minute, 30 s before its label
    clocks = ("16:30", "17:30", "19:07", "21:00", "22:30")
    times = ns(*(f"2016-01-01T{clock}" for clock in clocks))
    got = sun.sun_track(times - 30 * SECOND, 37.70, -105.92, 2317.0)
    np.testing.assert_allclose(got.zenith_deg, [71.06, 64.86, 60.66, 66.14, 76.99], atol=0.04)


def test_clear_sky_against_a_clear_day():
    # same station, 19:07 UTC +- 60 min, n 121, clear and very dry: mean 569.3 W m-2
    times = ns("2016-01-01T18:07") + 60 * SECOND * np.arange(121)
    index = 569.3 / sun.sun_track(times, 37.70, -105.92, 2317.0).clear_sky_w_m2.mean()
    assert 0.85 < index < 1.25


def test_a_wrong_sign_of_longitude_puts_noon_into_the_night():
    noon = ns("2016-01-01T19:07")
    assert sun.sun_track(noon, 37.70, -105.92, 2317.0).zenith_deg[0] < 61
    assert sun.sun_track(noon, 37.70, +105.92, 2317.0).zenith_deg[0] > 90


@pytest.mark.parametrize(("date", "hours"), [("2023-06-21", 6.7), ("2023-03-20", 3.0),
                                             ("2023-12-21", 0.0)])
def test_hours_of_high_sun(date, hours):
    # computed: zenith below 45 deg at 40 N
    zenith = sun.sun_track(ns(date) + 60 * SECOND * np.arange(1440), 40.0, 0.0, 0.0).zenith_deg
    assert np.count_nonzero(zenith < 45) / 60 == pytest.approx(hours, abs=0.06)


def test_an_hour_off_moves_the_sun_by_eleven_degrees():
    # computed: 40 N, 21 June, 10 h against 9 h local mean time
    times = ns("2023-06-21T10:00", "2023-06-21T09:00")
    got = sun.sun_track(times, 40.0, 0.0, 0.0).zenith_deg
    np.testing.assert_allclose(got, [30.5, 41.5], atol=0.1)


def test_interpolated_track_is_the_direct_one():
    start = ns("2024-06-20")[0]
    times = start + np.arange(0, 86_400, 7) * SECOND + 123_456_789
    fine = sun.sun_track(times, 40.0, -105.0, 1500.0)
    some = np.random.default_rng(1).permutation(times.size)[:300]
    direct = sun.sun_track(times[some], 40.0, -105.0, 1500.0)
    high = direct.zenith_deg < 88
    for got, expected, within in zip(fine, direct, (2e-4, 2e-4, 3e-6, 1e-6, 0.02), strict=True):
        np.testing.assert_allclose(got[some][high], expected[high], atol=within)
    low = ~high
    np.testing.assert_allclose(fine.zenith_deg[some][low], direct.zenith_deg[low], atol=0.3)
    assert fine.clear_sky_w_m2.min() >= 0
    np.testing.assert_allclose(np.cos(np.radians(fine.zenith_deg)), fine.cos_zenith, atol=1e-12)


def test_azimuth_does_not_jump_through_south_at_north():
    # southern summer: the noon sun crosses north, 360 -> 0 deg, between two grid minutes
    times = ns("2024-01-10T11:30") + np.arange(3600 * 2) * SECOND
    azimuth = sun.sun_track(times, -40.0, 0.0, 0.0).azimuth_deg
    assert (np.minimum(azimuth, 360 - azimuth) < 60).all()
    assert (azimuth < 60).any()
    assert (azimuth > 300).any()


def test_track_keeps_shape_and_gaps():
    assert sun.sun_track(np.array([], dtype=np.int64), 40.0, 0.0, 0.0).zenith_deg.shape == (0,)
    times = np.array([sun.MISSING_NS, ns("2024-06-20T12:00")[0]])
    got = sun.sun_track(times, 40.0, 0.0, 0.0)
    assert np.isnan(got.zenith_deg[0])
    assert got.zenith_deg[1] < 30
    assert np.isnan(sun.sun_track(times[:1], 40.0, 0.0, 0.0)).all()


def test_errors_name_what_is_wrong():
    with pytest.raises(ValueError, match="integer ns since the epoch"):
        sun.sun_track(np.array([1.5]), 40.0, 0.0, 0.0)
    with pytest.raises(ValueError, match=r"latitude within \+-90 .* got 140.0"):
        sun.sun_track(ns("2024-06-20"), 140.0, 0.0, 0.0)
