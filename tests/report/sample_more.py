"""More tables of the invented campaign: from inside the passes, over the dates, and asked for."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
from sample_facts import CAMPAIGN

SERIES = ["2025-05-01", "2025-06-12", "2025-07-24"]


def ranks() -> list[dict[str, Any]]:
    return [{"campaign": CAMPAIGN, "quantity": "albedo", "kind": "clear", "surface": surface,
             "place": place, "probability": share}
            for surface, shares in (("worn-asphalt", (0.05, 0.95)), ("coated-court", (0.95, 0.05)))
            for place, share in enumerate(shares, start=1)]


def trends() -> list[dict[str, Any]]:
    return [{"campaign": CAMPAIGN, "quantity": "albedo", "kind": "clear",
             "surface": "coated-court", "control": "worn-asphalt", "method": method,
             "unit": "a-1", "dates": 3, "first": "2025-06-12", "last": "2025-07-24",
             "slope": 0.31, "u": 0.1, "lower": 0.1, "upper": 0.52, "coverage": 0.95, "p": 0.01,
             "verdict": verdict, "note": ""}
            for method, verdict in (("weighted line", "higher"), ("ordinary line", ""))]


def dwells() -> list[dict[str, Any]]:
    first = pd.Timestamp("2025-07-24 10:05:10", tz="UTC")
    return [{"campaign": CAMPAIGN, "surface": "worn-asphalt", "patch": "W1", "pass": "W1-contact-1",
             "dwell": n, "start_utc": first + pd.Timedelta(seconds=9.5 * n),
             "stop_utc": first + pd.Timedelta(seconds=9.5 * n + 5), "value": 58.1 + 0.2 * n,
             "u": 0.3, "n_records": 50} for n in range(3)]


def steps() -> list[dict[str, Any]]:
    return [{"campaign": CAMPAIGN, "surface": "worn-asphalt", "pass": "W1-standoff-1",
             "quantity": "temperature", "kind": "stand-off", "unit": "degC", "step": step,
             "value": value} for step, value in [
                 ("as logged", 55.9), ("emissivity setting taken out", 55.9),
                 ("emissivity and background", 57.6)]]


def waterfall() -> list[dict[str, Any]]:
    spec = [("excluded", "unreadable line", 3, 2_157), ("outside passes", "", 1_227, 930),
            ("used", "", 930, 930)]
    return [{"campaign": CAMPAIGN, "logger": "rednir", "file": "rednir.csv", "column": "nir_up",
             "surface": "", "patch": "", "pass": "", "disposition": what, "reason": why,
             "records": n, "remaining": left} for what, why, n, left in spec]


def geometry() -> list[dict[str, Any]]:
    """One albedo pass on each of two patches: contrast 0.5, used at 50 and 20 cm."""
    rows = []
    for surface, patch, used in (("worn-asphalt", "W1", 0.5), ("lawn", "L1", 0.2)):
        for height in (0.05, 0.1, 0.2, 0.5, 1.0):
            foreign, shade = height**2 / 4, 0.0001 / height**2
            role = "used" if height == used else "best" if height == 0.1 else ""
            rows.append({
                "campaign": CAMPAIGN, "surface": surface, "patch": patch,
                "pass": f"{patch}-albedo-1", "height_m": height, "role": role, "foreign": foreign,
                "contamination": 0.5 * foreign, "shade": shade, "effect": 0.5 * foreign + shade,
                "note": "E1918-like, deviations: head at 20 cm, not 50" if role == "used" else ""})
    return rows


def histograms() -> list[dict[str, Any]]:
    """Ten bars with two hills."""
    counts = [3, 14, 31, 12, 2, 1, 5, 22, 40, 9]
    return [{"campaign": CAMPAIGN, "surface": "lawn", "patch": "L1", "pass": "L1-standoff-1",
             "quantity": "temperature", "kind": "stand-off", "unit": "degC", "lower": 30.0 + n,
             "upper": 31.0 + n, "n_records": count} for n, count in enumerate(counts)]


def derived() -> list[dict[str, Any]]:
    """One product with a value, one that lacks an input."""
    base = {"campaign": CAMPAIGN, "surface": "lawn", "coverage": 0.95}
    nan = float("nan")
    return [base | {"product": "net_radiation", "form": "as measured", "unit": "W m-2",
                    "value": 512.3, "u": 14.0, "lower": 484.0, "upper": 540.6, "status": "ok",
                    "note": ""},
            base | {"product": "sri", "form": "", "unit": "1", "value": nan, "u": nan,
                    "lower": nan, "upper": nan, "status": "not evaluated",
                    "note": "broadband emissivity is missing"}]


def walked() -> pd.DataFrame:
    """A patch of 4 m walked in four lanes: a plane of temperature along x."""
    x, y = (part.ravel() for part in np.meshgrid(np.linspace(0.1, 3.9, 39), [0.5, 1.5, 2.5, 3.5]))
    return pd.DataFrame({"surface": "lawn", "patch": "L1", "pass": "L1-standoff-1",
                         "quantity": "temperature", "kind": "stand-off", "unit": "degC",
                         "x_m": x, "y_m": y, "value": 30 + x})


def cooling() -> pd.DataFrame:
    """Two passes whose readings follow 0.5 K per root second."""
    seconds = np.arange(1.5, 8.0, 0.5)
    return pd.concat([pd.DataFrame({
        "surface": "worn-asphalt", "pass": f"W1-contact-{n}", "placement": 1, "seconds": seconds,
        "below_k": 0.5 * np.sqrt(seconds), "law_k": 0.5 * np.sqrt(seconds), "rate": 0.5})
        for n in (1, 2)])


def series() -> pd.DataFrame:
    """Albedo of a court over three dates."""
    return pd.DataFrame([{
        "surface": "coated-court", "quantity": "albedo", "kind": "clear", "unit": "1",
        "value": value, "lower": value - 0.01, "upper": value + 0.01, "date": date}
        for date, value in zip(SERIES, (0.11, 0.30, 0.29), strict=True)])
