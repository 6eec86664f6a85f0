"""The stages in their order; all that the notebooks call to compute.

Each stage keeps what it made in the run folder under the key of its inputs, and computes its
predecessors first where their results are absent or belong to other inputs.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field, replace
from functools import cached_property, wraps
from pathlib import Path
from typing import Any, TypeVar

import pandas as pd

from surveykit import overview
from surveykit.accounting import Quality
from surveykit.core import InputError, require, table
from surveykit.evidence import compare, handing
from surveykit.evidence import surfaces as pooling
from surveykit.evidence.comparability import Date
from surveykit.evidence.conditions import Day
from surveykit.evidence.derived import derived
from surveykit.evidence.estimates import PassEstimate, estimate_all
from surveykit.evidence.geometry import geometry
from surveykit.evidence.series import trends
from surveykit.handover import load_facts, load_table, save_facts, save_table
from surveykit.intake.aligning import Ingested, align, read_logs
from surveykit.intake.clocks.evidence import frames as clock_frames
from surveykit.keeping import load_quality, load_records, save_quality, save_records
from surveykit.opening import Survey, open_file
from surveykit.opening import open_survey as open_survey
from surveykit.quality import examine
from surveykit.statistics.draws import Draws
from surveykit.statistics.simultaneous import settled

Tables = dict[str, pd.DataFrame]
Groups = tuple[pooling.Group, ...]
Ends = Iterable[tuple[float, float]]
COMPARED = ("differences", "ranks", "changes", "trends")
STAGES = ("ingest", "quality", "surfaces", "comparison")


Stage = TypeVar("Stage")


@dataclass(frozen=True)
class Evidence:
    """Pass estimates, the groups they come to, and the tables made of them."""

    estimates: tuple[PassEstimate, ...]
    tables: Tables
    draws: Draws
    pool: Callable[[], tuple[pooling.Group, ...]] = field(repr=False)

    @cached_property
    def groups(self) -> tuple[pooling.Group, ...]:
        """The groups with all their draws, computed when first asked for."""
        return self.pool()


def _once(stage: Callable[[Survey], Stage]) -> Callable[[Survey], Stage]:
    """Let a stage run once for a survey that was opened."""
    @wraps(stage)
    def kept(survey: Survey) -> Stage:
        if stage.__name__ not in survey.made:
            survey.made[stage.__name__] = stage(survey)
        made: Stage = survey.made[stage.__name__]
        return made
    return kept


@_once
def ingest(survey: Survey) -> Ingested:
    """Return records, clocks, field sheet and passes, the records read from the files once.

    Raises
    ------
    InputError
        With every fault of the loggers' files and of the field sheet.
    """
    folder = survey.run_folder / "ingest"
    if _fresh(folder, survey.key):
        kept = load_records(folder)  # in the campaign's order again, whatever order was kept
        return align(survey.parameters, {name: kept[name] for name in survey.campaign.loggers}, [])
    logs, faults = read_logs(survey.parameters)
    made = align(survey.parameters, logs, faults)
    save_records(folder, logs)
    save_table(folder / "clocks.npz", clock_table(survey, made))
    _finish(folder, survey.key)
    return made


def clock_table(survey: Survey, ingested: Ingested) -> pd.DataFrame:
    """Return the table `clocks`."""
    return table("clocks", [
        {"campaign": survey.campaign.campaign} | {
            name: getattr(clock, name) for name in
            ("logger", "method", "offset_s", "u_s", "drift_ppm", "status", "note")}
        for clock in ingested.clocks])


def clock_evidence(ingested: Ingested) -> Tables:
    """Return what the clocks were found from: frames `events` and `lags`."""
    return clock_frames(ingested.clocks)


@_once
def quality(survey: Survey) -> Quality:
    """Mark every reading, choose each pass's records, and account for all of them."""
    folder = survey.run_folder / "quality"
    if _fresh(folder, survey.key):
        columns = {name: tuple(survey.parameters.kit[name].columns)
                   for name in survey.campaign.loggers}
        return load_quality(folder, columns)
    ingested = ingest(survey)
    made = examine(survey.parameters, ingested.records, ingested.sheet, ingested.passes)
    notes = _intake_notes(survey, ingested)
    made = replace(made, checks=pd.concat([table("checks", notes), made.checks],
                                          ignore_index=True))
    save_quality(folder, made)
    _finish(folder, survey.key)
    return made


