"""A small invented survey written as files and taken as far as a test wants: marks, estimates.

Everything is certain unless a test says otherwise (no edges, no clock error, heads of no delay), so
that a clean survey uses every record of its passes. Light and temperatures are invented.
"""

from __future__ import annotations

from copy import deepcopy
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import yaml

from surveykit.accounting import Quality
from surveykit.evidence.conditions import Day
from surveykit.evidence.estimates import PassEstimate, estimate_all
from surveykit.intake.clocks import set_clock
from surveykit.intake.fieldsheet import Sheet, read_sheet
from surveykit.intake.loggers import expand_files, read_logger
from surveykit.intake.params import Parameters, load
from surveykit.intake.passes import Pass, match_passes
from surveykit.intake.records import Records
from surveykit.quality import examine

DAY = "2025-06-11"
TIME = {"column": "time", "format": "iso8601", "zone": "UTC"}
CALIBRATED = {"date": "2025-01-20", "valid_days": 730}


def head(**columns: dict[str, Any]) -> dict[str, Any]:
    return {"time": TIME, "time_constant_s": 0.0, "half_angle_deg": 90, "interval_s": 1,
            "columns": columns}


def flux(quantity: str, **more: Any) -> dict[str, Any]:
    return {"quantity": quantity, "unit": "W m-2", "u_gain": 0.015, "u_offset": 1.0, **more}


KIT: dict[str, dict[str, Any]] = {
    "pair": {**head(sky=flux("shortwave_down"), ground=flux("shortwave_up")), "head_radius_cm": 1.2,
             "calibration": {"id": "pair-2025", **CALIBRATED}},
    "longwave": {**head(down=flux("longwave_down"), up=flux("longwave_up")),
                 "calibration": {"id": "longwave-2025", **CALIBRATED}},
    "thermal": {**head(target={"quantity": "brightness_temperature", "unit": "degC",
                               "emissivity_setting": 1.0, "u_offset": 0.2},
                       body={"quantity": "housing_temperature", "unit": "degC"}),
                "band_um": [8, 14], "bore_emissivity": {"value": 0.95, "u": 0.06},
                "calibration": {"id": "thermal-2025", **CALIBRATED}},
    "rednir-sky": {**head(red=flux("red_down", u_offset=0.02), nir=flux("nir_down", u_offset=0.02)),
                   "calibration": {"id": "rednir-sky-2025", **CALIBRATED},
                   "band_centres_nm": {"red": 650, "nir": 810},
                   "band_widths_nm": {"red": 50, "nir": 50}},
    "rednir-ground": {**head(red=flux("red_up", u_offset=0.02), nir=flux("nir_up", u_offset=0.02)),
                      "calibration": {"id": "rednir-ground-2025", **CALIBRATED},
                      "band_centres_nm": {"red": 650, "nir": 810},
                      "band_widths_nm": {"red": 50, "nir": 50}},
    "weather": {**head(air={"quantity": "air_temperature", "unit": "degC"},
                       humidity={"quantity": "relative_humidity", "unit": "%"},
                       wind={"quantity": "wind_speed", "unit": "m s-1"}), "interval_s": 60},
}
LEVELS = {"sky": 900.0, "ground": 180.0, "down": 380.0, "up": 600.0, "target": 47.0, "body": 30.0,
          "rednir-sky.red": 70.0, "rednir-sky.nir": 50.0, "rednir-ground.red": 3.5,
          "rednir-ground.nir": 20.0, "air": 30.0, "humidity": 30.0, "wind": 2.0}
SITE = {"name": "Invented yard", "latitude": 41.3, "longitude": -7.75, "elevation_m": 120,
        "time_zone": "UTC"}
SHEET = ("entry surface patch quantity mode instrument start stop height_cm width_m length_m lanes "
         "reading reading_u note date rod_side operator_side").split()
SIZE = {"height_cm": "40", "width_m": "4", "length_m": "4"}
ALBEDO = {"quantity": "albedo", **SIZE}
NDVI = {"quantity": "ndvi", **SIZE}
STAND_OFF = {"quantity": "temperature", "mode": "stand-off", "instrument": "thermal", **SIZE}
CONTACT = {"quantity": "temperature", "mode": "contact", "instrument": "thermal"}
LONGWAVE = {"quantity": "temperature", "instrument": "longwave"}
CERTAIN = {"passes": {"sheet_u_s": 0.0}}


def row(**cells: str) -> dict[str, str]:
    """Return a row of the field sheet; a pass of patch C1 on the court unless said otherwise."""
    base = {"entry": "pass", "surface": "court", "patch": "C1", "start": "12:00:20",
            "stop": "12:02:20", "date": DAY}
    return base | cells if cells.get("entry", "pass") == "pass" else {"date": DAY} | cells


