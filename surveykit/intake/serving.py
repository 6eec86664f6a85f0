"""Which channels serve a pass: the rule that the field sheet and the passes share."""

from __future__ import annotations

from dataclasses import dataclass

from surveykit.intake.params import Channel, Parameters

QUANTITIES = ("temperature", "albedo", "ndvi")
MODES = ("contact", "stand-off")
INFRARED = ("brightness_temperature",)
LONGWAVE = ("longwave_up", "longwave_down")
NEEDS = {
    "albedo": ("shortwave_down", "shortwave_up"),
    "ndvi": ("red_down", "red_up", "nir_down", "nir_up"),
}

Offers = dict[str, dict[str, Channel]]


@dataclass(frozen=True)
class Service:
    """The kind of a pass ("" for albedo and ndvi) and its channels by their quantity."""

    kind: str
    channels: dict[str, Channel]

    @property
    def loggers(self) -> tuple[str, ...]:
        """Return the loggers behind the channels, each once."""
        return tuple(dict.fromkeys(channel.logger for channel in self.channels.values()))


def offers(parameters: Parameters) -> Offers:
    """Return, for each logger of the campaign, its channels by their quantity."""
    return {logger: {channel.quantity: channel for channel in parameters.channels(logger)}
            for logger in parameters.campaign.loggers}


def serve(offered: Offers, quantity: str, mode: str, instrument: str) -> Service:
    """Return the channels that serve a pass.

    The logger named as `instrument` comes first; what it lacks, or everything if none is named,
    comes from the only logger that offers it.

    Raises
    ------
    ValueError
        With what is missing or ambiguous and what to write on the sheet.
    """
    if instrument and instrument not in offered:
        raise ValueError(f"instrument {instrument!r} is none of the campaign's loggers; "
                         f"write one of {', '.join(offered)}")
    kind, needed = _kind(offered, quantity, mode, instrument)
    if instrument and not any(name in offered[instrument] for name in needed):
        raise ValueError(f"instrument {instrument!r} has no column of {' or '.join(needed)}, which "
                         f"{_a_pass(quantity, kind)} needs; name another, or leave it blank")
    missing = [name for name in needed
               if not any(name in columns for columns in offered.values())]
    if missing:
        raise ValueError(f"no logger of the campaign offers {' and '.join(missing)}, which "
                         f"{_a_pass(quantity, kind)} needs; add the logger under loggers, or take "
                         "the row out")
    return Service(kind, {name: _pick(offered, name, instrument) for name in needed})


def _kind(offered: Offers, quantity: str, mode: str,
          instrument: str) -> tuple[str, tuple[str, ...]]:
    if quantity != "temperature":
        if mode:
            raise ValueError(f"mode {mode!r} beside quantity {quantity}; only an infrared "
                             "temperature pass has a mode: leave it blank")
        return "", NEEDS[quantity]
    places = [offered[instrument]] if instrument else list(offered.values())
    infrared = any(INFRARED[0] in columns for columns in places)
    longwave = any(name in columns for columns in places for name in LONGWAVE)
    if mode and not infrared and longwave:
        raise ValueError(f"mode {mode!r}, but a longwave pair serves this pass, and it has none: "
                         "leave mode blank")
    if mode or not (infrared or longwave):
        return mode, INFRARED
    if infrared and not (longwave and instrument):
        others = [name for name, columns in offered.items() if LONGWAVE[0] in columns]
        also = f", or instrument {others[0]} for its longwave pair" if others else ""
        raise ValueError(f"an infrared temperature pass needs a mode; write contact or "
                         f"stand-off{also}")
    return "longwave", LONGWAVE


def _pick(offered: Offers, name: str, instrument: str) -> Channel:
    if instrument and name in offered[instrument]:
        return offered[instrument][name]
    having = [logger for logger, columns in offered.items() if name in columns]
    if len(having) > 1:
        raise ValueError(f"{' and '.join(having)} both offer {name}; "
                         "name the one that was used under instrument")
    return offered[having[0]][name]


def _a_pass(quantity: str, kind: str) -> str:
    article = "an" if quantity[0] in "an" and not kind else "a"
    return f"{article} {f'{kind} {quantity}' if kind else quantity} pass"