@_once
def day(survey: Survey) -> Day:
    """Return everything that estimates draw upon: records, field sheet, marks."""
    ingested = ingest(survey)
    return Day(survey.parameters, ingested.records, ingested.sheet, quality(survey))


def day_course(survey: Survey) -> Tables:
    """Return the course of the day for the timeline: frames `sky`, `weather` and `excluded`."""
    today, passes = day(survey), ingest(survey).passes
    return overview.day_course(today, passes) | {"excluded": overview.excluded(today, passes)}


def inside_passes(survey: Survey) -> Tables:
    """Return what figures of single passes draw: frames `cooling` and `walked`, a row a record."""
    return overview.inside_passes(day(survey), surfaces(survey).estimates)


@_once
def surfaces(survey: Survey) -> Evidence:
    """Estimate every pass and pool the estimates to surfaces, with budgets."""
    folder = survey.run_folder / "surfaces"
    name = survey.campaign.campaign
    coverage = survey.campaign.settings.statistics.coverage
    if _fresh(folder, survey.key):
        passes = ingest(survey).passes
        frames = {key: load_table(folder / f"{key}.npz") for key in ("estimates", "inputs")}
        estimates = handing.from_frames(frames, passes)
        tables = {key: load_table(folder / f"{key}.npz")
                  for key in ("surfaces", "budget", "passes", "dwells", "corrections",
                              "histograms", "derived", "geometry")}
        draws = Draws(survey.draws().seed, load_facts(folder / "draws.json")["draws"])
        return Evidence(estimates, tables, draws, lambda: _groups(survey, estimates, draws))
    estimates = estimate_all(day(survey), ingest(survey).passes)

    def pooled(draws: Draws) -> tuple[tuple[Groups, pd.DataFrame], Ends]:
        groups = _groups(survey, estimates, draws)
        frame = pooling.surface_table(groups, coverage, survey.campaign.relevant_change)
        return (groups, frame), _ends(frame)

    (groups, frame), draws = settled(
        pooled, survey.draws(), survey.campaign.settings.statistics.stable_digits)
    tables = pooling.pass_tables(name, estimates) | {
        "surfaces": frame,
        "budget": pooling.budget_table(groups),
        "derived": derived(day(survey), groups, draws, coverage),
        "geometry": geometry(day(survey), estimates)}
    for key, frame in (tables | handing.to_frames(estimates)).items():
        save_table(folder / f"{key}.npz", frame)
    save_facts(folder / "draws.json", {"draws": draws.size})
    _finish(folder, survey.key)
    return Evidence(estimates, tables, draws, lambda: groups)


@_once
def comparison(survey: Survey) -> Tables:
    """Compare the surfaces of this date, and this date with each earlier one."""
    folder = survey.run_folder / "comparison"
    earlier = [open_file(path) for path in survey.parameters.earlier]
    key = hashlib.sha256("".join(s.key for s in (survey, *earlier)).encode()).hexdigest()
    if _fresh(folder, key):
        return {name: load_table(folder / f"{name}.npz") for name in COMPARED}

    def compared(draws: Draws) -> tuple[Tables, Ends]:
        now, *then = (_date(one, draws) for one in (survey, *earlier))
        _refuse_later(now, tuple(then))
        made = {"differences": compare.differences(now, draws), "ranks": compare.ranks(now, draws),
                "changes": compare.changes(now, tuple(then), draws),
                "trends": trends(now, tuple(then), draws)}
        return made, [*_ends(made["differences"]), *_ends(made["changes"])]

    size = max(surfaces(one).draws.size for one in (survey, *earlier))
    made, _ = settled(compared, Draws(survey.draws().seed, size),
                      survey.campaign.settings.statistics.stable_digits)
    for name, frame in made.items():
        save_table(folder / f"{name}.npz", frame)
    _finish(folder, key)
    return made


