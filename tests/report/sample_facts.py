"""The plain facts of the invented campaign in `sample`."""

from __future__ import annotations

from typing import Any

CAMPAIGN, EARLIER = "mill-yard-2025-07-24", "mill-yard-2025-06-12"
LABELS = {"worn-asphalt": "Worn asphalt", "coated-court": "Coated court",
          "pale-slabs": "Pale concrete slabs", "lawn": "Lawn", "planting-bed": "Planting bed"}
HOSTILE = {**LABELS, "lawn": "<b>Lawn</b> {{ 7*7 }} & $x_1$ \"q\"",
           "planting-bed": "Bed </table><script>alert(1)</script>"}


def facts(*, hostile: bool = False) -> dict[str, Any]:
    """Return the run's plain facts."""
    labels = HOSTILE if hostile else LABELS
    return {
        "campaign": CAMPAIGN, "title": "Mill Yard, five weeks after the pale coating"
        + (" <i>&</i>" if hostile else ""), "date": "2025-07-24",
        "site": {"name": "Mill Yard", "latitude": 41.30, "longitude": -7.75, "elevation_m": 120.0,
                 "time_zone": "Europe/Lisbon"},
        "conditions": ["Sky declared clear; clearness between 0.86 and 0.93 during the passes.",
                       "Air 29.4 to 33.8 °C, wind 0.8 to 2.6 m s⁻¹.",
                       "No rain in the 48 hours before."],
        "params_file": f"params/{CAMPAIGN}.yml", "time_zone": "Europe/Lisbon",
        "inputs": [{"path": f"params/{CAMPAIGN}.yml", "sha256": "3f" * 32, "bytes": 1834},
                   {"path": f"demo_data/{CAMPAIGN}/thermal.csv", "sha256": "a7" * 32,
                    "bytes": 2_418_337},
                   {"path": f"demo_data/{CAMPAIGN}/field_sheet.csv", "sha256": "0c" * 32,
                    "bytes": 2210}],
        "versions": {"surveykit": "0.1.0", "python": "3.11.7", "numpy": "2.4.0",
                     "pandas": "3.1.1"},
        "seed": 20251, "draws": 20_000, "coverage": 0.95,
        "settings": [
            {"section": "temperature", "name": "sky_radiance_u", "value": 0.15, "unit": "1",
             "origin": "engineering default", "source": "engineering default"},
            {"section": "albedo", "name": "zenith_standard_deg", "value": 45.0, "unit": "deg",
             "origin": "standard", "source": "ASTM E1918, sun angle to the normal below 45°"},
            {"section": "albedo", "name": "zenith_max_deg", "value": 65.0, "unit": "deg",
             "origin": "yours", "source": "parameter file"},
            {"section": "quality", "name": "ranges",
             "value": {"albedo": [-0.01, 1.05], "temperature_k": [233.15, 393.15]}, "unit": "",
             "origin": "engineering default", "source": "engineering default"},
            {"section": "statistics", "name": "seed", "value": 20251, "unit": "1",
             "origin": "engineering default", "source": "any number; printed here to rerun"}],
        "instruments": [
            {"logger": "thermal", "serial": "T-07", "column": "target",
             "quantity": "brightness_temperature", "unit": "degC", "calibration": "thermal-2025-02",
             "calibration_date": "2025-02-10", "gain": 1.0, "u_gain": 0.0, "offset": 0.0,
             "u_offset": 0.2, "status": "valid"},
            {"logger": "shortwave", "serial": "S-02", "column": "sky_mV",
             "quantity": "shortwave_down", "unit": "mV", "calibration": "shortwave-2025-01",
             "calibration_date": "2025-01-20", "gain": 10.4, "u_gain": 0.015, "offset": 0.0,
             "u_offset": 3.0, "status": "valid"},
            {"logger": "rednir", "serial": None, "column": "red_up", "quantity": "red_up",
             "unit": "mV", "calibration": "rednir-2022", "calibration_date": "2022-03-01",
             "gain": 0.82, "u_gain": 0.02, "offset": -0.01, "u_offset": None,
             "status": "expired"}],
        "surfaces": labels, "labels": {EARLIER: "12 June 2025", **labels},
        "interventions": [], "control": "worn-asphalt", "earlier": [EARLIER],
        "relevant_change": {"temperature": 1.0, "albedo": 0.02, "ndvi": 0.03},
        "notes": ["The calibration of rednir (rednir-2022) expired on 2024-03-01."],
        "rerun": f"surveykit run params/{CAMPAIGN}.yml",
    }
