"""Checks of readings against each other: up and down, ground and air, head and housing, sky."""

from __future__ import annotations

import numpy as np

from surveykit.accounting import BIT
from surveykit.core import BoolArray, FloatArray, IntArray
from surveykit.intake.capped import windows
from surveykit.intake.params import Channel
from surveykit.intake.passes import Pass
from surveykit.physics.bands import SIGMA
from surveykit.quality.checks import out_of_range
from surveykit.quality.series import inside, nearest, slopes
from surveykit.quality.sky import Watch, changed, unsteady, watch
from surveykit.quality.study import Masks, Study
from surveykit.quality.supports import dark_levels

ZERO_U = 3.0  # standard uncertainties of a head's zero that an improbable albedo must exceed
PAIRS = (("shortwave_up", "shortwave_down"), ("red_up", "red_down"), ("nir_up", "nir_down"))
ROUNDING_S = 1e-3  # of printed times, beyond half an interval between partners


def more_up_than_down(up: FloatArray, down: FloatArray, least_up: float) -> BoolArray:
    """Records whose upwelling irradiance [W m-2] exceeds the downwelling, where up > `least_up`."""
    with np.errstate(invalid="ignore"):
        return (up > down) & (up > least_up)


def improbable_albedo(up: FloatArray, down: FloatArray, low: float, high: float, *,
                      least_down: float, zero: float) -> BoolArray:
    """Records whose up over down [1] lies outside [low, high] by more than a head's `zero`.

    Judged where down >= `least_down`; irradiances and `zero` in W m-2.
    """
    with np.errstate(invalid="ignore"):
        return (down >= least_down) & ((up < low * down - zero) | (up > high * down + zero))


def longwave_off(down: FloatArray, air_k: FloatArray, low: float, high: float) -> BoolArray:
    """Downwelling longwave [W m-2] below `low` sigma Ta**4 or above sigma Ta**4 + `high`.

    False where the air temperature [K] is NaN.

    References
    ----------
    Long, C. N. & Dutton, E. G. (2002), BSRN Global Network recommended QC tests, V2.0,
    comparison of longwave irradiance with air temperature (from memory).
    """
    black = SIGMA.value * air_k**4
    with np.errstate(invalid="ignore"):
        return (down < low * black) | (down > black + high)


def far_from_air(reading_k: FloatArray, air_k: FloatArray, below: float, above: float) -> BoolArray:
    """Ground readings [K] more than `below` under or `above` over the air [K]; NaN air: none."""
    return out_of_range(reading_k - air_k, -below, above)


def compare(study: Study, masks: Masks) -> None:
    """Mark and flag what the readings of one channel say of another's; masks are changed."""
    for logger in study.records:
        _housing(study, masks, logger)
    for names in PAIRS:
        served = {}
        for this in study.passes:
            if all(name in this.channels for name in names):
                up, down = (this.channels[name] for name in names)
                served[up.logger, up.column, down.logger, down.column] = up, down
        for up, down in served.values():
            _up_and_down(study, masks, up, down)
    for columns in study.channels.values():
        for channel in columns.values():
            _air(study, masks, channel)
    _sky(study, masks)


def air_at(study: Study, masks: Masks, time_ns: IntArray) -> FloatArray:
    """Return the air temperature [K] at each time: logged, else read by hand; NaN where unknown.

    Neighbours are interpolated, never further than `temperature.weather_reach_s` beyond them.
    """
    reach_s = study.parameters.campaign.settings.temperature.weather_reach_s
    known, air = np.zeros(0, dtype=np.int64), np.zeros(0)
    for logger, columns in study.channels.items():
        for column, channel in columns.items():
            if channel.quantity == "air_temperature" and not known.size:
                good = masks[logger][column] == 0
                known = study.records[logger].time_ns[good]
                air = study.records[logger].channels[column][good]
    if not known.size:
        rows = sorted((e.start_ns, e.reading) for e in study.sheet.entries
                      if e.entry == "weather" and e.quantity == "air_temperature")
        known = np.array([row[0] for row in rows], dtype=np.int64)
        air = np.array([row[1] for row in rows])
    if not known.size:
        return np.full(time_ns.shape, np.nan)
    near = nearest(time_ns, known, reach_s) >= 0
    return np.where(near, np.interp(time_ns, known, air), np.nan)


def _housing(study: Study, masks: Masks, logger: str) -> None:
    """Judge the infrared heads of a logger by the temperature of its housing."""
    log, quality, columns = study.records[logger], study.quality, study.channels[logger].values()
    heads = [c for c in columns if c.quantity == "brightness_temperature"]
    for body in (c for c in columns if c.quantity == "housing_temperature" and heads):
        values = log.channels[body.column]
        resolution = log.resolution[body.column]
        good = np.flatnonzero(masks[logger][body.column] == 0)
        width_s = max(quality.body_rate_window_s, 5 * log.interval_s)
        rate = np.full(values.size, np.nan)
        rate[good] = np.abs(slopes(log.time_ns[good], values[good], width_s)) * 60
        # one printed step within the stretch is a slope of up to 1.5 steps over its length
        step = 90 * resolution / width_s if np.isfinite(resolution) else 0.0
        off = out_of_range(values, *quality.range_of(body.quantity))
        with np.errstate(invalid="ignore"):
            fast = rate > quality.body_rate_max_k_min + step
            warm = (rate > quality.body_rate_flag_k_min + step) & ~fast
        for head in heads:
            for name, hit in (("housing out of range", off), ("housing shock", fast),
                              ("housing warms or cools", warm)):
                study.found(name, hit & inside(log.time_ns, study.spans(head)),
                            masks[logger][head.column], logger=logger, column=head.column)


