"""Changes of one surface between two dates: by ratio to the control, or by differences.

Temperature is led by the ratio to the control, which takes the weather of the two dates out as
far as the control shows it; the additive and the raw difference stand beside it unjudged.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from surveykit.core import FloatArray, Input
from surveykit.evidence.comparability import Class, Date, comparability
from surveykit.evidence.drift import carried
from surveykit.evidence.surfaces import Group
from surveykit.physics.shortwave import zenith_factor
from surveykit.statistics.draws import Draws, Result, combine, summarise
from surveykit.statistics.verdicts import NOT_COMPARABLE, NOT_EVALUATED

RATIO = "ratio to control"
DOUBLE = "difference in differences"
MATCHED = "sky-matched difference"
RAW = "raw"


def changes_between(now: Date, then: Date, draws: Draws) -> list[dict[str, Any]]:
    """Return the rows of one pair of dates, `judged` marking those that carry a verdict."""
    rows: list[dict[str, Any]] = []
    control = now.parameters.campaign.comparison.control
    for key in dict.fromkeys([*now.groups, *then.groups]):
        surface, quantity, kind = key
        if quantity == "albedo" and key not in now.groups and any(
                k[:2] == key[:2] for k in now.groups):
            continue  # said once, from the side of this date
        rows += [row if row["judged"] else row | {"result": None}  # whose draws nobody needs
                 for row in _rows(now, then, key, control or "", draws)]
    return rows


def ratio_to_control(new: float, new_air: float, new_control: float, control_air: float,
                     old: float, old_air: float, old_control: float,
                     old_control_air: float) -> float:
    """Return what a surface gained [K] against what its old ratio to the control would give.

    new - [new_air + theta (new_control - control_air)], theta the old (surface - air) over the
    old (control - air). Each surface and the control count from the air at its own passes.
    """
    theta = (old - old_air) / (old_control - old_control_air)
    return new - (new_air + theta * (new_control - control_air))


def _rows(now: Date, then: Date, key: tuple[str, str, str], control: str,
          draws: Draws) -> list[dict[str, Any]]:
    surface, quantity, kind = key
    is_control = surface == control
    base: dict[str, Any] = {
        "campaign": now.name, "earlier": then.name, "quantity": quantity, "kind": kind,
        "surface": surface, "control": "" if is_control else control,
        "unit": "K" if quantity == "temperature" else "1", "change": np.nan, "u": np.nan,
        "lower": np.nan, "upper": np.nan, "end_error": np.nan, "comparability": "",
        "could_have_missed": np.nan,
        "verdict": "", "note": "", "p_adjusted": np.nan, "judged": False}
    new, old = now.find(*key), then.find(*key)
    control_key = (control, quantity, kind)
    pair = (now.find(*control_key), then.find(*control_key))
    controls = (pair[0], pair[1]) if pair[0] and pair[1] else None
    lead = RATIO if quantity == "temperature" else DOUBLE if controls else MATCHED
    if new is None or old is None:
        if is_control:
            return []
        return [base | {"method": lead, "judged": True, **_absent(now, then, key)}]
    assert new.result is not None and old.result is not None  # noqa: PT018
    raw = combine(lambda a, b: a - b, new.result, old.result)
    rows = [base | {"method": RAW, **_summary(now, raw)}]
    if is_control:
        return rows
    grade = comparability(now, then, new, old, controls)
    lead_row = base | {"method": lead, "judged": True, "comparability": grade.word,
                       "note": "; ".join([*interventions(now, then, surface), *grade.reasons])}
    if grade.letter == "C":
        lead_row["verdict"] = NOT_COMPARABLE
    if controls and quantity == "temperature":
        additive = _double(new, old, controls, [])
        rows.insert(0, base | {"method": DOUBLE, **_summary(now, additive)})
    if quantity == "temperature":
        if controls and grade.letter != "C":
            at_once = [carried(date, k, draws) for k in (key, control_key) for date in (now, then)]
            lead_row |= _summary(now, _ratio(now, then, at_once, grade, draws))
    elif controls:
        terms = [zenith_term(now, new, old, draws, 1.0),
                 zenith_term(now, *controls, draws, -1.0)]
        lead_row |= _summary(now, _double(new, old, controls, terms))
    else:
        terms = [zenith_term(now, new, old, draws, 1.0), drift_term(now, then, new, old, draws)]
        made = combine(lambda a, b, *t: a - b + sum(t), new.result, old.result, *terms)
        lead_row |= _summary(now, made)
    return [lead_row, *rows]


def _absent(now: Date, then: Date, key: tuple[str, str, str]) -> dict[str, Any]:
    """Return verdict and note where one of the two dates has no interval for the key."""
    for date, other in ((now, then), (then, now)):
        group = date.groups.get(key)
        if group is not None and group.result is None:
            return {"verdict": NOT_EVALUATED, "note": f"{date.name}: {'; '.join(group.notes)}"}
        if group is None:
            here = {k[2]: g for k, g in date.groups.items() if k[:2] == key[:2]}
            if key[1] == "albedo" and "" in here:  # refused before its sky was known
                return {"verdict": NOT_EVALUATED,
                        "note": f"{date.name}: {'; '.join(here[''].notes)}"}
            if key[1] == "albedo" and here:
                return {"verdict": NOT_COMPARABLE, "comparability": "not matched",
                        "note": f"the sky differs: {' and '.join(here)} albedo on {date.name}, "
                                f"{key[2]} on {other.name}"}
            return {"verdict": NOT_EVALUATED, "note": f"no such passes on {date.name}"}
    raise AssertionError("both dates have an interval")


def _summary(now: Date, made: Result) -> dict[str, Any]:
    s = summarise(made, now.parameters.campaign.settings.statistics.coverage)
    return {"change": s.value, "u": s.u, "lower": s.lower, "upper": s.upper,
            "end_error": s.end_error, "p": s.p_two_sided, "dof": s.dof, "result": made}


def _known(value: float, deviation: FloatArray) -> Result:
    """Return a result that moves with inputs alone."""
    moved = value + deviation
    return Result(value, moved, moved)


def _double(new: Group, old: Group, controls: tuple[Group, Group],
            terms: list[Result]) -> Result:
    assert new.result and old.result and controls[0].result and controls[1].result  # noqa: PT018
    return combine(lambda a, b, c, d, *t: (a - b) - (c - d) + sum(t), new.result, old.result,
                   controls[0].result, controls[1].result, *terms)


def air_of(group: Group, draws: Draws) -> Result:
    """Return the air temperature at a group's passes as a result, its error shared by scope."""
    inputs: list[Input] = [p.air for p in group.used if p.air is not None]
    one = inputs[0]
    return _known(group.mean("air_k"), one.u * draws.standard(one.scope, one.distribution))