def readings(column: str, n: int, step_s: float, *, seed: int = 1) -> np.ndarray:
    """Return n readings about the column's level, as noisy as a living head."""
    rng = np.random.default_rng([seed, *column.encode()])
    level = LEVELS.get(column, LEVELS.get(column.rsplit(".", maxsplit=1)[-1], 0.0))
    return level * (1 + 2e-3 * rng.standard_normal(n))


def lines(logger: str, *, start: str = "12:00:00", n: int = 160, step_s: float = 1.0,
          kit: dict[str, Any] = KIT, **given: Any) -> list[str]:
    """Return a logger's file line by line, its columns at their levels or as given."""
    columns = list(kit[logger]["columns"])
    time = np.datetime64(f"{DAY}T{start}", "ms") + (np.arange(n) * step_s * 1000).astype("m8[ms]")
    values = [np.broadcast_to(given[c], n) if c in given else
              readings(c if c in LEVELS else f"{logger}.{c}", n, step_s) for c in columns]
    rows = [",".join([str(t), *(f"{v:.4f}" for v in some)])
            for t, *some in zip(time, *values, strict=True)]
    return [",".join(["time", *columns]), *rows]


@dataclass(frozen=True)
class Small:
    """A survey read and matched; `quality` and `estimates` go further."""

    parameters: Parameters
    records: dict[str, Records]
    sheet: Sheet
    passes: tuple[Pass, ...]

    def quality(self) -> Quality:
        return examine(self.parameters, self.records, self.sheet, self.passes)

    def day(self) -> Day:
        return Day(self.parameters, self.records, self.sheet, self.quality())

    def estimates(self) -> tuple[PassEstimate, ...]:
        return estimate_all(self.day(), self.passes)

    def by_name(self) -> dict[str, PassEstimate]:
        return {e.this.name: e for e in self.estimates()}

    def with_settings(self, **sections: dict[str, Any]) -> Small:
        """Return the same with other settings; for those that intake does not use."""
        settings = self.parameters.campaign.settings
        settings = settings.model_copy(update={
            name: getattr(settings, name).model_copy(update=some)
            for name, some in sections.items()})
        campaign = self.parameters.campaign.model_copy(update={"settings": settings})
        return replace(self, parameters=replace(self.parameters, campaign=campaign))


def small(root: Path, sheet: list[dict[str, str]], logs: dict[str, list[str] | list[list[str]]], *,
          kit: dict[str, Any] = KIT, settings: dict[str, Any] = CERTAIN, clock_u_s: float = 0.0,
          **sections: Any) -> Small:
    """Write a survey into the project `root` and read it back.

    `logs` holds the lines of each logger's file, or of its files.
    """
    name = sections.pop("campaign", f"yard-{DAY}")
    data = root / "data"
    for folder in (root / "params", root / "notebooks", data):
        folder.mkdir(parents=True, exist_ok=True)
    for logger, text in logs.items():
        files = text if isinstance(text[0], list) else [text]
        for number, some in enumerate(files):
            (data / f"{logger}_{number}.csv").write_text("\n".join([*some, ""]), encoding="utf-8")
    table = [",".join(SHEET), *(",".join(r.get(c, "") for c in SHEET) for r in sheet), ""]
    (data / "sheet.csv").write_text("\n".join(table), encoding="utf-8")
    campaign = {
        "campaign": name, "title": "Invented yard", "date": DAY, "site": SITE,
        "instruments": deepcopy({logger: kit[logger] for logger in logs}), "data_folder": "data",
        "field_sheet": "sheet.csv", "watch": {"offset_s": 0, "u_s": 0},
        "loggers": {logger: {"files": f"{logger}_*.csv",
                             "clock": {"offset_s": 0, "u_s": clock_u_s}} for logger in logs},
        "surfaces": {surface: {
            "label": surface, "emissivity": {"value": 0.95, "u": 0.01, "source": "invented"},
            "emissivity_broadband": {"value": 0.95, "u": 0.01, "source": "invented"},
            "around": {"albedo": 0.16, "u": 0.03}} for surface in ("court", "lawn", "control")},
        "conditions": {"sky": "clear", "rain_48h_mm": 0}, "settings": settings,
    } | sections
    path = root / "params" / f"{name}.yml"
    path.write_text(yaml.safe_dump(campaign, sort_keys=False), encoding="utf-8")
    return read(path)


def read(path: Path) -> Small:
    """Read a campaign as the pipeline does, up to its passes."""
    parameters = load(path)
    records, clocks = {}, {}
    for logger, use in parameters.campaign.loggers.items():
        log = read_logger(logger, parameters.kit[logger],
                          expand_files(parameters.data_folder, use.files), parameters.root)
        records[logger], clocks[logger] = set_clock(log, use, parameters.settings)
    sheet = read_sheet(parameters.sheet_path, parameters)
    return Small(parameters, records, sheet, match_passes(sheet, parameters, clocks))
