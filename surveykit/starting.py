"""`surveykit new`: a parameter file and an empty field sheet to fill in."""

from __future__ import annotations

import json
import re
from collections.abc import Sequence
from pathlib import Path

from surveykit.core import InputError
from surveykit.handover import save_text
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
  sky_view: 1.0               # share of the sky seen from the ground; or horizon_deg: [30, 10, ...]
instruments: params/{kit}.yml   # your kit: an entry a logger
data_folder: data/{name}
field_sheet: field_sheet.csv
loggers:                      # FILL IN: those of the kit that were used this day
{loggers}
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


LOGGERS = ('  thermal: {files: "thermal*.csv"}  '
           "# clock: {offset_s: 0.0, u_s: 0.5} once it was compared")


def start(name: str, here: Path, logs: Sequence[Path] = ()) -> list[str]:
    """Write params/NAME.yml and data/NAME/field_sheet.csv; return what to do next.

    From sample files of its loggers, `logs`, a first params/NAME-instruments.yml is written as
    well; then a campaign that is there already stays as it is.

    Raises
    ------
    InputError
        If the name is not one, a file is there already, or a sample does not look like a log.
    """
    root = find_root(here)
    if not re.fullmatch(r"[a-z0-9][a-z0-9-]{0,63}", name):
        raise InputError(f"ID: got {name[:80]!r}; write lower-case letters, digits and -, "
                         "at most 64, such as mill-yard-2025-07-24")
    if re.fullmatch("con|prn|aux|nul|(com|lpt)[0-9]", name):
        raise InputError(f"ID: {name!r} is a device on some systems and cannot name a file there; "
                         "choose another ID")
    kit, loggers, written, over = "instruments", LOGGERS, {}, []
    if logs:
        from surveykit.intake.sketching import is_sheet, sketch

        sheets = [path for path in logs if is_sheet(path)]
        over = [f"{path.name}: a field sheet, no log; passed over" for path in sheets]
        logs = [path for path in logs if path not in sheets]
        if not logs:
            raise InputError(*over, "--log: none of the files is a log; name the loggers' files")
        kit = f"{name}-instruments"
        text, files = sketch(name, logs)
        written[root / "params" / f"{kit}.yml"] = text
        loggers = "\n".join(f"  {entry}: {{files: {json.dumps(some, ensure_ascii=False)}}}"
                            for entry, some in files.items())
    campaign = {
        root / "params" / f"{name}.yml": PARAMETERS.format(name=name, kit=kit, loggers=loggers),
        root / "data" / name / "field_sheet.csv": ",".join(COLUMNS) + "\n"}
    if not logs or not any(path.exists() for path in campaign):
        written |= campaign
    faults = [f"{path.relative_to(root).as_posix()}: is there already; choose another ID, or "
              "move it away" for path in written if path.exists()]
    if faults:
        raise InputError(*faults)
    try:
        for path, text in written.items():
            save_text(path, text)
    except BaseException:
        for path in written:
            path.unlink(missing_ok=True)
        raise
    file, next_step = (
        kit, "compare each CONFIRM with the logger's program, fill in each FILL IN") if logs else (
        name, f"put the logger files into data/{name}/, fill in both files")
    return [*over, *(f"wrote {path.relative_to(root).as_posix()}" for path in written),
            f"{next_step}, then: surveykit check params/{file}.yml"]
