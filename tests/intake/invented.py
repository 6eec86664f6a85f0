"""An invented campaign for the tests of this folder: its kit, its parameters, its files."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from surveykit.intake.params import Campaign, Instrument, Parameters

HEAD = {"time_constant_s": 0.3, "half_angle_deg": 22}
THERMAL: dict[str, Any] = {
    "time": {"column": "time", "format": "iso8601", "zone": "UTC"},
    "columns": {"target": {"quantity": "brightness_temperature", "unit": "degC", "u_offset": 0.2},
                "body": {"quantity": "housing_temperature", "unit": "degC"}},
    **HEAD}
SHORTWAVE: dict[str, Any] = {
    "time": THERMAL["time"],
    "columns": {
        "sky": {"quantity": "shortwave_down", "unit": "mV", "gain": 10.4, "offset": 0.0,
                "u_gain": 0.015},
        "ground": {"quantity": "shortwave_up", "unit": "mV", "gain": 10.1, "offset": 0.0,
                   "u_gain": 0.015}},
    "time_constant_s": 1.0, "half_angle_deg": 90}


def pair(*quantities: str) -> dict[str, Any]:
    """Return an entry with one W m-2 column for each quantity."""
    return {"time": THERMAL["time"], **HEAD, "columns": {
        name: {"quantity": name, "unit": "W m-2", "u_gain": 0.02} for name in quantities}}


KIT = {"thermal": THERMAL, "shortwave": SHORTWAVE,
       "rednir-sky": pair("red_down", "nir_down"), "rednir-ground": pair("red_up", "nir_up")}


COLUMNS = ("entry,surface,patch,quantity,mode,instrument,start,stop,height_cm,width_m,length_m,"
           "lanes,reading,reading_u,note").split(",")
PASS = {"entry": "pass", "surface": "asphalt", "patch": "A1", "quantity": "temperature",
        "mode": "contact", "start": "12:00:00", "stop": "12:05:00"}
ALBEDO = {**PASS, "quantity": "albedo", "mode": "", "height_cm": "12", "width_m": "4",
          "length_m": "5", "lanes": "4"}
WEATHER = {"entry": "weather", "quantity": "air_temperature", "start": "12:00:00",
           "reading": "31.5"}

# a thermal log of three records
CLEAN = ("time,target,body\n"
         "2025-07-24T11:00:00,40.25,30.0\n"
         "2025-07-24T11:00:01,40.50,30.1\n"
         "2025-07-24T11:00:02,40.75,30.2\n")


def instrument(entry: dict[str, Any] = THERMAL, **changed: Any) -> Instrument:
    return Instrument.model_validate({**entry, **changed})


def parameters(root: Path, kit: dict[str, dict[str, Any]] | None = None,
               **changed: Any) -> Parameters:
    """Return the parameters of a campaign of 24 July 2025 in Lisbon's zone (UTC+1 in summer)."""
    kit = kit or KIT
    site = {"name": "Mill Yard", "latitude": 41.3, "longitude": -7.75, "elevation_m": 120,
            "time_zone": "Europe/Lisbon"}
    campaign = Campaign.model_validate({
        "campaign": "mill-yard", "title": "Mill Yard", "date": "2025-07-24", "site": site,
        "instruments": "params/instruments.yml", "data_folder": "data",
        "field_sheet": "sheet.csv",
        "loggers": {name: {"files": f"{name}*.csv", "clock": {"offset_s": 0, "u_s": 0.5}}
                    for name in kit},
        "surfaces": {"asphalt": {"label": "Asphalt"}, "lawn": {"label": "Lawn"}}, **changed})
    return Parameters(root / "params/mill-yard.yml", root, campaign,
                      {name: instrument(entry) for name, entry in kit.items()}, None, ())


def write(folder: Path, name: str, text: str | bytes) -> Path:
    path = folder / name
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return path


def text_of(*rows: dict[str, str], delimiter: str = ",", columns: list[str] = COLUMNS) -> str:
    lines = [columns, *([row.get(name, "") for name in columns] for row in rows)]
    return "".join(delimiter.join(f'"{cell}"' if delimiter in cell else cell for cell in cells)
                   + "\n" for cells in lines)