def series(survey: Survey) -> pd.DataFrame:
    """Return the table `surfaces` of the earlier campaigns and of this one, with their dates."""
    dates = [*(open_file(path) for path in survey.parameters.earlier), survey]
    return pd.concat([surfaces(one).tables["surfaces"].assign(date=one.campaign.date)
                      for one in dates], ignore_index=True)


def all_tables(survey: Survey) -> Tables:
    """Return every published table of a survey whose stages have run."""
    marked = quality(survey)
    tables = {"checks": marked.checks, "ledger": marked.ledger, "waterfall": marked.waterfall,
              "clocks": load_table(survey.run_folder / "ingest" / "clocks.npz"),
              **surfaces(survey).tables, **comparison(survey)}
    return {name: require(frame, name) for name, frame in tables.items()}


def _date(survey: Survey, draws: Draws) -> Date:
    evidence = surfaces(survey)
    alike = (evidence.draws.seed, evidence.draws.size) == (draws.seed, draws.size)
    found = evidence.groups if alike else _groups(survey, evidence.estimates, draws)
    return Date(survey.parameters, {group.key: group for group in found})


def _ends(frame: pd.DataFrame) -> Ends:
    """Return u and the Monte Carlo error of the ends of each interval in a table."""
    return frame[["u", "end_error"]].dropna().itertuples(index=False, name=None)


def _groups(survey: Survey, estimates: tuple[PassEstimate, ...],
            draws: Draws) -> tuple[pooling.Group, ...]:
    statistics = survey.campaign.settings.statistics
    return pooling.groups(survey.campaign.campaign, estimates, draws,
                          coverage=statistics.coverage,
                          between_passes=statistics.between_passes)


def _refuse_later(now: Date, earlier: tuple[Date, ...]) -> None:
    """Refuse an earlier campaign that had not ended before this one's first pass."""
    def ends(date: Date, name: str, pick: Callable[..., int]) -> int | None:
        return pick((getattr(p.this, name) for g in date.groups.values() for p in g.passes),
                    default=None)

    first = ends(now, "start_ns", min)
    faults = []
    for then in earlier:
        last = ends(then, "stop_ns", max)
        if first is not None and last is not None and last > first:
            faults.append(f"{now.name}: comparison.earlier: {then.name} had not ended before this "
                          "campaign's first pass; name earlier campaigns only")
    if faults:
        raise InputError(*faults)


def _intake_notes(survey: Survey, ingested: Ingested) -> list[dict[str, Any]]:
    name = survey.campaign.campaign
    notes = [("field sheet", "note", "", text) for text in ingested.sheet.notices]
    notes += [("parameters", "note", "", text) for text in survey.parameters.notes]
    severity = {"ok": "note", "refused": "refuse"}
    notes += [("clock", severity.get(clock.status, "flag"), clock.logger, clock.note)
              for clock in ingested.clocks if clock.note]
    notes += [("repeated head", "note", log.logger, f"{file.path}: {file.head_lines} lines repeat "
               "the file's head, as after a restart; they are no records")
              for log in ingested.records.values() for file in log.files if file.head_lines]
    return [{"campaign": name, "check": check, "logger": logger, "column": "", "surface": "",
             "pass": "", "severity": weight, "records": 0, "message": text,
             "source": "field practice"} for check, weight, logger, text in notes]


def _fresh(folder: Path, key: str) -> bool:
    try:
        return bool(load_facts(folder / "done.json").get("key") == key)
    except (FileNotFoundError, ValueError):
        return False


def _finish(folder: Path, key: str) -> None:
    save_facts(folder / "done.json", {"key": key})
