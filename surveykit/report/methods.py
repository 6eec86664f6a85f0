"""What the appendix says of the methods: one point a step, with what it was taken from.

"From memory" marks a source whose text was not at hand when the method was written down.
"""

from __future__ import annotations

from collections.abc import Mapping

import pandas as pd

from . import wording as w
from .sentences import Facts

SHARED_FIRST = (
    "Records: each logged line is one record; it is used, or excluded by one first reason, or lies "
    "outside all passes. Limits of irradiance are those of Long and Shi (2008); other limits stand "
    "in the settings with their origin.",
    "Sun: positions after Reda and Andreas (2004, NREL/TP-560-34302), the clear sky after Ineichen "
    "(2008), both as in the library pvlib.",
)
METHODS: dict[tuple[str, str], str] = {
    ("temperature", "contact"):
        "Temperature, contact: the head is pressed on the ground, so what the ground reflects is "
        "the bore and body of the head, not the sky. The reading's band radiance is solved for the "
        "surface's with both emissivities and the logged body temperature (two-surface "
        "enclosure; from memory). Placements are means of their settled records.",
    ("temperature", "stand-off"):
        "Temperature, stand-off: the band radiance of the reading, less what the surface reflects "
        "of sky and surroundings, over its emissivity. The sky's radiance in 8 to 14 µm follows "
        "Idso (1981) in the hemispheric form of Kimball, Idso and Aase (1982), from air "
        "temperature and humidity. Radiances are integrals of Planck's law over the stated band.",
    ("temperature", "longwave"):
        "Temperature, longwave: the Stefan and Boltzmann law with the broadband emissivity, less "
        "the reflected part of the downward longwave irradiance.",
    ("albedo", ""):
        "Albedo: sum of the upward over sum of the downward readings of a pass, dark readings "
        "taken off first. The share of the view that the patch fills is the view factor of a disc "
        "or rectangle (Howell, catalogue of configuration factors, B-4 and B-12).",
    ("ndvi", ""):
        "NDVI: (near-infrared − red) / (near-infrared + red) of reflectance factors, each the sum "
        "of upward over the sum of downward readings of a pass, dark readings taken off first "
        "(terms after Schaepman-Strub and others 2006).",
}
COMPARED = (
    "Changes of temperature: the excess over the air is compared with that of the control on both "
    "dates; the plain difference in differences (Stewart-Oaten and others 1986) stands beside it, "
    "unjudged. Changes of albedo and NDVI: the control’s own change is taken off.",
)


def methods(tables: Mapping[str, pd.DataFrame], facts: Facts) -> list[str]:
    """Return the methods of the quantities that this campaign has, with their citations."""
    families = [pair for pair, _ in w.families(tables["surfaces"])]
    lines = [*SHARED_FIRST]
    for (quantity, kind), text in METHODS.items():
        if any(q == quantity and kind in ("", k) for q, k in families):
            lines.append(text)
            if quantity == "albedo":
                lines.append(likeness(tables["passes"], facts))
    return [*lines, *(COMPARED if len(tables["changes"]) else ())]


def likeness(passes: pd.DataFrame, facts: Facts) -> str:
    """Say how the albedo passes stand to ASTM E1918, only as far as the record goes.

    References
    ----------
    ASTM E1918: sun within 45 degrees of the normal (its scope); clear sky, head at 50 cm, surface
    at least 4 m across (from memory).
    """
    known = facts.get("albedo_geometry") or {}
    sky, size = facts.get("sky"), known.get("size_min_m")
    low, high = known.get("height_min_m"), known.get("height_max_m")
    zenith = passes.loc[passes["quantity"] == "albedo", "zenith_deg"].dropna()
    missing = [name for name, value in (
        ("the sky", sky), ("the height of the head", low), ("the size of every patch", size),
        ("the sun’s height", len(zenith) or None)) if value is None]
    if sky is None or low is None or high is None or size is None or missing:
        return (f"ASTM E1918: {w.listing(missing)} {'is' if len(missing) == 1 else 'are'} not on "
                "record, so nothing is said of how the albedo passes stand to that standard.")
    deviations = [text for text, met in (
        (f"sun up to {zenith.max():.0f}° from the zenith instead of less than 45°",
         zenith.max() < 45),
        (f"sky noted as {sky} instead of clear", sky == "clear"),
        (f"head at {_span(low, high)} cm instead of 50 cm", abs(low - 0.5) + abs(high - 0.5) < 0.1),
        (f"patches from {w.figures(size, 2)} m across instead of at least 4 m", size >= 4),
        ("agreement of three readings within 0.01 not examined", False)) if not met]
    return (f"ASTM E1918-like, with these deviations: {'; '.join(deviations)}. The conditions on "
            "height, size and readings are quoted from memory; no conformity is claimed.")


def _span(low: float, high: float) -> str:
    one, other = f"{100 * low:.0f}", f"{100 * high:.0f}"
    return one if one == other else f"{one} to {other}"
