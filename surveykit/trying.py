"""Other settings tried on one surface or one pair, in memory: no file and no report changes."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import pandas as pd
from pydantic import ValidationError

from surveykit import pipeline
from surveykit.core import InputError
from surveykit.evidence import compare
from surveykit.evidence import surfaces as pooling
from surveykit.evidence.comparability import Date
from surveykit.evidence.conditions import Day
from surveykit.evidence.estimates import estimate_all
from surveykit.intake.aligning import align
from surveykit.intake.params import Parameters
from surveykit.keeping import load_records
from surveykit.opening import Survey
from surveykit.quality import examine

Changes = Mapping[str, Mapping[str, Any]]
RUN, TRIED = "as run", "tried"
SHOWN = ("quantity", "kind", "unit", "value", "u", "lower", "upper", "status", "note")
COMPARED = ("quantity", "kind", "unit", "difference", "u", "lower", "upper")


def surface(survey: Survey, name: str, changes: Changes) -> pd.DataFrame:
    """Return the rows of one surface as run and with other settings, side by side.

    Parameters
    ----------
    survey : Survey
        As opened.
    name : str
        The surface's name.
    changes : mapping
        Settings by section, such as {"temperature": {"sky_radiance_u": 0.3}}.

    Raises
    ------
    InputError
        If the surface or a setting is not known.
    """
    _known(survey, name)
    before = pipeline.surfaces(survey).tables["surfaces"]
    parameters, groups = _groups(survey, (name,), changes)
    after = pooling.surface_table([g for g in groups if g.surface == name],
                                  parameters.settings.statistics.coverage)
    return _beside(before[before["surface"] == name], after, SHOWN)


def difference(survey: Survey, one: str, other: str, changes: Changes) -> pd.DataFrame:
    """Return the differences of one pair as run and with other settings, side by side.

    Verdicts are left out: they weigh all pairs of a date together.

    Raises
    ------
    InputError
        If a surface or a setting is not known.
    """
    for name in (one, other):
        _known(survey, name)
    # Every surface takes part: the common time of a date is that of all of them.
    parameters, groups = _groups(survey, tuple(survey.campaign.surfaces), changes)
    after = compare.differences(Date(parameters, {g.key: g for g in groups}), survey.draws())
    before = pipeline.comparison(survey)["differences"]
    then, now = (table[[{*ends} == {one, other} for ends in zip(
        table["surface"], table["other"], strict=True)]] for table in (before, after))
    return _beside(then, now, COMPARED)


def _known(survey: Survey, name: str) -> None:
    if name not in survey.campaign.surfaces:
        raise InputError(f"surface {name!r} is not one of this campaign's; write one of "
                         f"{', '.join(survey.campaign.surfaces)}")


def _groups(survey: Survey, names: tuple[str, ...],
            changes: Changes) -> tuple[Parameters, tuple[pooling.Group, ...]]:
    """Return the changed parameters and what the passes of some surfaces come to under them."""
    parameters = _changed(survey, changes)
    pipeline.ingest(survey)
    kept = load_records(survey.run_folder / "ingest")
    made = align(parameters, {logger: kept[logger] for logger in survey.campaign.loggers}, [])
    marked = examine(parameters, made.records, made.sheet, made.passes)
    day = Day(parameters, made.records, made.sheet, marked)
    control = parameters.campaign.comparison.control
    wanted = tuple(p for p in made.passes if p.surface in (*names, control))
    found = pooling.groups(parameters.name, estimate_all(day, wanted), survey.draws(),
                           coverage=parameters.settings.statistics.coverage)
    return parameters, found


def _changed(survey: Survey, changes: Changes) -> Parameters:
    settings = survey.campaign.settings
    plain = settings.model_dump(mode="json")
    for section, values in changes.items():
        plain[section] = {**plain.get(section, {}), **values}
    try:
        new = type(settings).model_validate(plain)
    except ValidationError as error:
        raise InputError(*(f"settings.{'.'.join(map(str, e['loc']))}: {e['msg']}"
                           for e in error.errors())) from None
    campaign = survey.campaign.model_copy(update={"settings": new})
    return replace(survey.parameters, campaign=campaign)


def _beside(before: pd.DataFrame, after: pd.DataFrame, columns: tuple[str, ...]) -> pd.DataFrame:
    both = pd.concat([before.assign(settings=RUN), after.assign(settings=TRIED)])
    order = both.sort_values(["quantity", "kind"], kind="stable")
    return order[["settings", *columns]].reset_index(drop=True)
