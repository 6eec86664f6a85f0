"""Who watched the sky, and what a change of light says of temperatures. Invented readings."""

from __future__ import annotations

import numpy as np
from small_survey import ALBEDO, CERTAIN, CONTACT, KIT, NDVI, STAND_OFF, lines, readings, row, small

SHEET = [row(**STAND_OFF)]  # 12:00:20 to 12:02:20
HISTORY, STEADY = "irradiance history", "sky not steady"


def bands(dip_at=None, share=0.75):
    """Both red and near-infrared heads; light falls to a share for 20 s from a second on."""
    at = np.arange(160)
    fall = np.ones(160) if dip_at is None else np.where(
        (at >= dip_at) & (at < dip_at + 20), share, 1.0)
    return {name: lines(name, **{band: fall * readings(f"{name}.{band}", 160, 1)
                                 for band in ("red", "nir")})
            for name in ("rednir-sky", "rednir-ground")}


def told(survey, check):
    checks = survey.quality().checks
    return checks[checks.check == check]


def test_red_and_near_infrared_stand_in_for_a_shortwave_head(tmp_path):
    """A fall by 25 % of the day's largest light is 250 of 1000 W m-2: more than 150."""
    logs = {"thermal": lines("thermal"), **bands(dip_at=100)}
    rows = told(small(tmp_path, SHEET, logs), HISTORY)
    assert rows["pass"].tolist() == ["C1-standoff-1"]
    assert rows.column.tolist() == ["target"]
    assert 35 <= rows.records.iloc[0] <= 50  # from second 100, to the stretch, until 140


def test_a_fall_below_the_limit_is_no_history(tmp_path):
    logs = {"thermal": lines("thermal"), **bands(dip_at=100, share=0.9)}
    assert told(small(tmp_path, SHEET, logs), HISTORY).empty


def test_a_shortwave_head_comes_before_the_bands(tmp_path):
    logs = {"thermal": lines("thermal"), "pair": lines("pair"), **bands(dip_at=100)}
    assert told(small(tmp_path, SHEET, logs), HISTORY).empty


def test_without_a_head_that_looks_up_the_sky_was_not_watched(tmp_path):
    rows = told(small(tmp_path, SHEET, {"thermal": lines("thermal")}), HISTORY)
    assert rows.severity.tolist() == ["flag"]
    assert rows.message.iloc[0].startswith("the sky was not watched: ")
    assert rows["pass"].tolist() == [""]


def test_nobody_asks_who_watched_the_sky_where_no_temperature_was_taken(tmp_path):
    survey = small(tmp_path, [row(**NDVI)], bands())
    assert told(survey, HISTORY).empty


def test_a_cap_is_no_cloud(tmp_path):
    """Caps go on 8 s before the written row and come off 8 s after it; heads of 1 s respond."""
    at = np.arange(160)
    light = np.where((at >= 22) & (at < 58), 0.0, 1.0)
    seen = np.empty(160)
    for i in range(160):
        seen[i] = light[i] if i == 0 else seen[i - 1] + (light[i] - seen[i - 1]) * (1 - np.exp(-1))
    pair = lines("pair", sky=seen * readings("sky", 160, 1),
                 ground=seen * readings("ground", 160, 1))
    dark = row(entry="dark", instrument="pair", start="12:00:30", stop="12:00:50")
    kit = KIT | {"pair": KIT["pair"] | {"time_constant_s": 1.0}}
    survey = small(tmp_path, [row(**STAND_OFF, start="12:01:10"), dark],
                   {"thermal": lines("thermal"), "pair": pair}, kit=kit)
    assert told(survey, HISTORY).empty


def test_a_cover_row_caps_every_head(tmp_path):
    cover = row(entry="cover", start="12:01:00", stop="12:01:10")
    quality = small(tmp_path, [row(**ALBEDO), cover], {"pair": lines("pair")}).quality()
    rows = quality.ledger.set_index("reason").records
    assert rows["capped"] == 10


