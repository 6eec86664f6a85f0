"""A whole set of tables for the report's tests: every number is invented, nothing was measured.
Five surfaces; temperature by contact and stand-off, albedo, NDVI; every status and verdict word.
`hostile=True` gives labels and notes that would break out of markup, CSV or figure text.
"""

from __future__ import annotations

import math
from itertools import combinations
from typing import Any

import numpy as np
import pandas as pd
import sample_more
from sample_facts import CAMPAIGN, EARLIER, HOSTILE, LABELS, facts

from surveykit.core import TABLES, table

__all__ = ["CAMPAIGN", "EARLIER", "HOSTILE", "LABELS", "bare_tables", "empty_tables", "facts",
           "sky", "tables", "weather"]

UNIT = {"temperature": "degC", "albedo": "1", "ndvi": "1"}
NAN = float("nan")
# surface, quantity, kind, value, U, status, note, patches, passes
VALUES: list[tuple[str, str, str, float, float, str, str, int, int]] = [
    ("worn-asphalt", "temperature", "contact", 58.34, 1.22, "ok", "", 2, 5),
    ("coated-court", "temperature", "contact", 49.87, 1.41, "ok", "", 2, 4),
    ("pale-slabs", "temperature", "contact", 47.93, 2.18, "qualified",
     "one patch only, holds for this patch", 1, 2),
    ("lawn", "temperature", "contact", NAN, NAN, "not evaluated",
     "no contact dwell settled for 3 s", 1, 1),
    ("worn-asphalt", "temperature", "stand-off", 57.61, 1.74, "ok", "", 2, 4),
    ("coated-court", "temperature", "stand-off", 48.95, 1.88, "ok", "", 2, 4),
    ("lawn", "temperature", "stand-off", 33.12, 10.4, "qualified", "two passes only", 1, 2),
    ("planting-bed", "temperature", "stand-off", 36.48, NAN, "value only", "one pass", 1, 1),
    ("worn-asphalt", "albedo", "clear", 0.1023, 0.0071, "ok", "", 2, 4),
    ("coated-court", "albedo", "clear", 0.2871, 0.0118, "ok", "", 2, 4),
    ("pale-slabs", "albedo", "clear", 0.3012, 0.0125, "qualified",
     "sun at 47° from the zenith", 1, 2),
    ("lawn", "albedo", "clear", 0.2213, 0.0194, "ok", "", 2, 3),
    ("planting-bed", "albedo", "clear", NAN, NAN, "not evaluated",
     "width_m of the patch is missing", 1, 1),
    ("lawn", "ndvi", "", 0.7812, 0.0214, "ok", "", 2, 3),
    ("planting-bed", "ndvi", "", 0.5634, 0.0481, "qualified", "calibration expired", 1, 2),
    ("worn-asphalt", "ndvi", "", 0.0312, 0.0098, "ok", "", 2, 2),
]
SOURCES = {
    "temperature": [("emissivity of the surface", "surface:emissivity", 0.55),
                    ("between passes", "pass", 0.24), ("sky radiance", "day:sky", 0.12),
                    ("calibration offset", "thermal-2025-02:target:offset", 0.09)],
    "albedo": [("calibration gain, sky side", "shortwave-2025-01:sky_mV:gain", 0.36),
               ("calibration gain, ground side", "shortwave-2025-01:ground_mV:gain", 0.34),
               ("between passes", "pass", 0.18), ("surroundings", "surface:around", 0.08),
               ("levelling", "pass:level", 0.04)],
    "ndvi": [("between passes", "pass", 0.62), ("calibration gain, red", "rednir:red:gain", 0.25),
             ("dark reading", "day:dark", 0.13)],
}


FILL: dict[str, dict[str, Any]] = {
    "surfaces": {"spread": 0.4, "end_error": 0.002, "needed": 12.0}, "budget": {"narrower": 0.01},
    "differences": {"end_error": 0.002, "lower_all": float("nan"), "upper_all": float("nan")},
    "changes": {"end_error": 0.002},
}


