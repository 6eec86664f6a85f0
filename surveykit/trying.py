"""Other settings tried on one surface or one pair: no file of the project changes."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Mapping
from dataclasses import replace
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

import pandas as pd
from pydantic import ValidationError

from surveykit import pipeline
from surveykit.core import InputError
from surveykit.intake.params import Parameters
from surveykit.opening import Survey

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

    def rows(some: Survey) -> pd.DataFrame:
        table = pipeline.surfaces(some).tables["surfaces"]
        return table[table["surface"] == name]

    return _beside(survey, changes, SHOWN, rows)


def difference(survey: Survey, one: str, other: str, changes: Changes) -> pd.DataFrame:
    """Return the differences of one pair as run and with other settings, side by side.

    Verdicts are left out: a setting is tried for what it does to a number.

    Raises
    ------
    InputError
        If a surface or a setting is not known.
    """
    _known(survey, one, other)

    def rows(some: Survey) -> pd.DataFrame:
        table = pipeline.comparison(some)["differences"]
        return table[table["surface"].isin((one, other)) & table["other"].isin((one, other))]

    return _beside(survey, changes, COMPARED, rows)


def _known(survey: Survey, *names: str) -> None:
    for name in names:
        if name not in survey.campaign.surfaces:
            raise InputError(f"surface {name!r} is not one of this campaign's; write one of "
                             f"{', '.join(survey.campaign.surfaces)}")


def _beside(survey: Survey, changes: Changes, columns: tuple[str, ...],
            rows: Callable[[Survey], pd.DataFrame]) -> pd.DataFrame:
    """Return what `rows` gives of a survey and of the same with changed settings."""
    parameters, before = _changed(survey, changes), rows(survey)
    pipeline.ingest(survey)
    with TemporaryDirectory() as aside:
        shutil.copytree(survey.run_folder / "ingest", Path(aside) / "ingest")
        after = rows(replace(survey, parameters=parameters, run_folder=Path(aside), made={}))
    both = pd.concat([before.assign(settings=RUN), after.assign(settings=TRIED)])
    order = both.sort_values(["quantity", "kind"], kind="stable")
    return order[["settings", *columns]].reset_index(drop=True)


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
