"""What the class of a shortwave head, or its own stated limits, add to an albedo."""

from __future__ import annotations

from datetime import date

import numpy as np

from surveykit.core import Input
from surveykit.evidence.conditions import Day
from surveykit.evidence.parts import HALF_WIDTH, surface_scope
from surveykit.intake.params import Channel
from surveykit.intake.params.defaults import AlbedoSettings
from surveykit.intake.passes import Pass
from surveykit.physics.instrument import CLASS_TERMS

HIDDEN_ZERO_U = {"A": 3.0, "B": 5.0, "C": 10.0}  # W m-2, engineering defaults
DAYS_A_YEAR = 365.25


def directional_limit(head: Channel, settings: AlbedoSettings) -> float:
    """Return the directional limit [W m-2 at 1000 W m-2 of beam] of the head that looks up."""
    terms = head.class_terms
    if terms is None:
        return settings.directional_limit_w_m2
    return CLASS_TERMS[terms].directional_w_m2 if isinstance(terms, str) \
        else terms.directional_w_m2


def hidden_zero_u(head: Channel, settings: AlbedoSettings) -> float:
    """Return the standard uncertainty [W m-2] of the zero offset that a cap does not show."""
    terms = head.class_terms
    if terms is None:
        return settings.zero_offset_u_w_m2
    return HIDDEN_ZERO_U[terms] if isinstance(terms, str) \
        else terms.zero_offset_w_m2 * float(HALF_WIDTH)


def class_inputs(day: Day, this: Pass, up: Channel, down: Channel) -> list[Input]:
    """Return the inputs of both heads' class and of a response that is not flat."""
    inputs = []
    for head, name in ((up, "up_class_error"), (down, "down_class_error")):
        bound = _gain_bound(day, head, looks_down=head is up)
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


def _gain_bound(day: Day, head: Channel, *, looks_down: bool) -> float:
    """Return the relative bound of what moves a head's gain: its terms added in quadrature."""
    terms = head.class_terms
    if terms is None:
        return 0.0
    if not isinstance(terms, str):
        return terms.gain
    limits = CLASS_TERMS[terms]
    years = 1.0
    if head.calibration is not None:
        age = date.fromisoformat(day.parameters.campaign.date) - date.fromisoformat(
            head.calibration.date)
        years = max(age.days, 0) / DAYS_A_YEAR
    return float(np.linalg.norm([limits.non_linearity, limits.temperature, limits.spectral,
                                 limits.non_stability * years, limits.tilt * looks_down]))
