"""A campaign of two passes written as files, and taken through the stages to its numbers."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import yaml

from surveykit.core import InputError
from surveykit.evidence import surfaces as pooling
from surveykit.evidence.conditions import Day
from surveykit.evidence.estimates import estimate_all
from surveykit.intake.aligning import align, read_logs
from surveykit.intake.params import load
from surveykit.quality import examine
from surveykit.statistics.draws import Draws

NAME = "yard-2025-06-11"
PARAMETERS, KIT_FILE, FOLDER = f"params/{NAME}.yml", "params/kit.yml", f"data/{NAME}"
SHEET = f"{FOLDER}/sheet.csv"
DRAWS = 500
HEADS = {
    "pair": {"sky": (820.0, "shortwave_down"), "ground": (165.0, "shortwave_up")},
    "thermal": {"target": (47.0, "brightness_temperature"), "body": (30.0, "housing_temperature")},
    "weather": {"air": (27.0, "air_temperature"), "humidity": (38.0, "relative_humidity"),
                "wind": (1.8, "wind_speed")},
}
STEP_S, LENGTH_S, BEGIN = {"pair": 1.0, "thermal": 0.5, "weather": 20.0}, 240, "2025-06-11T11:59:30"
COLUMNS = ("entry", "surface", "patch", "quantity", "mode", "start", "stop", "height_cm",
           "width_m", "length_m", "note", "date", "campaign")
ROWS = (
    ("pass", "court", "C1", "albedo", "", "13:00:00", "13:01:40", "30", "6", "6", "dry",
     "2025-06-11", NAME),
    ("pass", "court", "C1", "temperature", "stand-off", "13:02:00", "13:03:10", "60", "", "", "",
     "2025-06-11", NAME),
)


def column(logger: str, header: str) -> dict[str, Any]:
    quantity = HEADS[logger][header][1]
    if "temperature" in quantity:
        main = {"u_offset": 0.2, "emissivity_setting": 1.0} if "bright" in quantity else {}
        return {"quantity": quantity, "unit": "degC"} | main
    if logger == "pair":
        return {"quantity": quantity, "unit": "mV", "gain": 10.0, "offset": 0.0, "u_gain": 0.015}
    return {"quantity": quantity, "unit": "%" if header == "humidity" else "m s-1"}


def kit() -> dict[str, Any]:
    entries: dict[str, Any] = {}
    for logger, columns in HEADS.items():
        entries[logger] = {
            "serial": f"{logger}-1", "time": {"column": "time", "format": "iso8601", "zone": "UTC"},
            "layout": {"delimiter": ",", "decimal": "."},
            "columns": {header: column(logger, header) for header in columns},
            "time_constant_s": 0.2, "half_angle_deg": 90 if logger == "pair" else 15}
    entries["thermal"]["band_um"] = [8, 14]
    entries["pair"]["head_radius_cm"] = 1.0
    return entries


def campaign() -> dict[str, Any]:
    return {
        "campaign": NAME, "title": "Invented yard", "date": "2025-06-11",
        "site": {"name": "Invented yard", "latitude": 41.3, "longitude": -7.75, "elevation_m": 120,
                 "time_zone": "Europe/Lisbon"},
        "instruments": KIT_FILE, "data_folder": FOLDER, "field_sheet": "sheet.csv",
        "watch": {"offset_s": 0, "u_s": 0.5},
        "loggers": {logger: {"files": f"{logger}*", "clock": {"offset_s": 1.0, "u_s": 0.2}}
                    for logger in HEADS},
        "surfaces": {"court": {
            "label": "Court", "around": {"albedo": 0.16, "u": 0.03},
            "emissivity": {"value": 0.95, "u": 0.01, "source": "invented"}}},
        "conditions": {"sky": "clear", "rain_48h_mm": 0},
        "settings": {"passes": {"sheet_u_s": 2.0}, "temperature": {"walls_u_k": 8.0}}}


@dataclass(frozen=True)
class Log:
    """The records of a logger: UTC in ms, and the values of each column as printed."""

    time_ms: np.ndarray
    columns: dict[str, np.ndarray]


def logs(seed: int = 1) -> dict[str, Log]:
    rng = np.random.default_rng(seed)
    out = {}
    for logger, columns in HEADS.items():
        n = int(LENGTH_S / STEP_S[logger])
        time = np.datetime64(BEGIN, "ms").astype(np.int64) + (
            np.arange(n) * STEP_S[logger] * 1000).astype(np.int64)
        out[logger] = Log(time, {
            header: np.round(level / (10 if logger == "pair" else 1)
                             * (1 + 2e-3 * rng.standard_normal(n)), 3)
            for header, (level, _) in columns.items()})
    return out


def plain_log(log: Log) -> str:
    stamps = pd.to_datetime(log.time_ms, unit="ms").strftime("%Y-%m-%dT%H:%M:%S.%f").str[:-3]
    lines = [",".join(["time", *log.columns])]
    lines += [",".join([stamp, *(f"{v:.3f}" for v in row)])
              for stamp, *row in zip(stamps, *log.columns.values(), strict=True)]
    return "\n".join(lines) + "\n"


def clean_files() -> dict[str, bytes]:
    """Return the files of the campaign by path under the project folder."""
    files = {PARAMETERS: yaml.safe_dump(campaign(), sort_keys=False),
             KIT_FILE: yaml.safe_dump(kit(), sort_keys=False),
             SHEET: "\n".join(",".join(row) for row in (COLUMNS, *ROWS)) + "\n"}
    files |= {f"{FOLDER}/{logger}.csv": plain_log(log) for logger, log in logs().items()}
    return {name: text.encode() for name, text in files.items()}


def write_files(root: Path, files: dict[str, bytes]) -> None:
    for folder in ("params", "notebooks", FOLDER):
        (root / folder).mkdir(parents=True, exist_ok=True)
    for name, data in files.items():
        (root / name).write_bytes(data)


@dataclass(frozen=True)
class Outcome:
    """What a campaign came to: numbers, all that accounts for records, what was declared."""

    numbers: dict[tuple[str, ...], tuple[float, ...]]
    account: tuple[str, ...]
    declared: str
    read: dict[str, int]
    head_lines: int
    ledger: pd.DataFrame
    tables: dict[str, pd.DataFrame]


def outcome(root: Path, path: str = PARAMETERS) -> Outcome | InputError:
    """Take the campaign through the stages as the pipeline does, with few draws."""
    try:
        parameters = load(root / path)
        ingested = align(parameters, *read_logs(parameters))
    except InputError as error:
        return error
    made = examine(parameters, ingested.records, ingested.sheet, ingested.passes)
    day = Day(parameters, ingested.records, ingested.sheet, made)
    estimates = estimate_all(day, ingested.passes)
    statistics = parameters.settings.statistics
    groups = pooling.groups(parameters.name, estimates, Draws(statistics.seed, DRAWS),
                            coverage=statistics.coverage)
    tables = pooling.pass_tables(parameters.name, estimates) | {
        "surfaces": pooling.surface_table(groups, statistics.coverage),
        "budget": pooling.budget_table(groups), "ledger": made.ledger, "checks": made.checks}
    numbers = {}
    for name, keys, values in (
            ("passes", ("surface", "patch", "pass", "quantity", "kind"), ("value", "u_within")),
            ("surfaces", ("surface", "quantity", "kind"), ("value", "u_at_least"))):
        for row in tables[name].to_dict("records"):
            numbers[(name, *(str(row[key]) for key in keys))] = tuple(row[v] for v in values)
    account = [repr(row) for name in ("ledger", "checks") for row in
               tables[name].astype(str).to_dict("records")]
    account += [repr({key: row[key] for key in ("pass", "flags", "status", "note", "n_records")})
                for row in tables["passes"].to_dict("records")]
    account += [*ingested.sheet.notices, *(repr(c) for c in ingested.clocks)]
    files = [file for log in ingested.records.values() for file in log.files]
    kit_dump = {name: parameters.kit[name].model_dump() for name in parameters.campaign.loggers}
    return Outcome(numbers, tuple(sorted(account)),
                   repr((parameters.campaign.model_dump(), kit_dump, parameters.notes)),
                   {file.path: file.records for file in files},
                   sum(file.head_lines for file in files), made.ledger, tables)
