"""Weather, darks and sky of a pass, from small invented surveys."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from small_survey import ALBEDO, CERTAIN, DAY, KIT, NDVI, STAND_OFF, lines, readings, row, small

from surveykit.physics.sun import sun_track

NS = 1_000_000_000
N = 160


def thermal(root, sheet=(), weather=None, **more):
    logs = {"thermal": lines("thermal")} | ({"weather": weather} if weather else {})
    return small(root, [row(**STAND_OFF), *sheet], logs, **more)


def air(survey):
    return survey.day().weather("air_temperature", survey.passes[0])


def by_hand(start, reading, **more):
    return {"entry": "weather", "quantity": "air_temperature", "start": start,
            "reading": str(reading), **more}


# ---- weather

def test_logged_weather_is_averaged_over_the_pass(tmp_path):
    log = lines("weather", n=5, step_s=60, air=np.array([20, 30, 32, 40, 50]))
    made = air(thermal(tmp_path, weather=log))  # 12:00:20 to 12:02:20 holds 12:01 and 12:02
    assert made.value == pytest.approx(31 + 273.15)
    assert made.u == 0.5  # settings.temperature.air_temperature_u_k, engineering default
    assert made.scope == "weather:air:offset"


def test_logged_weather_around_the_pass_is_interpolated(tmp_path):
    """11:50 and 12:10 at 20 and 30 degC: 25.67 at 12:01:20, the middle of the pass."""
    log = lines("weather", start="11:50:00", n=2, step_s=1200, air=np.array([20, 30]))
    assert air(thermal(tmp_path, weather=log)).value == pytest.approx(20 + 10 * 680 / 1200 + 273.15)


@pytest.mark.parametrize(("start", "known"), [("11:31:00", True), ("11:29:00", False)])
def test_weather_reaches_half_an_hour(tmp_path, start, known):
    log = lines("weather", start=start, n=2, step_s=30)
    assert (air(thermal(tmp_path, weather=log)) is not None) == known


def test_weather_read_by_hand_is_interpolated_between_its_rows(tmp_path):
    rows = [row(**by_hand("11:51:20", 28, reading_u="0.8")),
            row(**by_hand("12:11:20", 30, reading_u="0.3"))]
    made = air(thermal(tmp_path, rows))
    assert made.value == pytest.approx(29 + 273.15)
    assert made.u == 0.8
    assert made.scope == f"yard-{DAY}:hand-read air_temperature"


def test_hand_read_weather_reaches_half_an_hour(tmp_path):
    near = thermal(tmp_path / "a", [row(**by_hand("12:31:00", 28))])
    far = thermal(tmp_path / "b", [row(**by_hand("12:32:00", 28))])
    assert air(near).value == pytest.approx(28 + 273.15)
    assert air(far) is None


def test_a_gain_error_of_the_air_sensor_counts_from_its_own_zero(tmp_path):
    """1 % of 30 degC is .3 K, not 1 % of 303 K."""
    column = {"quantity": "air_temperature", "unit": "degC", "u_gain": 0.01}
    kit = KIT | {"weather": KIT["weather"] | {"columns": KIT["weather"]["columns"] | {
        "air": column}}}
    log = lines("weather", n=5, step_s=60, air=np.full(5, 30.0))
    assert air(thermal(tmp_path, weather=log, kit=kit)).u == pytest.approx(0.3)


# ---- darks

def dark_survey(root, *rows, sky=None, **more):
    """Sky and ground with dark readings of 4 and 2 W m-2 at both ends of the log."""
    capped = (np.arange(N) < 15) | (np.arange(N) >= 145)
    sky = readings("sky", N, 1) if sky is None else sky
    low = np.random.default_rng(2).normal(0, 0.01, N)
    logs = {"pair": lines("pair", sky=np.where(capped, low, sky) + 4,
                          ground=np.where(capped, low, readings("ground", N, 1)) + 2)}
    base = rows or (row(entry="dark", instrument="pair", start="12:00:02", stop="12:00:12"),
                    row(entry="dark", quantity="albedo", start="12:02:27", stop="12:02:37"))
    return small(root, [row(**ALBEDO), *base], logs, **more)


def test_darks_are_taken_off(tmp_path):
    settings = CERTAIN | {"albedo": {"correct_surroundings": False, "correct_self_shade": False}}
    made = dark_survey(tmp_path, settings=settings).by_name()["C1-albedo-1"]
    assert made.value_raw == pytest.approx(182 / 904, rel=1e-3)
    assert made.value == pytest.approx(180 / 900, rel=1e-3)
    assert "no dark reading" not in made.flags
    assert dict(made.steps) == {"raw": made.value_raw, "dark readings": made.value}


def test_darks_are_interpolated_and_their_course_is_in_their_u(tmp_path):
    """From 0 to 6 W m-2 between 12:00:07 and 12:02:31.5: a rectangular of that width is 1.73."""
    survey = dark_survey(tmp_path)
    log = survey.records["pair"].channels["sky"]
    log[145:] += 6.0
    day = survey.day()
    dark = day.darks["pair", "sky"]
    assert dark.value == pytest.approx([4, 10], abs=0.01)
    assert dark.u == pytest.approx(6 / np.sqrt(12), abs=0.01)
    middle = np.array([(dark.time_ns[0] + dark.time_ns[1]) / 2]).astype(np.int64)
    assert day.without_dark(day.channels["shortwave_down"][0], middle,
                            np.array([907.0])) == pytest.approx([900.0], abs=0.01)


def test_a_dark_row_gives_way_by_the_uncertainty_of_its_times(tmp_path):
    """Capped for ten seconds and written without seconds: nothing is certainly dark."""
    settings = {"passes": {"sheet_u_s": 5.0}}
    row_of = {"entry": "dark", "instrument": "pair", "start": "12:00:02", "stop": "12:00:14"}
    sure = dark_survey(tmp_path / "a", row(**row_of), settings=settings).day()
    assert sure.darks["pair", "sky"].time_ns.size == 1
    unsure = dark_survey(tmp_path / "b", row(**row_of | {"start": "12:00", "stop": "12:01"}),
                         settings=settings).day()
    assert unsure.darks["pair", "sky"] is None


def test_a_dark_row_of_another_quantity_is_not_this_heads(tmp_path):
    other = row(entry="dark", quantity="ndvi", start="12:00:02", stop="12:00:12")
    assert dark_survey(tmp_path, other).day().darks["pair", "sky"] is None


# ---- sky

def sky_of(root, share, wobble=0.0, **more):
    """Light as a share of the modelled clear sky, with a slow wobble."""
    time = np.datetime64(f"{DAY}T12:00:00", "ns").astype(np.int64) + np.arange(N) * NS
    clear = sun_track(time, 41.3, -7.75, 120).clear_sky_w_m2
    sky = clear * (share + wobble * np.sin(np.arange(N) / 20))
    survey = small(root, [row(**ALBEDO)], {"pair": lines("pair", sky=sky, ground=sky / 5)}, **more)
    return survey.day().sky(survey.passes[0].start_ns, survey.passes[0].stop_ns)


@pytest.mark.parametrize(("share", "wobble", "kind"), [
    (1.0, 0.0, "clear"), (0.86, 0.0, "clear"), (1.09, 0.0, "clear"), (1.11, 0.0, "mixed"),
    (0.84, 0.0, "mixed"), (0.56, 0.0, "mixed"),
    (0.54, 0.0, "diffuse"), (0.95, 0.2, "mixed"), (0.3, 0.1, "diffuse")])
def test_sky_classes(tmp_path, share, wobble, kind):
    """Limits .85 to 1.10 and .55 of a clear sky, steady within 5 % (engineering defaults)."""
    sky = sky_of(tmp_path, share, wobble)
    assert sky.kind == kind
    assert sky.clear_index == pytest.approx(share, abs=0.15)


def test_a_hand_over_the_head_does_not_make_a_cloud(tmp_path):
    log = lines("pair")
    for i in range(60, 70):
        log[i] = log[i].split(",")[0] + ",200,40"
    survey = small(tmp_path, [row(**ALBEDO)], {"pair": log})
    assert survey.day().sky(survey.passes[0].start_ns, survey.passes[0].stop_ns).kind == "clear"


def test_nobody_watched_the_sky(tmp_path):
    logs = {name: lines(name) for name in ("rednir-sky", "rednir-ground")}
    survey = small(tmp_path, [row(**NDVI)], logs)
    sky = survey.day().sky(survey.passes[0].start_ns, survey.passes[0].stop_ns)
    assert sky.kind == ""
    assert np.isnan(sky.irradiance_w_m2)


# ---- largest reading

def test_the_largest_reading_is_a_good_one_less_its_dark(tmp_path):
    sky = readings("sky", N, 1)
    sky[45:65] *= 1.1  # longer than a spike
    top = sky.max()
    sky[80] = 2500.0  # out of range
    survey = dark_survey(tmp_path, sky=sky)
    day = replace(survey.day(), passes=survey.passes)
    assert day.largest["pair", "sky"] == pytest.approx(top, abs=0.1)