def _up_and_down(study: Study, masks: Masks, up: Channel, down: Channel) -> None:
    """Hold the head that looks down against the one that looks up; not while they are swapped."""
    quality, settings = study.quality, study.parameters.campaign.settings
    log, other = study.records[up.logger], study.records[down.logger]
    spans = study.spans(up)
    rows = np.flatnonzero(inside(log.time_ns, spans) & ~inside(
        log.time_ns, windows(study.sheet, "swap", up.logger, up.quantity)))
    reach_s = 0.5 * max(log.interval_s, other.interval_s) + ROUNDING_S
    at = rows if up.logger == down.logger else nearest(
        log.time_ns[rows], other.time_ns[:other.n_timed], reach_s)
    rows, at = rows[at >= 0], at[at >= 0]
    sent, came = masks[up.logger][up.column], masks[down.logger][down.column]
    both = sent[rows] | came[at]
    back, light = log.channels[up.column][rows], other.channels[down.column][at]
    dim = both & ~(BIT["too little light"] | BIT["sun too low"]) == 0
    if up.quantity != "shortwave_up":
        dark = dark_levels(study, up)
        level = np.interp(log.time_ns[rows], *dark) if dark[0].size else 0.0
        for name, odd in (("brighter than the sky", more_up_than_down(back, light, 0.0)),
                          ("negative reflectance", back < level)):
            hit = np.zeros(log.time_ns.size, dtype=bool)
            hit[rows] = dim & odd
            study.found(name, hit, sent, logger=up.logger, column=up.column)
        return
    more = dim & more_up_than_down(back, light, quality.up_down_min_w_m2)
    odd = (both == 0) & ~more & improbable_albedo(
        back, light, *quality.albedo_plausible, least_down=settings.albedo.min_down_w_m2,
        zero=ZERO_U * settings.albedo.zero_offset_u_w_m2)
    for name, found in (("more light up than down", more), ("improbable albedo", odd)):
        hit, paired = np.zeros(sent.size, dtype=bool), np.zeros(came.size, dtype=bool)
        hit[rows[found]] = True
        paired[at[found]] = True
        study.found(name, hit, sent, logger=up.logger, column=up.column)
        study.found(name, paired, came, logger=down.logger, column=down.column, told=False)


def _air(study: Study, masks: Masks, channel: Channel) -> None:
    """Hold heat readings in passes against the air; contact passes wait for their placements."""
    if channel.quantity not in ("brightness_temperature", "longwave_up", "longwave_down"):
        return
    log, quality = study.records[channel.logger], study.quality
    mask = masks[channel.logger][channel.column]
    rows = np.flatnonzero(inside(log.time_ns, study.spans(channel, "stand-off", "longwave"))
                          & (mask == 0))
    if not rows.size:
        return
    values, air_k = log.channels[channel.column][rows], air_at(study, masks, log.time_ns[rows])
    hit = np.zeros(mask.size, dtype=bool)
    if channel.quantity == "longwave_down":
        hit[rows] = longwave_off(values, air_k, quality.longwave_air_low,
                                 quality.longwave_air_high_w_m2)
        study.found("longwave against air", hit, mask, logger=channel.logger,
                    column=channel.column)
        return
    if channel.quantity == "longwave_up":
        values = (values / SIGMA.value) ** 0.25
    hit[rows] = far_from_air(values, air_k, quality.below_air_k, quality.above_air_k)
    study.found("far from the air", hit, mask, logger=channel.logger, column=channel.column)


def placed_far_from_air(study: Study, masks: Masks, this: Pass, rows: IntArray) -> BoolArray:
    """Return which settled records `rows` of a contact pass are too far from the air; mark them."""
    channel = this.channels["brightness_temperature"]
    log, quality = study.records[channel.logger], study.quality
    found = far_from_air(log.channels[channel.column][rows],
                         air_at(study, masks, log.time_ns[rows]),
                         quality.below_air_k, quality.above_air_k)
    hit = np.zeros(log.time_ns.size, dtype=bool)
    hit[rows[found]] = True
    study.found("far from the air", hit, masks[channel.logger][channel.column],
                logger=channel.logger, column=channel.column)
    return found


def _sky(study: Study, masks: Masks) -> None:
    """Flag temperatures after a change of irradiance and albedos under a sky that is not steady."""
    heat = [p for p in study.passes if p.quantity == "temperature"]
    light = [p for p in study.passes if p.quantity == "albedo"]
    sky, quality = watch(study, masks), study.quality
    if sky is None:
        if heat:
            study.note("irradiance history", "flag", "the sky was not watched: whether the light "
                       "had just changed before the temperature passes is not known",
                       "engineering default")
        return
    had_changed = changed(sky, within_s=quality.history_s, max_w_m2=quality.history_max_w_m2)
    drifting = np.zeros(sky.time_ns.size, dtype=bool)
    for this in light:  # between passes the head that watches is carried, and sways
        part = slice(*np.searchsorted(sky.time_ns, [this.from_ns, this.to_ns], side="right"))
        drifting[part] = unsteady(
            Watch(sky.time_ns[part], sky.irradiance_w_m2[part], sky.width_s),
            window_s=quality.steady_window_s, max_sd=quality.steady_sd,
            max_rate_w_m2_s=quality.steady_rate_w_m2_s)
    for name, served, quantities, hit in (
            ("irradiance history", heat, ("brightness_temperature", "longwave_up"), had_changed),
            ("sky not steady", light, ("shortwave_down",), drifting)):
        heads = {(c.logger, c.column) for p in served for q, c in p.channels.items()
                 if q in quantities}
        for logger, column in sorted(heads):
            study.found(name, sky.at(hit, study.records[logger].time_ns), masks[logger][column],
                        logger=logger, column=column)
