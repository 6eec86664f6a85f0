"""The order of visits with the control between them, and the field sheet that follows from it."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping

import pandas as pd

from surveykit.opening import Survey
from surveykit.planning.day import Plan
from surveykit.planning.patches import Patch
from surveykit.report.standing import SAFETY as SAFETY
from surveykit.report.wording import plural
from surveykit.starting import COLUMNS

LIGHT = ("shortwave_down", "shortwave_up", "red_down", "red_up")


def visit_minutes(survey: Survey, patch: Patch) -> float:
    """Return the minutes a visit takes: one pass a way of reading, trims, and the walk to it.

    Ways of reading that stand off share one walk over the patch; contact is a pass of its own.
    """
    settings = survey.campaign.settings.passes
    slowest = max((c.time_constant_s for name in survey.campaign.loggers
                   for c in survey.parameters.channels(name)
                   if c.quantity.endswith(("_up", "brightness_temperature"))), default=0.0)
    trim_s = settings.sheet_u_s + survey.campaign.settings.clocks.unchecked_u_s \
        + settings.settle_time_constants * slowest
    walks = ("contact" in patch.heads) + bool({*patch.heads} - {"contact"})
    walk_min = survey.campaign.settings.planning.walk_min
    return walk_min + walks * (2 * settings.min_duration_s + 2 * trim_s) / 60


def rounds_needed(survey: Survey, plan: Plan) -> dict[str, int]:
    """Return for each surface the rounds after which it has the passes it needs."""
    need = dict.fromkeys((p.surface for p in plan.patches),
                         survey.campaign.settings.planning.least_rounds)
    for row in plan.passes.to_dict("records"):
        places = sum(p.surface == row["surface"] for p in plan.patches)
        if places:
            need[row["surface"]] = max(need[row["surface"]], math.ceil(row["passes"] / places))
    return need


def order(survey: Survey, plan: Plan, rounds: Mapping[str, int]) -> pd.DataFrame:
    """Return the visits in order: round, surface, patch, minutes from the start.

    A patch is visited in as many rounds as its surface needs. Every other round runs backwards,
    so that a drift over the day cancels. The control comes first, last, and between as often as
    `settings.planning` says.
    """
    control = survey.campaign.comparison.control
    every_min = survey.campaign.settings.planning.control_every_min
    fixed = [p for p in plan.patches if p.surface == control]
    others = [p for p in plan.patches if p.surface != control] or fixed
    fixed = [] if others is fixed else fixed
    rows: list[dict[str, object]] = []
    clock, since, turn = 0.0, 0.0, 0

    def visit(patch: Patch, number: int) -> None:
        nonlocal clock, since
        took = visit_minutes(survey, patch)
        rows.append({"round": number, "surface": patch.surface, "patch": patch.name,
                     "starts_min": round(clock, 1)})
        clock += took
        since = 0.0 if patch in fixed else since + took

    last = max(rounds.values(), default=0)
    for number in range(1, last + 1):
        due_now = [p for p in others if rounds[p.surface] >= number]
        for place, patch in enumerate(due_now if number % 2 else due_now[::-1]):
            due = since + visit_minutes(survey, patch) > every_min
            if fixed and (due or (place == 0 and number == 1)):
                visit(fixed[turn % len(fixed)], number)
                turn += 1
            visit(patch, number)
    if fixed:
        visit(fixed[turn % len(fixed)], last)
    return pd.DataFrame(rows)


def duration_min(survey: Survey, plan: Plan, visits: pd.DataFrame) -> float:
    """Return the minutes from the first visit's start to the last one's end."""
    last = visits.iloc[-1]
    patch = next(p for p in plan.patches if p.name == last["patch"]
                 and p.surface == last["surface"])
    return float(last["starts_min"]) + visit_minutes(survey, patch)


def fits(survey: Survey, plan: Plan, visits: pd.DataFrame) -> str:
    """Say how long the visits take and whether the widest sun window holds them."""
    minutes = duration_min(survey, plan, visits)
    window = plan.windows.iloc[0]
    room = 60 * float(window["hours"])
    word = "fits" if minutes <= room else "does not fit"
    places = plural(len(plan.patches), "patch", "patches")
    return (f"{len(visits)} visits to {places} take about {minutes:.0f} min; "
            f"that {word} the {room:.0f} min in which the sun stands within "
            f"{window['limit_deg']:.0f} degrees of the zenith ({window['meaning']}).")


def field_sheet(survey: Survey, plan: Plan, visits: pd.DataFrame) -> pd.DataFrame:
    """Return the field sheet filled in but for the times: covers, darks and passes in order."""
    known = {(p.surface, p.name): p for p in plan.patches}
    heights = {(r["surface"], r["patch"], r["reading"]): r
               for r in plan.heights.to_dict("records")}
    rows = [*_marks(survey, "start")]
    seen: set[tuple[str, str]] = set()
    middle = len(visits) // 2
    for place, visit in enumerate(visits.to_dict("records")):
        if place == middle:
            rows += _marks(survey, "middle")
        patch = known[visit["surface"], visit["patch"]]
        for head in patch.heads:
            advice = heights.get((patch.surface, patch.name, head), {})
            first = (patch.surface, patch.name) not in seen
            seen.add((patch.surface, patch.name))
            rows.append({
                "entry": "pass", "surface": patch.surface, "patch": patch.name,
                "quantity": head if head in ("albedo", "ndvi") else "temperature",
                "mode": head if head in ("contact", "stand-off") else "",
                "height_cm": _whole(100 * float(advice.get("height_m", math.nan))),
                "width_m": _short(patch.width_m) if first else "",
                "length_m": _short(patch.length_m) if first else "",
                "lanes": _whole(float(advice.get("lanes", math.nan)))})
    rows += _marks(survey, "end")
    day = {"campaign": survey.campaign.campaign, "date": survey.campaign.date}
    return pd.DataFrame([dict.fromkeys(COLUMNS, "") | row | day for row in rows],
                        columns=list(COLUMNS))


def _marks(survey: Survey, when: str) -> Iterable[dict[str, str]]:
    yield {"entry": "cover", "note": f"all heads together for ten seconds, {when}"}
    for name in survey.campaign.loggers:
        if any(c.quantity in LIGHT for c in survey.parameters.channels(name)):
            yield {"entry": "dark", "instrument": name, "note": f"caps on for a minute, {when}"}


def _whole(value: float) -> str:
    return f"{value:.0f}" if math.isfinite(value) else ""


def _short(value: float) -> str:
    return f"{value:g}" if math.isfinite(value) else ""