def tables(*, hostile: bool = False) -> dict[str, pd.DataFrame]:
    """Return all tables of `core.TABLES`, filled."""
    surfaces = [_surface(*row) for row in VALUES]
    rows: dict[str, list[dict[str, Any]]] = {
        "surfaces": surfaces, "passes": _passes(), "budget": _budget(), "ledger": _ledger(),
        "checks": _checks(), "clocks": _clocks(), "differences": _differences(surfaces),
        "changes": _changes(), "corrections": sample_more.steps()}
    rows |= {name: getattr(sample_more, name)() for name in (
        "dwells", "waterfall", "ranks", "trends", "geometry", "histograms", "derived")}
    if hostile:
        rows["surfaces"][3]["note"] = "=HYPERLINK(\"http://example.org\") <i>x</i>"
        rows["checks"][0]["message"] = "</td><script>alert(2)</script> & {{ config }}"
        rows["passes"][0]["note"] = "@sum <b>note</b>"
    return {name: table(name, [_whole(name, row) for row in rows.get(name, [])]) for name in TABLES}


def _whole(name: str, row: dict[str, Any]) -> dict[str, Any]:
    blank = {"text": "", "number": NAN, "count": 0, "time": pd.NaT}  # columns not on the page
    return {column: row.get(column, blank[kind]) for column, kind in TABLES[name].items()}


def empty_tables() -> dict[str, pd.DataFrame]:
    """Return all tables without rows."""
    return {name: table(name, []) for name in TABLES}


def bare_tables() -> dict[str, pd.DataFrame]:
    """Return the tables of a refused date: one surface, not evaluated, nothing else."""
    row = _surface("lawn", "albedo", "", NAN, NAN, "not evaluated", "sun below the limit", 0, 0)
    return {**empty_tables(), "surfaces": table("surfaces", [_whole("surfaces", row)])}


def sky() -> pd.DataFrame:
    """Return a clear day's irradiance and sun zenith, a value a minute."""
    time = pd.date_range("2025-07-24 08:00", "2025-07-24 17:00", freq="min", tz="UTC", unit="ns")
    angle = np.linspace(-1.1, 1.1, len(time))
    return pd.DataFrame({"time_utc": time, "irradiance_w_m2": 960 * np.cos(angle),
                         "zenith_deg": 22 + 46 * np.abs(angle) ** 1.6})


def weather() -> pd.DataFrame:
    """Return air temperatures read by hand, one of them missing."""
    time = pd.date_range("2025-07-24 09:00", "2025-07-24 16:00", periods=8, tz="UTC", unit="ns")
    return pd.DataFrame({"time_utc": time, "air_temperature_degc": [
        29.4, 30.1, 31.2, NAN, 33.0, 33.8, 33.6, 33.1]})


def _surface(surface: str, quantity: str, kind: str, value: float, expanded: float, status: str,
             note: str, patches: int, passes: int) -> dict[str, Any]:
    lower, upper = value - expanded, value + expanded
    if surface == "coated-court" and quantity == "ndvi":
        upper += 0.5 * expanded
    k = {1: NAN, 2: 3.18, 3: 2.78}.get(passes, 2.36)
    return {
        "campaign": CAMPAIGN, "surface": surface, "quantity": quantity, "kind": kind,
        "unit": UNIT[quantity], "value": value, "u": expanded / k, "lower": lower, "upper": upper,
        "coverage": 0.95, "k": k if not math.isnan(expanded) else NAN,
        "dof": NAN if math.isnan(expanded) else (math.inf if quantity == "ndvi" else 3.4 * passes),
        "n_patches": patches, "n_passes": passes, "n_records": 612 * passes,
        "n_effective": 21.4 * passes,
        "u_at_least": 0.44 if status == "value only" else NAN, "status": status, "note": note}