def test_a_drifting_sky_flags_albedo_and_leaves_it_its_records(tmp_path):
    """3 W m-2 in a second against a limit of 2 (engineering default)."""
    fall = 1 - np.arange(160) / 300
    logs = {"pair": lines("pair", sky=fall * readings("sky", 160, 1),
                          ground=fall * readings("ground", 160, 1))}
    quality = small(tmp_path, [row(**ALBEDO)], logs).quality()
    chosen = quality.passes["C1-albedo-1"]
    assert chosen.index.size == 120
    assert chosen.flags == (STEADY,)


def test_contact_readings_are_held_against_the_air_only_where_they_settled(tmp_path):
    """Lifts that look at what is 35 K colder do not count; a placement 50 K above the air does."""
    def pressed(level):
        target = level + (readings("target", 160, 1) - 47) / 4
        for start in (60, 100):
            target[start:start + 10] -= 35 * np.sin(np.pi * (np.arange(10) + 0.5) / 10)
        return {"thermal": lines("thermal", target=target),
                "weather": lines("weather", n=4, step_s=60)}

    usual = small(tmp_path / "a", [row(**CONTACT)], pressed(25.0), settings=CERTAIN).quality()
    assert set(usual.ledger.reason) == {"", "between placements"}
    hot = small(tmp_path / "b", [row(**CONTACT)], pressed(80.0), settings=CERTAIN).quality()
    assert "far from the air" in hot.passes["C1-contact-1"].refusal
    rows = hot.ledger.set_index("reason").records
    assert rows["far from the air"] > rows["pass not evaluated"]


def test_a_pass_after_the_watching_head_was_put_away_is_told(tmp_path):
    """The pair stops at 12:02:39; of the two passes only the one from 12:03 on was not watched."""
    logs = {"thermal": lines("thermal", n=400), "pair": lines("pair")}
    later = row(**STAND_OFF, start="12:03:00", stop="12:05:00")
    (message,) = told(small(tmp_path, [*SHEET, later], logs), HISTORY).message
    assert message.startswith("the sky was not watched during 1 of 2 temperature passes: ")


def test_at_night_there_is_no_light_that_could_have_changed(tmp_path):
    """The sun has set at 22:00 UTC in the west of Europe (common knowledge)."""
    logs = {"thermal": lines("thermal", start="22:00:00")}
    survey = small(tmp_path, [row(**STAND_OFF, start="22:00:20", stop="22:02:20")], logs)
    assert told(survey, HISTORY).empty
    assert survey.quality().passes["C1-standoff-1"].index.size == 120


def test_air_read_by_hand_stands_in_where_the_logged_one_ends(tmp_path):
    """Logged to 10:03, read by hand at 12:00: 10 degC, so ground at 80 degC is too far from it."""
    logs = {"thermal": lines("thermal", target=80 + (readings("target", 160, 1) - 47)),
            "weather": lines("weather", start="10:00:00", n=4, step_s=60)}
    hand = row(entry="weather", quantity="air_temperature", start="12:00:00", reading="10")
    found = told(small(tmp_path, [*SHEET, hand], logs), "far from the air")
    assert found.records.tolist() == [120]


def test_a_pair_turned_over_is_no_cloud(tmp_path):
    """The sky head looks at the ground from 12:01:27 to 12:02:53, the sheet says 12:01:35 to
    12:02:45; the pass begins at 12:03:10 under a steady sky."""
    sky, ground = readings("sky", 420, 1), readings("ground", 420, 1)
    up, down = sky.copy(), ground.copy()
    up[87:173], down[87:173] = ground[87:173], sky[87:173]
    swap = [row(entry="swap", surface="court", patch="C1", instrument="pair", start=start,
                stop=stop, reading=word) for word, start, stop in (
                    ("normal", "12:00:15", "12:01:20"), ("inverted", "12:01:35", "12:02:45"))]
    heat = row(**STAND_OFF | {"start": "12:03:10", "stop": "12:05:00"})
    logs = {"pair": lines("pair", n=420, sky=up, ground=down), "thermal": lines("thermal", n=420)}
    assert told(small(tmp_path / "a", [heat, *swap], logs), HISTORY).empty
    assert not told(small(tmp_path / "b", [heat], logs), HISTORY).empty  # without the rows, it is