def model_share(now: Date, surface: str, letter: str) -> float:
    """Return the model-form uncertainty of the ratio to the control, as a share of its excess."""
    limits = now.parameters.campaign.settings.comparison
    share = limits.model_u_matched if letter == "A" else limits.model_u_partly
    green = now.groups.get((surface, "ndvi", ""))
    twice = green is not None and green.value > limits.vegetated_ndvi
    return share * 2 if twice else share


def interventions(now: Date, then: Date, surface: str) -> list[str]:
    """Return what was done to a surface after one date and up to another, as stated."""
    days = [date.parameters.campaign.date for date in (then, now)]
    stated = {(i.date, i.text) for date in (then, now)
              for i in date.parameters.campaign.interventions
              if i.surface == surface and days[0] < i.date <= days[1]}
    return [f"{day}: {text}" for day, text in sorted(stated)]


def _ratio(now: Date, then: Date, at_once: list[Group | None], grade: Class,
           draws: Draws) -> Result:
    """Return the change by ratio to the control, surfaces and control at one time of each date."""
    new, old, *controls = (g for g in at_once if g is not None)
    share = model_share(now, new.surface, grade.letter)
    excess = abs(controls[0].value - controls[0].mean("air_k"))
    form = _known(0.0, share * excess * draws.standard(
        f"{now.name}:{then.name}:{new.surface}:ratio to control"))
    assert new.result and old.result and controls[0].result and controls[1].result  # noqa: PT018
    return combine(
        lambda *x: ratio_to_control(*x[:8]) + x[8], new.result, air_of(new, draws),
        controls[0].result, air_of(controls[0], draws), old.result, air_of(old, draws),
        controls[1].result, air_of(controls[1], draws), form)


def zenith_term(date: Date, new: Group, old: Group, draws: Draws, sign: float) -> Result:
    """Return what another sun height can have done to an albedo; nothing for other quantities.

    The dependence is that of Dickinson (1983) and Briegleb et al. (1986) with d of
    `comparison.zenith_dependence`, taken whole as the standard uncertainty.
    """
    if new.quantity != "albedo":
        return _known(0.0, np.zeros(draws.size))
    d = date.parameters.campaign.settings.comparison.zenith_dependence
    ratio = (zenith_factor(new.mean("zenith_deg"), d) / zenith_factor(old.mean("zenith_deg"), d))
    size = sign * old.value * float(ratio - 1)
    return _known(0.0, size * draws.standard(f"zenith dependence:{new.surface}"))


def drift_term(now: Date, then: Date, new: Group, old: Group, draws: Draws) -> Result:
    """Return what the instrument can have drifted between the dates where no control shows it."""
    rate = now.parameters.campaign.settings.comparison.drift_per_year
    years = abs(np.datetime64(now.parameters.campaign.date)
                - np.datetime64(then.parameters.campaign.date)).astype(int) / 365.25
    ids = [{c.gain_scope for c in g.used[0].this.channels.values()} for g in (new, old)]
    kept = ids[0] & ids[1]
    if new.quantity == "ndvi":
        size = 0.5 * (1 - new.value**2) * rate * years * np.sqrt(2)
    else:
        size = new.value * rate * years
    if not kept:
        size = 0.0
    scope = "|".join(sorted(kept)) or "renewed"
    return _known(0.0, size * draws.standard(f"drift:{scope}:{then.name}:{now.name}"))
