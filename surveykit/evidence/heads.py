"""What the class of a shortwave head, or its own stated limits, add to an albedo."""

from __future__ import annotations

from datetime import date
from typing import NamedTuple

import numpy as np

from surveykit.core import Input
from surveykit.evidence.conditions import Day
from surveykit.evidence.parts import HALF_WIDTH, surface_scope
from surveykit.intake.params import Channel
from surveykit.intake.passes import Pass
from surveykit.physics.instrument import CLASS_TERMS
from surveykit.physics.shortwave import directional_u

HIDDEN_ZERO_U = {"A": 3.0, "B": 5.0, "C": 10.0}  # W m-2, engineering defaults
DAYS_A_YEAR = 365.25
SUN_STEP_DEG = 10.0  # of zenith angle, over which a directional error becomes another


class Limits(NamedTuple):
    """What a head's class, or its own terms, allow: direction [W m-2], u of its zero, gain [1]."""

    directional_w_m2: float
    hidden_zero_u: float
    gain: float


def limits(day: Day, head: Channel, *, looks_down: bool = False) -> Limits:
    """Return a head's limits; a class's gain terms are added in quadrature.

    Directional limit at 1000 W m-2 of beam; standard uncertainty of what a cap does not show of
    the zero; bound of what moves the gain.
    """
    settings, terms = day.parameters.campaign.settings.albedo, head.class_terms
    if terms is None:
        return Limits(settings.directional_limit_w_m2, settings.zero_offset_u_w_m2, 0.0)
    if not isinstance(terms, str):
        return Limits(terms.directional_w_m2, terms.zero_offset_w_m2 * float(HALF_WIDTH),
                      terms.gain)
    bounds, years = CLASS_TERMS[terms], 1.0
    if head.calibration is not None:
        age = date.fromisoformat(day.parameters.campaign.date) - date.fromisoformat(
            head.calibration.date)
        years = max(age.days, 0) / DAYS_A_YEAR
    return Limits(bounds.directional_w_m2, HIDDEN_ZERO_U[terms], float(np.linalg.norm([
        bounds.non_linearity, bounds.temperature, bounds.spectral, bounds.non_stability * years,
        bounds.tilt * looks_down])))


def directional_inputs(day: Day, head: Channel, zenith_deg: float) -> list[Input]:
    """Return the directional error of the head that looks up, as two inputs of one size together.

    It is the head's own, so the same at the same height of the sun, on whatever date, and another
    at another: each whole ten degrees of zenith angle have an error of their own, and in between
    the two neighbours share. So it cancels between suns of one height and not at all between
    those that lie ten to twenty degrees apart.
    """
    u = day.parameters.campaign.settings.albedo.beam_fraction * float(
        directional_u(zenith_deg, limits(day, head).directional_w_m2))
    below, share = divmod(zenith_deg, SUN_STEP_DEG)
    return [Input(name, 0.0, u * float(np.sqrt(part)),
                  f"{head.gain_scope}:direction at {(below + step) * SUN_STEP_DEG:.0f}",
                  "directional response of the upper head, sun at "
                  f"{90 - (below + step) * SUN_STEP_DEG:.0f} degrees", "rectangular")
            for name, step, part in (("directional_error", 0, 1 - share / SUN_STEP_DEG),
                                     ("directional_error_next", 1, share / SUN_STEP_DEG))]


def class_inputs(day: Day, this: Pass, up: Channel, down: Channel) -> list[Input]:
    """Return the inputs of both heads' class and of a response that is not flat."""
    inputs = []
    for head, name in ((up, "up_class_error"), (down, "down_class_error")):
        bound = limits(day, head, looks_down=head is up).gain
        if bound > 0:
            inputs.append(Input(name, 0.0, bound * float(HALF_WIDTH), f"{head.gain_scope}:class",
                                f"limits of the class of {head.logger}, {head.column}",
                                "rectangular"))
    if up.spectrally_flat is False or down.spectrally_flat is False:
        settings = day.parameters.campaign.settings.albedo
        inputs.append(Input("spectral_error", 0.0, settings.spectral_u,
                            surface_scope("spectral", this.surface, up.logger),
                            "response of the heads is not flat over the spectrum"))
    return inputs
