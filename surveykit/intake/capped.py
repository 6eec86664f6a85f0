"""Stretches of the day which the sheet gives to a logger's channel: dark readings, covers."""

from __future__ import annotations

from surveykit.intake.fieldsheet import Sheet


def windows(sheet: Sheet, kind: str, logger: str, quantity: str) -> list[tuple[int, int]]:
    """Return (start_ns, stop_ns) of the sheet's rows of `kind` that concern this channel."""
    product = {"shortwave": "albedo", "red": "ndvi", "nir": "ndvi"}.get(quantity.split("_")[0], "")
    return [(e.start_ns, e.stop_ns) for e in sheet.entries if e.entry == kind
            and e.instrument in ("", logger) and e.quantity in ("", product)]
