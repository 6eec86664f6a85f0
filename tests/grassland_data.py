"""One-minute grassland data of June 2016, fetched when a test opts in; never kept in the project.

Baseline Surface Radiation Network, station Payerne: the file bsrn-pay0616.dat.gz, which lies inside
the wheel pvlib 0.11.2. The wheel is downloaded and that one member taken out; it is not installed.
What the data do not say (calibration uncertainty, size and speed of the heads) is from memory.
"""

from __future__ import annotations

import csv
import subprocess
import sys
import zipfile
from pathlib import Path

import pandas as pd
import pvlib

WHEEL = "pvlib==0.11.2"
MEMBER = "pvlib/data/bsrn-pay0616.dat.gz"
MIDDAY = Path(__file__).parent / "data" / "grassland" / "midday.csv"
COLUMNS = ["ghi", "gri", "lwd", "lwu", "temp_air", "relative_humidity", "pressure"]
SKY = {"2016-06-02": "overcast", "2016-06-10": "clear", "2016-06-22": "clear"}

INSTRUMENTS = """\
station:
  serial: fixed station
  layout: {delimiter: ",", decimal: ".", missing: [""]}
  time: {column: time, format: iso8601, zone: UTC}
  columns:
    ghi: {quantity: shortwave_down, unit: W m-2, u_gain: 0.015, u_offset: 3.0}
    gri: {quantity: shortwave_up, unit: W m-2, u_gain: 0.015, u_offset: 1.0}
    lwd: {quantity: longwave_down, unit: W m-2, u_gain: 0.01, u_offset: 2.0}
    lwu: {quantity: longwave_up, unit: W m-2, u_gain: 0.01, u_offset: 2.0}
    temp_air: {quantity: air_temperature, unit: degC}
    relative_humidity: {quantity: relative_humidity, unit: "%"}
    pressure: {quantity: air_pressure, unit: hPa}
  calibration: {id: station-2016, date: "2016-01-15", valid_days: 730}
  head_radius_cm: 8
  half_angle_deg: 90
  time_constant_s: 1.0
  interval_s: 60
"""
CAMPAIGN = """\
format: 1
campaign: {campaign}
title: Grassland, {date}
date: "{date}"
site:
  name: Grassland
  latitude: 46.815
  longitude: 6.944
  elevation_m: 491
  time_zone: Europe/Zurich
instruments: params/grassland-instruments.yml
data_folder: data/{campaign}
field_sheet: field_sheet.csv
watch: {{offset_s: 0, u_s: 0.5}}
loggers:
  station: {{files: station.csv, clock: {{offset_s: 0, u_s: 0.5}}}}
surfaces:
  grassland:
    label: Grassland
    emissivity: {{value: 0.97, u: 0.01, source: from memory}}
    emissivity_broadband: {{value: 0.97, u: 0.01, source: from memory}}
    around: {{albedo: 0.20, u: 0.03}}
conditions: {{sky: {sky}}}
settings: {{}}
comparison:
  earlier: {earlier}
  relevant_change: {{temperature: 1.0, albedo: 0.02, ndvi: 0.03}}
"""


def fetch(folder: Path) -> Path:
    """Download the wheel into `folder` and return the path of the one file taken out of it."""
    subprocess.run([sys.executable, "-m", "pip", "download", "--quiet", "--no-deps",
                    "--only-binary", ":all:", "--dest", str(folder), WHEEL], check=True)
    [wheel] = Path(folder).glob("pvlib-0.11.2-*.whl")
    with zipfile.ZipFile(wheel) as archive:
        return Path(archive.extract(MEMBER, folder))


def read(archive: Path) -> pd.DataFrame:
    """Return the month at one minute, indexed by UTC; W m-2, degC, per cent, hPa; NA missing.

    Irradiance and pressure are whole numbers, as logged: a printed .0 would claim finer steps.
    """
    month, _ = pvlib.iotools.read_bsrn(archive, logical_records=("0100", "0300", "0500"))
    whole = [column for column in COLUMNS if column not in ("temp_air", "relative_humidity")]
    return month[COLUMNS].astype(dict.fromkeys(whole, "Int64"))


def midday() -> list[dict[str, str]]:
    """Return the rows of midday.csv, the numbers that a reduction is held against."""
    with MIDDAY.open(newline="") as file:
        return list(csv.DictReader(file))


def write_campaigns(root: Path, archive: Path | None = None) -> list[Path]:
    """Write three one-day campaigns into the project `root`; return their files, oldest first.

    Each has four passes of half an hour for albedo and for the longwave temperature, which together
    hold the 121 minutes about noon of midday.csv: the edges stand between the minutes. 22 June is
    compared with 10 June and with 2 June. `archive` is what `fetch` returned (None: fetched).
    """
    (root / "params").mkdir(parents=True, exist_ok=True)
    month = read(archive or fetch(root))
    (root / "params" / "grassland-instruments.yml").write_text(INSTRUMENTS)
    written: list[Path] = []
    for row in midday():
        date, campaign = row["date"], f"grassland-{row['date']}"
        folder = root / "data" / campaign
        folder.mkdir(parents=True, exist_ok=True)
        month.loc[date].to_csv(folder / "station.csv", index_label="time",
                               date_format="%Y-%m-%dT%H:%MZ", lineterminator="\n")
        noon = pd.Timestamp(f"{date} {row['noon_utc']}", tz="UTC")
        (folder / "field_sheet.csv").write_text(_sheet(campaign, date, noon))
        earlier = [f"params/{path.name}" for path in reversed(written)] if "22" in date[8:] else []
        path = root / "params" / f"{campaign}.yml"
        path.write_text(CAMPAIGN.format(campaign=campaign, date=date, sky=SKY[date],
                                        earlier=f"[{', '.join(earlier)}]"))
        written.append(path)
    return written


def _sheet(campaign: str, date: str, noon: pd.Timestamp) -> str:
    """Return the field sheet: -60 to +60 min of noon in four passes, 10 s apart."""
    lines = ["entry,surface,patch,quantity,mode,instrument,start,stop,height_cm,width_m,length_m,"
             "lanes,reading,reading_u,note,date,campaign"]
    size = "100"
    for first, last in ((-60, -31), (-30, -1), (0, 29), (30, 60)):
        start, stop = (f"{noon + pd.Timedelta(minutes=minute, seconds=shift):%Y-%m-%dT%H:%M:%SZ}"
                       for minute, shift in ((first, -25), (last, 25)))
        lines.append(f"pass,grassland,G1,albedo,,,{start},{stop},200,,{size},,,,,{date},{campaign}")
        lines.append(f"pass,grassland,G1,temperature,,,{start},{stop},,,,,,,,{date},{campaign}")
        size = ""
    return "\n".join([*lines, ""])
