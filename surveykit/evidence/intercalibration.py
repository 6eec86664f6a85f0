"""The ratio of two heads' gains: found by swapping them, over a panel, or from a certificate."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from surveykit.core import Input
from surveykit.evidence.conditions import NS, Day
from surveykit.intake.params import Channel
from surveykit.intake.sheet_words import Entry
from surveykit.physics.instrument import HeadRatio, head_ratio_by_swap
from surveykit.statistics.series import mean_of_series


class Ratios(NamedTuple):
    """Response of the ground head over that of the sky head: one value a swap or a panel row.

    `few` says that fewer swaps, or shorter ones, are behind it than recommended.
    `per_up_zero` and `per_down_zero` say how the ratio moves, relative, with the zero errors of
    the ground head and the sky head in their usual places [1 / unit].
    """

    value: float
    u: float
    n: int
    sd: float
    per_up_zero: float = 0.0
    per_down_zero: float = 0.0
    few: bool = False


def swapped(day: Day, up: Channel, down: Channel, product: str,
            ground_share: float = 1.0) -> Ratios | None:
    """Return the gain ratio of a pair of heads from the sheet's swap rows, or None without any.

    Rows go in pairs, normal then inverted; `up` is the channel of the head that normally looks
    down. The scatter between pairs and that within them both count. A zero that comes of the sky
    above a head is `ground_share` as large over the ground: it does not drop out.
    """
    rows = [e for e in day.sheet.entries if e.entry == "swap" and e.quantity in ("", product)
            and e.instrument in ("", up.logger, down.logger)]
    found: list[HeadRatio] = []
    per_zero: list[tuple[float, float]] = []
    settings, long = day.parameters.campaign.settings.albedo, 0
    for first, second in zip(rows[::2], rows[1::2], strict=False):
        if (first.reading > 0) == (second.reading > 0):
            continue  # not a pair: the sheet's check has said so
        normal, inverted = (first, second) if first.reading > 0 else (second, first)
        a = _over(day, normal, up, down)
        b = _over(day, inverted, down, up)
        if a is not None and b is not None:
            found.append(head_ratio_by_swap(a.ratio, b.ratio, a.u, b.u))
            long += all(e.stop_ns - e.start_ns >= settings.swap_min_s * NS for e in (first, second))
            per_zero.append(((1 / a.reflected + 1 / ground_share / b.incoming) / 2,
                             -(1 / a.incoming + ground_share / b.reflected) / 2))
    made = _together([float(f.ratio) for f in found], [float(f.u) for f in found])
    if made is None:
        return None
    moves = np.mean(per_zero, axis=0)
    return made._replace(per_up_zero=float(moves[0]), per_down_zero=float(moves[1]),
                         few=long < settings.swap_min_pairs)


def over_panel(day: Day, up: Channel, down: Channel) -> Ratios | None:
    """Return the gain ratio of a pair of heads over a panel of known reflectance, if recorded."""
    values, errors = [], []
    for entry in day.sheet.entries:
        if entry.entry == "panel" and entry.instrument in ("", up.logger, down.logger):
            found = _over(day, entry, up, down)
            if found is not None:
                values.append(found.ratio / entry.reading)
                errors.append(found.u / entry.reading)
    return _together(values, errors)


def panel_u(day: Day, up: Channel, down: Channel) -> float:
    """Return the relative u of the panel's reflectance, common to the bands."""
    return max((e.reading_u / e.reading for e in day.sheet.entries if e.entry == "panel"
                and e.instrument in ("", up.logger, down.logger)
                and np.isfinite(e.reading_u)), default=0.0)


def ratio_input(day: Day, name: str, ratios: Ratios, up: Channel, source: str) -> Input:
    """Return the ratio as an input shared by all passes of these heads on the day."""
    return Input(name, ratios.value, ratios.u, f"{day.name}:{up.logger}:{up.column}:{name}",
                 f"{source} ({ratios.n})")


class _Over(NamedTuple):
    ratio: float
    u: float
    reflected: float
    incoming: float


def _over(day: Day, entry: Entry, up: Channel, down: Channel) -> _Over | None:
    """Return reflected over incoming and its standard uncertainty within one row."""
    parts = []
    for channel in (up, down):
        edge = round((entry.edge_u_s + 5 * channel.time_constant_s) * NS)
        time, value = day.readings(channel, entry.start_ns + edge, entry.stop_ns - edge,
                                   through=("sun too low", "too little light"))
        if value.size < 3:
            return None
        value = day.without_dark(channel, time, value)
        mean = mean_of_series(value, unit="1", method="swap")
        parts.append((mean.value, mean.u, value))
    (a, u_a, reflected), (b, u_b, incoming) = parts
    if not (a > 0 and b > 0):
        return None
    relative = float(np.hypot(u_a / a, u_b / b))
    if reflected.size == incoming.size:  # one logger: what the sun does drops out
        relative = mean_of_series(reflected / a - incoming / b, unit="1", method="swap").u
    return _Over(a / b, relative * a / b, a, b)


def _together(values: list[float], errors: list[float]) -> Ratios | None:
    if not values:
        return None
    n = len(values)
    mean = float(np.mean(values))
    sd = float(np.std(values, ddof=1)) if n > 1 else float("nan")
    own = float(np.sqrt(np.mean(np.square(errors))))
    spread = own if np.isnan(sd) else max(own, sd)
    return Ratios(mean, spread / float(np.sqrt(n)), n, sd / mean)
