"""What the appendix says of the methods: one point a step, with what it was taken from.

"From memory" marks a source whose text was not at hand when the method was written down.
"""

from __future__ import annotations

from collections.abc import Mapping

import pandas as pd

from . import wording as w

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


def methods(tables: Mapping[str, pd.DataFrame]) -> list[str]:
    """Return the methods of the quantities that this campaign has, with their citations."""
    families = [pair for pair, _ in w.families(tables["surfaces"])]
    lines = [*SHARED_FIRST]
    for (quantity, kind), text in METHODS.items():
        if any(q == quantity and kind in ("", k) for q, k in families):
            lines.append(text)
            if quantity == "albedo":
                lines.append(_likeness(tables["geometry"]))
    return [*lines, *(COMPARED if len(tables["changes"]) else ())]


def _likeness(geometry: pd.DataFrame) -> str:
    """Say how the albedo passes stand to ASTM E1918, only as far as the record goes."""
    notes = geometry.loc[geometry["role"] == "used", "note"]
    told = [f"{note} ({w.plural(int(n), 'pass', 'passes')})"
            for note, n in notes.value_counts(sort=False).items()] or [
        "the patches' sizes are not on record, so nothing is said of how the passes stand to it"]
    return (f"ASTM E1918: {'; '.join(told)}. Its conditions on height, size and readings are "
            "quoted from memory; no conformity is claimed.")
