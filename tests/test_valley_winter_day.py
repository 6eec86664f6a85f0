"""A measured day through the command line.

Data and reference numbers: SURFRAD network (NOAA), station Alamosa CO, 1 January 2016, one-minute
means (tests/data/valley-winter-day/SOURCE.txt). Midday 19:07 UTC +- 60 min, 121 minutes: albedo by
ratio of sums .17573, surface temperature 3.82 degC with emissivity .97, air -6.38 degC (computed
from the published minutes by plain sums, apart from this package).
"""

import pandas as pd
import pytest
from projects import surveykit

from surveykit import pipeline
from surveykit.opening import open_file

FOLDER = "tests/data/valley-winter-day"
FILE = f"{FOLDER}/valley-winter-day.yml"


def edit(project, name, *changes):
    path = project / FOLDER / name
    text = path.read_text(encoding="utf-8")
    for old, new in changes:
        assert old in text
        text = text.replace(old, new)
    path.write_text(text, encoding="utf-8")


def surfaces(project):
    survey = open_file(project / FILE, run_folder=project / "run")
    evidence = pipeline.surfaces(survey)
    return evidence, evidence.tables["surfaces"].set_index("quantity")


def test_run_gives_the_published_midday(project):
    done = surveykit(project, "run", FILE)
    assert done.returncode == 0, done.stderr
    table = pd.read_csv(project / "reports/valley-winter-day/tables/surfaces.csv")
    table = table.set_index("quantity")
    assert table.value["albedo"] == pytest.approx(0.1757, abs=0.001)
    assert table.status["albedo"] == "qualified"
    assert "sun lower than 30 degrees" in table.note["albedo"]
    assert table.value["temperature"] == pytest.approx(3.8, abs=0.1)
    assert table.kind["temperature"] == "longwave"
    assert table.lower["temperature"] < 3.82 < table.upper["temperature"]
    page = (project / "reports/valley-winter-day/report.html").read_text(encoding="utf-8")
    assert "0.176" in page
    assert "3.8" in page


def test_air_temperature_of_the_passes(project):
    evidence, _ = surfaces(project)
    air = [e.air_k for e in evidence.estimates if e.this.quantity == "temperature"]
    assert sum(air) / len(air) - 273.15 == pytest.approx(-6.4, abs=0.1)


def test_a_flipped_longitude_in_zone_utc_gives_no_albedo(project):
    edit(project, "valley-winter-day.yml", ("longitude: -105.92", "longitude: 105.92"),
         ("time_zone: America/Denver", "time_zone: UTC"))
    _, table = surfaces(project)
    assert table.status["albedo"] == "not evaluated"
    assert pd.isna(table.value["albedo"])
    assert ("computed sun below the horizon while the pair reads 569 W m-2: "
            "check longitude, zone or clock") in table.note["albedo"]
    assert table.value["temperature"] == pytest.approx(3.8, abs=0.1)


def test_a_flipped_longitude_against_its_zone_is_an_error(project):
    edit(project, "valley-winter-day.yml", ("longitude: -105.92", "longitude: 105.92"))
    done = surveykit(project, "run", FILE)
    assert done.returncode == 2
    assert "longitude" in done.stderr
    assert "America/Denver" in done.stderr
    assert "Traceback" not in done.stderr
    assert not (project / "reports").exists()


def test_an_albedo_read_in_the_night_is_not_evaluated(project):
    """Sums of the minutes around 05:00 UTC give .313: the ratio of two negative offsets."""
    edit(project, "valley-winter-day.yml", ("field_sheet.csv", "field_sheet_night.csv"))
    _, table = surfaces(project)
    assert table.status["albedo"] == "not evaluated"
    assert pd.isna(table.value["albedo"])
    assert "sun" in table.note["albedo"]
