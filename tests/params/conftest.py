"""A small project in a temporary folder: the files of a campaign, its kit, an earlier campaign."""

from __future__ import annotations

from pathlib import Path

import pytest

KIT = """\
thermal:
  serial: T-07
  layout: {delimiter: ",", decimal: ".", skip_lines: 0, missing: ["", "NAN", "-9999"]}
  time: {column: time, format: iso8601, zone: UTC}
  columns:
    target: {quantity: brightness_temperature, unit: degC, emissivity_setting: 1.0, u_offset: 0.2}
    body: {quantity: housing_temperature, unit: degC}
  calibration: {id: thermal-2025-02, date: "2025-02-10", valid_days: 730}
  band_um: [8, 14]
  half_angle_deg: 22
  time_constant_s: 0.3
  bore_emissivity: 0.95
shortwave:
  serial: S-02
  time: {column: time, format: "%d/%m/%Y %H:%M:%S", zone: Europe/Lisbon}
  columns:
    sky_mV:
      {quantity: shortwave_down, unit: mV, gain: 10.4, offset: 0.0, u_gain: 0.015, u_offset: 3}
    ground_mV: {quantity: shortwave_up, unit: mV, gain: {value: 10.1, u: 0.15}, offset: 0.0}
  calibration: {id: shortwave-2025-01, date: "2025-01-20", valid_days: 730}
  head_radius_cm: 1.2
  half_angle_deg: 90
  t95_s: 3.0
weather:
  time: {column: time, zone: UTC}
  interval_s: 60
  columns:
    air: {quantity: air_temperature, unit: degC}
    humidity: {quantity: relative_humidity, unit: "%"}
"""

CAMPAIGN = """\
format: 1
campaign: mill-yard-2025-07-24
title: Mill Yard, five weeks after the pale coating
date: "2025-07-24"
site:
  name: Mill Yard
  latitude: 41.30
  longitude: -7.75
  elevation_m: 120
  time_zone: Europe/Lisbon
  sky_view: 0.85
  walls: {temperature_degC: {value: 35, u: 5}}
instruments: params/instruments.yml
data_folder: demo_data/mill-yard-2025-07-24
field_sheet: field_sheet.csv
watch: {offset_s: 0, u_s: 1}
loggers:
  thermal: {files: "thermal*.csv", clock: {offset_s: 12.0, u_s: 0.5}}
  shortwave: {files: [shortwave.csv, shortwave_2.csv]}
  weather: {files: weather.csv}
surfaces:
  worn-asphalt:
    label: Worn asphalt
    emissivity: {value: 0.95, u: 0.01, source: handbook}
    around: {albedo: 0.20, u: 0.05}
  lawn: {label: Lawn}
conditions: {sky: clear, rain_48h_mm: 0}
settings: {}
comparison:
  earlier: [params/mill-yard-2025-06-12.yml]
  control: worn-asphalt
  relevant_change: {temperature: 1.0, albedo: 0.02, ndvi: 0.03}
"""


class Project:
    """Writes the files, edited, and tells where they are."""

    def __init__(self, root: Path) -> None:
        self.root = root
        for folder in ("params", "notebooks", "demo_data"):
            (root / folder).mkdir(parents=True)
        self.path = root / "params" / "mill-yard-2025-07-24.yml"
        self.kit = root / "params" / "instruments.yml"
        earlier = CAMPAIGN.replace("2025-07-24", "2025-06-12").replace(
            "[params/mill-yard-2025-06-12.yml]", "[]")
        (root / "params" / "mill-yard-2025-06-12.yml").write_text(earlier, encoding="utf-8")
        self.write()

    def write(self, old: str = "", new: str = "", *, kit_old: str = "", kit_new: str = "") -> Path:
        """Write both files with one passage of each replaced; return the campaign's."""
        assert old in CAMPAIGN
        assert kit_old in KIT
        text = CAMPAIGN.replace(old, new, 1) if old else CAMPAIGN
        kit = KIT.replace(kit_old, kit_new, 1) if kit_old else KIT
        self.path.write_text(text, encoding="utf-8")
        self.kit.write_text(kit, encoding="utf-8")
        return self.path


@pytest.fixture
def project(tmp_path: Path) -> Project:
    return Project(tmp_path / "project")
