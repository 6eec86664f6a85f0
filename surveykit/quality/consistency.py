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
from surveykit.quality.series import chosen, inside, nearest, partners, slopes, within
from surveykit.quality.sky import Watch, changed, unsteady, watch
from surveykit.quality.study import Masks, Study
from surveykit.quality.supports import dark_levels

ZERO_U = 3.0  # standard uncertainties of a head's zero that an improbable albedo must exceed
PAIRS = (("shortwave_up", "shortwave_down"), ("red_up", "red_down"), ("nir_up", "nir_down"))


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
    for channel in study.every_channel:
        _air(study, masks, channel)
    _sky(study, masks)


def air_at(study: Study, masks: Masks, time_ns: IntArray) -> FloatArray:
    """Return the air temperature [K] at each time: logged, else read by hand; NaN where unknown.

    Neighbours are interpolated, never further than `temperature.weather_reach_s` beyond them.
    """
    reach_s = study.parameters.campaign.settings.temperature.weather_reach_s
    told = []
    for channel in study.every_channel:
        if channel.quantity == "air_temperature":
            log, good = study.records[channel.logger], masks[channel.logger][channel.column] == 0
            told.append((log.time_ns[good], log.channels[channel.column][good]))
    rows = [e for e in study.sheet.entries
            if e.entry == "weather" and e.quantity == "air_temperature"]
    told.append((np.array([e.start_ns for e in rows], dtype=np.int64),
                 np.array([e.reading for e in rows])))
    air = np.full(time_ns.shape, np.nan)
    for known, read in told:
        near = (nearest(time_ns, known, reach_s) >= 0) & np.isnan(air)
        air[near] = np.interp(time_ns[near], known, read) if known.size else np.nan
    return air


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
    at = rows if up.logger == down.logger else partners(log, rows, other)
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
            study.found(name, chosen(sent.size, rows[dim & odd]), sent, logger=up.logger,
                        column=up.column)
        return
    more = dim & more_up_than_down(back, light, quality.up_down_min_w_m2)
    odd = (both == 0) & ~more & improbable_albedo(
        back, light, *quality.albedo_plausible, least_down=settings.albedo.min_down_w_m2,
        zero=ZERO_U * settings.albedo.zero_offset_u_w_m2)
    for name, found in (("more light up than down", more), ("improbable albedo", odd)):
        study.found(name, chosen(sent.size, rows[found]), sent, logger=up.logger, column=up.column)
        study.found(name, chosen(came.size, at[found]), came, logger=down.logger,
                    column=down.column, told=False)


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
    if channel.quantity == "longwave_down":
        name, hit = "longwave against air", longwave_off(
            values, air_k, quality.longwave_air_low, quality.longwave_air_high_w_m2)
    else:
        if channel.quantity == "longwave_up":
            values = (values / SIGMA.value) ** 0.25
        name, hit = "far from the air", far_from_air(
            values, air_k, quality.below_air_k, quality.above_air_k)
    study.found(name, chosen(mask.size, rows[hit]), mask, logger=channel.logger,
                column=channel.column)


def placed_far_from_air(study: Study, masks: Masks, this: Pass, rows: IntArray) -> BoolArray:
    """Return which settled records `rows` of a contact pass are too far from the air; mark them."""
    channel = this.channels["brightness_temperature"]
    log, quality = study.records[channel.logger], study.quality
    found = far_from_air(log.channels[channel.column][rows],
                         air_at(study, masks, log.time_ns[rows]),
                         quality.below_air_k, quality.above_air_k)
    study.found("far from the air", chosen(log.time_ns.size, rows[found]),
                masks[channel.logger][channel.column], logger=channel.logger,
                column=channel.column)
    return found


def _sky(study: Study, masks: Masks) -> None:
    """Flag temperatures after a change of irradiance and albedos under a sky that is not steady."""
    heat = [p for p in study.passes if p.quantity == "temperature"]
    light = [p for p in study.passes if p.quantity == "albedo"]
    sky, quality = watch(study, masks), study.quality
    unseen = [p for p in heat if _by_day(study, p) and not (sky and sky.covers(p))]
    if unseen:
        some = "" if len(unseen) == len(heat) else \
            f" during {len(unseen)} of {len(heat)} temperature passes"
        study.note("irradiance history", "flag", f"the sky was not watched{some}: whether the "
                   f"light had just changed before {'them' if some else 'the temperature passes'} "
                   "is not known", "engineering default")
    if sky is None:
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


def _by_day(study: Study, this: Pass) -> bool:
    """Return whether the sun stood above the horizon at any record of a pass's first logger."""
    logger = this.loggers[0]
    window = slice(*within(study.records[logger].time_ns, this.start_ns, this.stop_ns))
    return bool((study.sun[logger].zenith_deg[window] < 90).any())