def _passes() -> list[dict[str, Any]]:
    rows, minute = [], 0
    for surface, quantity, kind, value, _, status, note, patches, passes in VALUES:
        for n in range(max(passes, 1)):
            start = pd.Timestamp("2025-07-24 10:05", tz="UTC") + pd.Timedelta(minutes=minute)
            minute += 7
            gone = status == "not evaluated"
            patch = f"{surface[0].upper()}{1 + n % max(patches, 1)}"
            word = kind.replace("-", "") if quantity == "temperature" else quantity
            rows.append({
                "campaign": CAMPAIGN, "surface": surface, "patch": patch,
                "pass": f"{patch}-{word}-{n + 1}", "quantity": quantity, "kind": kind,
                "mode": kind if quantity == "temperature" else "",
                "instrument": {"temperature": "thermal", "albedo": "shortwave"}.get(
                    quantity, "rednir"),
                "unit": UNIT[quantity], "start_utc": start,
                "stop_utc": start + pd.Timedelta(seconds=185),
                "value_raw": value * 0.99, "value": NAN if gone else value * (1 + 0.004 * (n - 1)),
                "u_within": NAN if gone else 0.004 * abs(value), "n_records": 612,
                "n_effective": 21.4, "zenith_deg": 24.2 + 0.1 * minute,
                "flags": "few effective records" if n == 2 else "",
                "status": status if gone else "ok", "note": note if gone else "",
            })
    return rows


def _budget() -> list[dict[str, Any]]:
    rows = []
    for surface, quantity, kind, _, expanded, *_ in VALUES:
        if math.isnan(expanded):
            continue
        for source, scope, share in SOURCES[quantity]:
            rows.append({"campaign": CAMPAIGN, "surface": surface, "quantity": quantity,
                         "kind": kind, "scope": scope, "source": source, "unit": UNIT[quantity],
                         "u_input": 0.01, "contribution": expanded / 2.4 * math.sqrt(share),
                         "share": share})
    return rows


def _ledger() -> list[dict[str, Any]]:
    spec = [("thermal", "used", "", 8_420), ("thermal", "excluded", "head still settling", 2_311),
            ("thermal", "excluded", "out of range", 12), ("thermal", "outside passes", "", 10_857),
            ("shortwave", "used", "", 6_720), ("shortwave", "excluded", "unsteady sky", 655),
            ("shortwave", "outside passes", "", 14_225), ("rednir", "used", "", 930),
            ("rednir", "excluded", "unreadable line", 3), ("rednir", "outside passes", "", 1_227)]
    return [{"campaign": CAMPAIGN, "logger": logger, "file": f"{logger}.csv", "surface": "",
             "patch": "", "pass": "", "disposition": what, "reason": why, "records": n}
            for logger, what, why, n in spec]


def _checks() -> list[dict[str, Any]]:
    spec = [("range", "thermal", "target", "", "", "exclude", 12,
             "12 records lie above 120 °C", "engineering default"),
            ("flatline", "rednir", "nir_up", "lawn", "L1-ndvi-1", "flag", 14,
             "the reading stood still for 14 s", "engineering default"),
            ("rare irradiance", "shortwave", "sky_mV", "", "", "note", 41,
             "41 records exceed the extremely rare limit, as sunlit cloud edges do",
             "Long and Shi 2008"),
            ("sun height", "", "", "planting-bed", "P1-albedo-1", "refuse", 612,
             "the sun stood 72° from the zenith, beyond 70°", "engineering default")]
    return [{"campaign": CAMPAIGN, "check": check, "logger": logger, "column": column,
             "surface": surface, "pass": walk, "severity": severity, "records": n,
             "message": message, "source": source}
            for check, logger, column, surface, walk, severity, n, message, source in spec]


def _clocks() -> list[dict[str, Any]]:
    return [{"campaign": CAMPAIGN, "logger": logger, "method": method, "offset_s": offset,
             "u_s": u, "drift_ppm": drift, "status": status, "note": note}
            for logger, method, offset, u, drift, status, note in [
                ("thermal", "declared", 12.0, 0.5, 3.0, "ok", ""),
                ("shortwave", "declared", -3.5, 0.5, 0.0, "ok", ""),
                ("rednir", "not checked", 0.0, 2.0, 0.0, "not checked", "no clock was stated")]]


