"""The day's course between the passes of one date, taken off by the revisited control.

Every pass is carried to one time common to the quantity and kind, and the passes are pooled
anew. What the control did in between is known as well as its own visits are (draws of their own),
and another ground need not follow it (draws of the surface's own). Before the first and after the
last visit nothing is carried on.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from surveykit.core import FloatArray
from surveykit.evidence.comparability import Date
from surveykit.evidence.moving import Moves
from surveykit.evidence.parts import HALF_WIDTH
from surveykit.evidence.surfaces import Group, pool_passes
from surveykit.statistics.course import hat_weights, local_scatter
from surveykit.statistics.draws import Draws, Result
from surveykit.statistics.pooling import pool

VISITS = 3  # at as many times, that show the day's course
JOINED_H = 0.1  # visits closer together are one
CORRECTED = "corrected to a common time by the control"
EXTRAPOLATED = "drift extrapolated"
UNWATCHED = "the day's course was not watched by a control"


@dataclass(frozen=True)
class Course:
    """Visits of the control: time [h], temperature and air [K], standard uncertainty [K]."""

    time_h: FloatArray
    value_k: FloatArray
    air_k: FloatArray
    u_k: FloatArray

    @property
    def excess_k(self) -> FloatArray:
        """What the control is above the air [K]; NaN where the air is not known."""
        return self.value_k - self.air_k


def course_of(control: Group) -> Course | None:
    """Return the course that a control's passes show; None with fewer than three visits."""
    order = sorted(range(len(control.used)), key=lambda i: control.used[i].middle_ns)
    own_u = Moves(control.campaign, control.used).own_u
    visits: list[list[int]] = []
    for i in order:
        if visits and _hour(control, i) - _hour(control, visits[-1][-1]) < JOINED_H:
            visits[-1].append(i)
        else:
            visits.append([i])
    if len(visits) < VISITS:
        return None
    joined = [pool([control.used[i].value for i in v], own_u[v]) for v in visits]
    time_h = np.array([np.mean([_hour(control, i) for i in v]) for v in visits])
    value = np.array([one.value for one in joined])
    known = np.array([own_u[v[0]] if len(v) == 1 else one.u
                      for v, one in zip(visits, joined, strict=True)])
    air = np.array([np.mean([control.used[i].air_k for i in v]) for v in visits])
    return Course(time_h, value, air, np.maximum(known, local_scatter(time_h, value)))


def at_common_time(date: Date, family: Sequence[Group],
                   draws: Draws) -> tuple[dict[str, Group], str]:
    """Return the groups of a quantity and kind at one common time, by surface, and a note.

    Where the control is far enough above the air, a surface follows it by the ratio of their
    excesses over the air; else by the same kelvins. Without a control the groups stay.
    """
    if family and family[0].key[1:] in date.carried:
        return date.carried[family[0].key[1:]]
    as_they_are = {g.surface: g for g in family}
    if not family or family[0].quantity != "temperature":
        return as_they_are, ""
    name = date.parameters.campaign.comparison.control or ""
    control = date.find(name, family[0].quantity, family[0].kind)
    course = course_of(control) if control else None
    if course is None:
        return as_they_are, UNWATCHED
    middle = float(np.mean([_hour(g, i) for g in family for i in range(len(g.used))
                            if g.result is not None]))
    common_h = float(np.clip(middle, course.time_h[0], course.time_h[-1]))
    made = {g.surface: _carried(date, g, course, common_h, draws) if g.result is not None else g
            for g in family}
    date.carried[family[0].key[1:]] = made, CORRECTED
    return made, CORRECTED


def carried(date: Date, key: tuple[str, str, str], draws: Draws) -> Group | None:
    """Return the group of this key at the common time, or as it is; None without an interval."""
    found = date.find(*key)
    if found is None or key[1] != "temperature":
        return found
    return at_common_time(date, date.families[found.quantity, found.kind], draws)[0][key[0]]


def _carried(date: Date, group: Group, course: Course, common_h: float, draws: Draws) -> Group:
    settings = date.parameters.campaign.settings
    limits = settings.comparison
    at = np.array([_hour(group, i) for i in range(len(group.used))])
    apart = hat_weights(course.time_h, at) - hat_weights(course.time_h, [common_h])
    follow, air_moved = 1.0, np.zeros(at.size)
    if (course.excess_k >= limits.min_control_excess_k).all():
        there = hat_weights(course.time_h, at)
        above = np.array([p.value for p in group.used]) - there @ course.air_k
        follow = float(group.weights @ above / (group.weights @ (there @ course.excess_k)))
        air_moved = apart @ course.air_k
        moved = air_moved + follow * (apart @ course.excess_k)
    else:
        moved = apart @ course.value_k
    held = iter([
        replace(p, value=p.value - float(by),
                air=replace(p.air, value=p.air.value - float(air_by)) if p.air else None)
        for p, by, air_by in zip(group.used, moved, air_moved, strict=True)])
    passes = [next(held) if p.evaluated else p for p in group.passes]
    made = pool_passes(group.campaign, group.key, passes, draws, settings.statistics.coverage,
                       group.spreads)
    assert made.result is not None
    knots = made.weights @ apart * follow * course.u_k
    term = sum((size * draws.standard(f"{date.name}:{group.kind}:course:{j}")
                for j, size in enumerate(knots) if size), np.zeros(draws.size))
    form = limits.course_form_u * float(made.weights @ moved)
    term = term + form * draws.standard(f"{date.name}:{group.surface}:{group.kind}:follows")
    beyond, note = _beyond(course, at, made.weights)
    if note:
        term = term + beyond * draws.standard(f"{date.name}:{group.kind}:beyond", "rectangular")
    result = Result(made.value, made.result.systematic + term, made.result.total + term,
                    made.result.sampling)
    return replace(made, result=result, notes=(*made.notes, note) if note else made.notes)


def _beyond(course: Course, at: FloatArray, weights: FloatArray) -> tuple[float, str]:
    """Return what the course can have done beyond the control's visits [K], and a note."""
    slopes = np.diff(course.value_k) / np.diff(course.time_h)
    before = np.minimum(at - course.time_h[0], 0.0) * slopes[0]
    after = np.maximum(at - course.time_h[-1], 0.0) * slopes[-1]
    size = float(weights @ (before + after))
    outside = bool(((at < course.time_h[0]) | (at > course.time_h[-1])).any())
    return size * HALF_WIDTH, EXTRAPOLATED if outside else ""


def _hour(group: Group, i: int) -> float:
    return group.used[i].middle_ns / 3.6e12
