"""Stretches of the day which the sheet gives to a logger's channel: dark readings, covers."""

from __future__ import annotations

from surveykit.intake.fieldsheet import Sheet
from surveykit.intake.records import NS

PRODUCTS = {"brightness": "temperature", "longwave": "temperature", "shortwave": "albedo",
            "red": "ndvi", "nir": "ndvi"}


def windows(sheet: Sheet, kind: str, logger: str, quantity: str, *,
            certain: bool = False) -> list[tuple[int, int]]:
    """Return (start_ns, stop_ns) of the sheet's rows of `kind` that concern this channel.

    With `certain`, each end gives way by the uncertainty of its written time, so that what is
    left lies within the row whatever the watch said; rows of which nothing is left are kept, with
    a stop not after their start.
    """
    product = PRODUCTS.get(quantity.split("_")[0], "")
    rows = [e for e in sheet.entries if e.entry == kind
            and e.instrument in ("", logger) and e.quantity in ("", product)]
    edges = [round(e.edge_u_s * NS) if certain else 0 for e in rows]
    return [(e.start_ns + edge, e.stop_ns - edge) for e, edge in zip(rows, edges, strict=True)]
