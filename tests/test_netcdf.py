"""The NetCDF file of a report, read back with xarray and held against the CF conventions.

Standard names are those of the CF standard name table (from memory: surface_temperature,
surface_albedo, normalized_difference_vegetation_index, solar_zenith_angle, time, latitude,
longitude); the modifier standard_error is appendix C of the conventions.
"""

from __future__ import annotations

import os
import shutil
import subprocess

import numpy as np
import pandas as pd
import pytest
from projects import DEMO, surveykit

xr = pytest.importorskip("xarray")
pytest.importorskip("h5netcdf")

NAME = DEMO[0]
NAMES = {"surface_temperature", "surface_albedo", "normalized_difference_vegetation_index",
         "solar_zenith_angle", "time", "latitude", "longitude"}


@pytest.fixture(scope="module")
def opened(demo, tmp_path_factory):
    project = shutil.copytree(demo[0], tmp_path_factory.mktemp("netcdf") / "project")
    done = surveykit(project, "netcdf", f"reports/{NAME}")
    assert done.returncode == 0, done.stderr
    assert done.stdout.strip() == f"wrote reports/{NAME}.nc"
    with xr.open_dataset(project / "reports" / f"{NAME}.nc", engine="h5netcdf",
                         decode_times=False) as data:
        yield project, data.load()


def test_it_keeps_the_conventions(opened):
    _, data = opened
    assert data.attrs["Conventions"] == "CF-1.11"
    assert data.attrs["title"]
    for name, variable in data.variables.items():
        about = variable.attrs
        assert about["long_name"], name
        if variable.dtype.kind == "f":
            assert about["units"], name
        if "standard_name" in about:
            base, _, modifier = about["standard_name"].partition(" ")
            assert base in NAMES, name
            assert modifier in ("", "standard_error"), name
        for other in about.get("ancillary_variables", "").split():
            assert data[other].dims == variable.dims
    assert data["pass_start"].attrs["units"] == "seconds since 1970-01-01 00:00:00 UTC"
    assert data["surface_temperature"].attrs["units"] == "degree_Celsius"


def test_temperatures_and_times_say_what_their_units_mean(opened):
    """CF-1.11, 3.1.2 (temperature: on_scale, difference) and 4.4 (leap_seconds: none)."""
    _, data = opened
    assert data["surface_temperature"].attrs["units_metadata"] == "temperature: on_scale"
    error = data["surface_temperature_standard_error"].attrs
    assert (error["units"], error["units_metadata"]) == ("K", "temperature: difference")
    assert data["pass_stop"].attrs["units_metadata"] == "leap_seconds: none"
    assert data.attrs["history"]


@pytest.mark.skipif("SURVEYKIT_CF_CHECKER" not in os.environ,
                    reason="SURVEYKIT_CF_CHECKER names no checker of the conventions")
def test_a_reference_checker_finds_nothing(opened):
    """The checker that the variable names (compliance-checker 6 of the IOOS), against CF-1.11."""
    done = subprocess.run(
        [os.environ["SURVEYKIT_CF_CHECKER"], "-t", "cf:1.11", "-c", "strict",
         opened[0] / "reports" / f"{NAME}.nc"], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout
    assert "All tests passed!" in done.stdout, done.stdout


def test_it_holds_the_numbers_of_the_tables(opened):
    project, data = opened
    folder = project / "reports" / NAME / "tables"
    surfaces, passes = (pd.read_csv(folder / f"{n}.csv") for n in ("surfaces", "passes"))
    for stem, table, u in (("surface", surfaces, "u"), ("pass", passes, "u_within")):
        for quantity in ("temperature", "albedo", "ndvi"):
            here = (table["quantity"] == quantity).to_numpy()
            for suffix, column in (("", "value"), ("_standard_error", u)):
                kept = data[f"{stem}_{quantity}{suffix}"].to_numpy()
                np.testing.assert_array_equal(kept[here], table.loc[here, column])
                assert np.isnan(kept[~here]).all()
    assert [*data["pass_name"].to_numpy()] == [*passes["pass"]]
    seconds = pd.to_datetime(passes["start_utc"], utc=True, format="ISO8601").dt.as_unit("ns")
    np.testing.assert_allclose(data["pass_start"], seconds.astype("int64") / 1e9, atol=1e-5)