def _differences(surfaces: list[dict[str, Any]]) -> list[dict[str, Any]]:
    rows = []
    relevant = {"temperature": 1.0, "albedo": 0.02, "ndvi": 0.03}
    for one, other in combinations(surfaces, 2):
        if (one["quantity"], one["kind"]) != (other["quantity"], other["kind"]):
            continue
        d = one["value"] - other["value"]
        expanded = 0.8 * math.hypot(one["upper"] - one["value"], other["upper"] - other["value"])
        limit = relevant[one["quantity"]]
        if math.isnan(d):
            gone = one if math.isnan(one["value"]) else other
            verdict, note = "not evaluated", gone["note"]
        elif math.isnan(expanded):
            verdict, note = "not evaluated", "one pass"
        elif abs(d) <= expanded:
            verdict, note = "no difference shown", ""
        else:
            verdict = ("higher" if d > 0 else "lower") + (", small" if abs(d) < limit else "")
            note = ""
        rows.append({
            "campaign": CAMPAIGN, "quantity": one["quantity"], "kind": one["kind"],
            "surface": one["surface"], "other": other["surface"],
            "unit": "K" if one["quantity"] == "temperature" else "1", "difference": d,
            "u": expanded / 2.2, "lower": d - expanded, "upper": d + expanded, "coverage": 0.95,
            "p_adjusted": NAN if math.isnan(expanded) else (0.31 if abs(d) <= expanded else 2e-4),
            "could_have_missed": 1.4 * expanded, "verdict": verdict, "note": note})
    return rows


def _changes() -> list[dict[str, Any]]:
    ratio, did, raw = "ratio to control", "difference in differences", "raw"
    spec = [
        ("temperature", "contact", "coated-court", ratio, -7.94, 1.62, "partly matched", "lower",
         ""),
        ("temperature", "contact", "coated-court", did, -8.31, 1.55, "partly matched", "", ""),
        ("temperature", "contact", "coated-court", raw, -2.12, 1.91, "partly matched", "", ""),
        ("temperature", "contact", "pale-slabs", ratio, 0.34, 1.90, "partly matched",
         "no difference shown", "wind not stated on 2025-06-12"),
        ("temperature", "contact", "lawn", ratio, NAN, NAN, "not matched", "not evaluated",
         "no contact dwell settled for 3 s"),
        ("temperature", "stand-off", "lawn", ratio, NAN, NAN, "not matched", "not comparable",
         "the control was 5.2 K above the air on 2025-06-12, less than 8 K"),
        ("temperature", "stand-off", "coated-court", ratio, -0.62, 0.41, "matched",
         "lower, small", ""),
        ("albedo", "clear", "coated-court", raw, 0.1742, 0.0131, "matched", "higher", ""),
        ("albedo", "clear", "pale-slabs", raw, 0.0121, 0.0098, "matched", "higher, small", ""),
        ("albedo", "clear", "lawn", raw, -0.0042, 0.0089, "matched", "equivalent", ""),
        ("albedo", "clear", "worn-asphalt", raw, 0.0011, 0.0103, "matched",
         "no difference shown", ""),
        ("ndvi", "", "lawn", raw, -0.0413, 0.0290, "matched", "lower", "")]
    return [{
        "campaign": CAMPAIGN, "earlier": EARLIER, "quantity": quantity, "kind": kind,
        "surface": surface, "control": "" if method == raw else "worn-asphalt", "method": method,
        "unit": "K" if quantity == "temperature" else "1", "change": change, "u": half / 2.1,
        "lower": change - half, "upper": change + half, "coverage": 0.95,
        "comparability": conditions, "could_have_missed": 1.4 * half, "verdict": verdict,
        "note": note}
        for quantity, kind, surface, method, change, half, conditions, verdict, note in spec]
