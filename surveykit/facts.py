"""The plain facts of a run, for the page and for run.json: what was used, set and left out."""

from __future__ import annotations

import calendar
import datetime as dt
import platform
from importlib.metadata import version
from typing import Any

from surveykit.handover import load_facts
from surveykit.intake.params import load
from surveykit.opening import Survey

PACKAGES = ("surveykit", "numpy", "scipy", "pandas", "pvlib", "pydantic", "PyYAML", "matplotlib",
            "seaborn", "papermill", "nbconvert", "ipykernel")
KELVIN = 273.15  # offsets are shown in the unit that is logged

def collect(survey: Survey) -> dict[str, Any]:
    """Return the facts of a run; nothing in it depends on the machine's folders or on the clock."""
    campaign, parameters = survey.campaign, survey.parameters
    statistics, site = campaign.settings.statistics, campaign.site
    path, drawn = survey.inputs[0]["path"], survey.run_folder / "surfaces" / "draws.json"
    surfaces = {name: surface.label for name, surface in campaign.surfaces.items()}
    return {
        "campaign": campaign.campaign, "title": campaign.title, "date": campaign.date,
        "site": {"name": site.name, "latitude": site.latitude, "longitude": site.longitude,
                 "elevation_m": site.elevation_m, "time_zone": site.time_zone},
        "time_zone": site.time_zone, "conditions": _conditions(survey),
        "sky": campaign.conditions.sky, "params_file": path,
        "inputs": list(survey.inputs), "versions": versions(), "seed": statistics.seed,
        "draws": load_facts(drawn)["draws"] if drawn.is_file() else statistics.draws,
        "coverage": statistics.coverage,
        "settings": [dict(row) for row in campaign.settings.listing()],
        "instruments": _instruments(survey),
        "surfaces": surfaces, "labels": _dates(survey) | surfaces,
        "control": campaign.comparison.control or "",
        "relevant_change": campaign.relevant_change.model_dump(),
        "earlier": [p.stem for p in parameters.earlier], "notes": list(parameters.notes),
        "crew": list(campaign.crew),
        "interventions": [one.model_dump(mode="json") for one in campaign.interventions],
        "remarks": campaign.notes.splitlines(),
        "rerun": f"surveykit run {path}",
    }


def versions() -> dict[str, str]:
    """Return the versions of Python and of the packages that shape the numbers and the page."""
    return {"Python": platform.python_version()} | {name: version(name) for name in PACKAGES}


def _dates(survey: Survey) -> dict[str, str]:
    """Return the date of each earlier campaign in words, with its name where two share a date."""
    days = {path.stem: dt.date.fromisoformat(load(path).campaign.date)
            for path in survey.parameters.earlier}
    dates = {name: f"{day.day} {calendar.month_name[day.month]} {day.year}"
             for name, day in days.items()}
    return {name: date if [*dates.values()].count(date) == 1 else f"{date} ({name})"
            for name, date in dates.items()}


def _conditions(survey: Survey) -> list[str]:
    stated = survey.campaign.conditions
    lines = []
    if stated.sky:
        lines.append(f"Sky noted as {stated.sky}.")
    if stated.rain_48h_mm is not None:
        lines.append("No rain in the 48 h before." if stated.rain_48h_mm == 0 else
                     f"{stated.rain_48h_mm:g} mm of rain in the 48 h before.")
    return lines


def _instruments(survey: Survey) -> list[dict[str, Any]]:
    rows = []
    for name in survey.campaign.loggers:
        instrument = survey.parameters.kit[name]
        for c in survey.parameters.channels(name):
            calibration = c.calibration
            status = "not stated"
            if calibration is not None:
                expired = calibration.expired_on(survey.campaign.date)
                status = "expired" if expired else "valid on the day"
            rows.append({
                "logger": name, "serial": instrument.serial or "", "column": c.column,
                "quantity": c.quantity, "unit": c.unit,
                "calibration": calibration.id if calibration else "",
                "calibration_date": calibration.date if calibration else "",
                "gain": c.gain.value, "u_gain": c.u_gain,
                "offset": round(c.offset.value - (KELVIN if c.unit == "degC" else 0.0), 9),
                "u_offset": c.u_offset, "status": status})
    return rows
