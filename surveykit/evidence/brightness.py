"""What an infrared head saw: its band, its housing, and the brightness behind what it logged."""

from __future__ import annotations

from surveykit.core import FloatArray, Input
from surveykit.evidence.conditions import NS, Day, Span
from surveykit.evidence.models import RESPONSE
from surveykit.evidence.parts import NotEvaluated, fixed
from surveykit.intake.params import Channel
from surveykit.intake.sheet_words import Entry
from surveykit.physics.bands import Band, band
from surveykit.physics.thermal import brightness_without_setting


def window_of(channel: Channel) -> Band:
    """Return the band of an infrared channel, or refuse the pass that needs it."""
    if channel.band_um is None:
        raise NotEvaluated(f"band_um of {channel.logger}, {channel.column} is missing")
    return band(*channel.band_um, channel.band_response)


def band_inputs(channel: Channel) -> list[Input]:
    """Return the band of an infrared channel as inputs of the models."""
    window = window_of(channel)
    return [fixed("band_low_um", window.low_um), fixed("band_high_um", window.high_um),
            *(fixed(f"{RESPONSE}{um!r}", value) for um, value in window.response)]


def housing(day: Day, channel: Channel, start_ns: int, stop_ns: int) -> Input | None:
    """Return the housing temperature [K] of an infrared head over a time, if it was logged."""
    for body in day.channels.get("housing_temperature", []):
        if body.logger == channel.logger:
            _, value = day.readings(body, start_ns, stop_ns)
            if value.size:
                return Input("body_k", float(value.mean()), body.u_offset, body.offset_scope,
                             f"housing temperature of {body.logger}")
    return None


def setting_inputs(day: Day, channel: Channel, span: Span) -> list[Input]:
    """Return the emissivity set in the instrument, and what it took the ground to reflect.

    Raises
    ------
    NotEvaluated
        If the setting, or with one other than 1 the reflected temperature, is not known.
    """
    where, setting = f"{channel.logger}, {channel.column}", channel.emissivity_setting
    if setting is None:
        raise NotEvaluated(f"emissivity_setting of {where} is missing")
    if setting == 1.0:
        return [fixed("emissivity_setting", setting)]
    if channel.reflected_setting_k is not None:
        reflected = fixed("reflected_k", channel.reflected_setting_k)
    else:
        body = housing(day, channel, span.start_ns, span.stop_ns)
        if body is None:
            raise NotEvaluated(
                f"{where} was logged with emissivity setting {setting:g}; write its "
                "reflected_setting_degC, or log its housing temperature")
        reflected = Input("reflected_k", body.value, body.u, body.scope,
                          "reflected temperature in the instrument, taken as its housing's")
    return [fixed("emissivity_setting", setting), reflected]


def seen_in_rows(day: Day, kind: str, channel: Channel) -> list[tuple[Entry, float | None]]:
    """Return the sheet's rows of a kind for a head, each with the mean brightness [K] in it."""
    return [(e, seen_in(day, channel, e)) for e in day.sheet.entries
            if e.entry == kind and e.instrument in ("", channel.logger)]


def seen_in(day: Day, channel: Channel, row: Entry) -> float | None:
    """Return the mean brightness [K] in a row of the sheet; None if unread.

    Settled readings between the uncertain edges count.
    """
    start, stop = settled_part(day, channel, row)
    _, seen = seen_between(day, channel, row, start, stop)
    return float(seen.mean()) if seen.size else None


def settled_part(day: Day, channel: Channel, row: Entry) -> tuple[int, int]:
    """Return what is left of a row [ns] between its uncertain edges, the head settled."""
    edge = min(row.edge_u_s, (row.stop_ns - row.start_ns) / NS / 4)
    edge += day.parameters.campaign.settings.passes.settle_time_constants * channel.time_constant_s
    return row.start_ns + round(edge * NS), row.stop_ns - round(edge * NS)


def seen_between(day: Day, channel: Channel, row: Entry, start_ns: int,
                 stop_ns: int) -> tuple[FloatArray, FloatArray]:
    """Return time [s from the row's start] and brightness [K] of readings beside or in a row.

    An emissivity set in the instrument is undone as in a pass.
    """
    time_ns, logged = day.readings(channel, start_ns, stop_ns)
    time = (time_ns - row.start_ns) / NS
    if not logged.size:
        return time, logged
    held = {i.name: i.value for i in setting_inputs(day, channel, row)}
    return time, logged if held["emissivity_setting"] == 1.0 else brightness_without_setting(
        window_of(channel), logged, held["emissivity_setting"], held["reflected_k"])
