"""`surveykit new`: a parameter file and an empty field sheet to fill in."""

from __future__ import annotations

import re
from pathlib import Path

from surveykit.core import InputError
from surveykit.intake.params import find_root

PARAMETERS = """\
# yaml-language-server: $schema=campaign.schema.json
# Fill in what is marked, then: surveykit check params/{name}.yml
# Times and dates stand in quotes. Every other key is explained in campaign.schema.json.
format: 1
campaign: {name}
title: "..."                  # FILL IN: the title of the report
date: "..."                   # FILL IN: the day of the survey, as "2025-07-24"
site:
  name: "..."                 # FILL IN
  latitude: 0.0               # FILL IN: degrees north, south negative
  longitude: 0.0              # FILL IN: degrees east, west negative
  elevation_m: 0              # FILL IN
  time_zone: "..."            # FILL IN: zone of the field sheet, as Europe/Lisbon or UTC
  sky_view: 1.0               # share of the sky seen from the ground
instruments: params/instruments.yml   # your kit: an entry a logger
data_folder: data/{name}
field_sheet: field_sheet.csv
loggers:                      # FILL IN: those of the kit that were used this day
  thermal: {{files: "thermal*.csv"}}  # clock: {{offset_s: 0.0, u_s: 0.5}} once it was compared
surfaces:                     # FILL IN: each kind of ground on the field sheet
  first-surface:
    label: First surface
    emissivity: {{value: 0.95, u: 0.02, source: "FILL IN: where the value comes from"}}
    around: {{albedo: 0.20, u: 0.05}}
conditions: {{}}                # sky: clear | broken | overcast, rain_48h_mm: 0
settings: {{}}                  # any default of the method, changed
comparison: {{}}                # earlier: [params/ID.yml], control: SURFACE
"""

COLUMNS = ("campaign", "date", "entry", "surface", "patch", "quantity", "mode", "instrument",
           "start", "stop", "height_cm", "width_m", "length_m", "lanes", "reading", "reading_u",
           "note")


def start(name: str, here: Path) -> list[str]:
    """Write params/NAME.yml and data/NAME/field_sheet.csv; return what to do next.

    Raises
    ------
    InputError
        If the name is not one, or either file is there already.
    """
    root = find_root(here)
    if not re.fullmatch(r"[a-z0-9][a-z0-9-]{0,63}", name):
        raise InputError(f"ID: got {name[:80]!r}; write lower-case letters, digits and -, "
                         "at most 64, such as mill-yard-2025-07-24")
    parameters, sheet = root / "params" / f"{name}.yml", root / "data" / name / "field_sheet.csv"
    faults = [f"{path.relative_to(root).as_posix()}: is there already; choose another ID, or "
              "move it away" for path in (parameters, sheet) if path.exists()]
    if faults:
        raise InputError(*faults)
    sheet.parent.mkdir(parents=True, exist_ok=True)
    sheet.write_text(",".join(COLUMNS) + "\n", encoding="utf-8", newline="\n")
    parameters.write_text(PARAMETERS.format(name=name), encoding="utf-8", newline="\n")
    shown = [path.relative_to(root).as_posix() for path in (parameters, sheet)]
    return [f"wrote {shown[0]}", f"wrote {shown[1]}",
            f"put the logger files into data/{name}/, fill in both files, then: "
            f"surveykit check {shown[0]}"]
