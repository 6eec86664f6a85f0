"""One NetCDF file of passes and surfaces, for those who keep their data so (extra `netcdf`).

References
----------
NetCDF Climate and Forecast (CF) metadata conventions, version 1.11: standard names, the modifier
`standard_error`, ancillary variables, `units`, times as seconds since an epoch.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

from surveykit.core import InputError

from .datapackage import CF_NAMES

EPOCH = "seconds since 1970-01-01 00:00:00 UTC"
UNITS = {"temperature": "degree_Celsius", "albedo": "1", "ndvi": "1"}
LONG = {"temperature": "surface temperature", "albedo": "surface albedo",
        "ndvi": "normalized difference vegetation index"}
NAN = float("nan")


def write_netcdf(tables: Mapping[str, pd.DataFrame], path: Path, facts: Mapping[str, Any]) -> Path:
    """Write the values of passes and surfaces with their uncertainties; return the path.

    Parameters
    ----------
    tables : mapping of str to DataFrame
        `passes` and `surfaces` as in `core.TABLES`.
    path : Path
        The file to write.
    facts : mapping
        `campaign`, `title`, `site`, `coverage` and `versions` of the run.

    Raises
    ------
    InputError
        If xarray or h5netcdf is not installed.
    """
    try:
        import h5netcdf  # noqa: F401
        import xarray as xr
    except ImportError as error:
        raise InputError(f"NetCDF needs {error.name}; install it with: pip install -e '.[netcdf]'"
                         ) from None
    variables: dict[str, tuple[Any, ...]] = {}
    for dimension, table, stem in (("pass", tables["passes"], "pass"),
                                   ("result", tables["surfaces"], "surface")):
        _texts(variables, table, dimension, stem)
        for quantity in dict.fromkeys(table["quantity"]):
            _values(variables, table, dimension, stem, str(quantity))
    passes = tables["passes"]
    for name in ("start_utc", "stop_utc"):
        seconds = passes[name].dt.as_unit("ns").astype("int64").to_numpy() / 1e9
        variables[f"pass_{name.removesuffix('_utc')}"] = ("pass", seconds, {
            "standard_name": "time", "units": EPOCH, "calendar": "standard",
            "units_metadata": "leap_seconds: none",
            "long_name": f"{name.removesuffix('_utc')} of the pass"})
    variables["pass_zenith"] = ("pass", passes["zenith_deg"].to_numpy(float), {
        "standard_name": "solar_zenith_angle", "units": "degree",
        "long_name": "zenith angle of the sun"})
    site = facts["site"]
    for name, unit in (("latitude", "degrees_north"), ("longitude", "degrees_east")):
        variables[name] = ((), float(site[name]), {
            "standard_name": name, "units": unit, "long_name": f"{name} of the site"})
    version = facts.get("versions", {}).get("surveykit", "")
    data = xr.Dataset(variables, attrs={
        "Conventions": "CF-1.11", "title": facts["title"], "source": f"surveykit {version}".strip(),
        "history": f"made by surveykit {version} from the tables of its report",
        "comment": f"campaign {facts['campaign']}; intervals cover {facts['coverage']:g}"})
    encoding = {name: {"_FillValue": NAN if data[name].dtype.kind == "f" else None}
                for name in data.variables}
    data.to_netcdf(path, engine="h5netcdf", encoding=encoding)
    return path


def _texts(variables: dict[str, tuple[Any, ...]], table: pd.DataFrame, dimension: str,
           stem: str) -> None:
    named = [("pass", "name")] if dimension == "pass" else []
    for column, word in (*named, ("surface", "of"), ("quantity", "quantity"), ("kind", "kind"),
                         ("status", "status")):
        variables[f"{stem}_{word}"] = (dimension, table[column].to_numpy(dtype=object), {
            "long_name": f"{column} of the {stem}'s row"})


def _values(variables: dict[str, tuple[Any, ...]], table: pd.DataFrame, dimension: str, stem: str,
            quantity: str) -> None:
    """Add a quantity's values over all rows, missing where the row is of another quantity."""
    here = (table["quantity"] == quantity).to_numpy()
    name, u = f"{stem}_{quantity}", "u_within" if dimension == "pass" else "u"
    parts = {"": "value", "_standard_error": u}
    if dimension == "result":
        parts |= {"_lower": "lower", "_upper": "upper"}
    for suffix, column in parts.items():
        difference = suffix == "_standard_error" and quantity == "temperature"
        about = {"units": "K" if difference else UNITS[quantity],
                 "long_name": f"{LONG[quantity]}{suffix.replace('_', ' ')}"}
        if quantity == "temperature":
            about["units_metadata"] = f"temperature: {'difference' if difference else 'on_scale'}"
        if suffix in ("", "_standard_error"):
            modifier = " standard_error" if suffix else ""
            about["standard_name"] = f"{CF_NAMES[quantity]}{modifier}"
        if not suffix:
            about["ancillary_variables"] = " ".join(f"{name}{s}" for s in parts if s)
        variables[name + suffix] = (
            dimension, np.where(here, table[column].to_numpy(float), NAN), about)
