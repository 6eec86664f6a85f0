"""Passes pooled to patches and surfaces, with shared draws and a budget by scope."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import pandas as pd
from scipy.special import ndtri

from surveykit.core import FloatArray, table
from surveykit.evidence.budget import budget_rows, units_needed
from surveykit.evidence.estimates import UNITS, PassEstimate, display
from surveykit.evidence.moving import Moves
from surveykit.evidence.spreads import Spreads, rows_by_patch
from surveykit.evidence.vegetation import bands_of
from surveykit.intake.params.sections import RelevantChange
from surveykit.statistics.draws import Draws, Result, Sampling, Summary, observed, summarise
from surveykit.statistics.pooling import Common, Pooled, pool

MEASURED = re.compile(r"\d+(?=%| s of| W m-2| degrees)")  # numbers in a reason that passes share


@dataclass(frozen=True)
class Group:
    """The passes of one surface, quantity and kind, and what they come to.

    `result` is None where no interval can be given; `value` is NaN where nothing was evaluated.
    Temperatures are in K.
    """

    campaign: str
    surface: str
    quantity: str
    kind: str
    passes: tuple[PassEstimate, ...]
    used: tuple[PassEstimate, ...]
    weights: FloatArray
    value: float
    u_at_least: float
    dof: int
    result: Result | None
    status: str
    notes: tuple[str, ...]
    budget: tuple[dict[str, Any], ...] = ()
    pooled: Pooled | None = None
    units_u: FloatArray | None = None
    spreads: Spreads | None = None

    @property
    def key(self) -> tuple[str, str, str]:
        """(surface, quantity, kind): what the group is compared as."""
        return self.surface, self.quantity, self.kind

    def mean(self, name: str) -> float:
        """Return the weighted mean of an attribute of the used passes; NaN if one lacks it."""
        values = np.array([getattr(p, name) for p in self.used], dtype=np.float64)
        return float(values @ self.weights) if values.size else float("nan")


def groups(campaign: str, estimates: Sequence[PassEstimate], draws: Draws, *, coverage: float,
           between_passes: str = "own") -> tuple[Group, ...]:
    """Pool the estimates by surface, quantity and kind, in the order of the passes.

    `between_passes` is "own" (each surface's scatter between passes) or "common" (one for all
    surfaces of a quantity and kind, its degrees of freedom summed).

    Raises
    ------
    AssertionError
        If an interval came out narrower than its calibration alone allows (a bug).
    """
    found: dict[tuple[str, str, str], list[PassEstimate]] = {}
    for e in estimates:
        found.setdefault((e.this.surface, e.this.quantity, e.kind), []).append(e)
    for key in [k for k in found if k[1] == "albedo" and k[2] == ""]:
        # An albedo pass that was refused before its sky was known goes to its surface's others.
        homes = [k for k in found if k[:2] == key[:2] and k[2]]
        if homes:
            found[homes[0]] += found.pop(key)
    spreads = Spreads(campaign, found) if between_passes == "common" else None
    return tuple(pool_passes(campaign, key, some, draws, coverage, spreads)
                 for key, some in found.items())


def pool_passes(campaign: str, key: tuple[str, str, str], passes: Sequence[PassEstimate],
                draws: Draws, coverage: float, spreads: Spreads | None = None) -> Group:
    """Return what the passes of one surface, quantity and kind come to."""
    used = tuple(p for p in passes if p.evaluated)
    nothing = Group(campaign, *key, tuple(passes), (), np.zeros(0), np.nan, np.nan, 0, None,
                    "not evaluated", ())
    if not used:
        return replace(nothing, notes=_why_not(tuple(passes)))
    if key[1] == "ndvi" and len({bands_of(p.this, p.inputs) for p in used}) > 1:
        return replace(nothing, notes=("the bands differ between its passes",))
    moves = Moves(campaign, used)
    common = spreads.common(key) if spreads else None
    over = _pool(used, moves.own_u, common)
    weights, pooled = over.weights, over.pooled
    systematic = moves.systematic(weights, draws)
    if not np.isfinite(systematic).all():
        return replace(nothing, notes=("the stated uncertainties of its inputs reach beyond the "
                                       "range of the model",))
    rows = budget_rows(campaign, moves, weights, pooled, coverage)
    made = replace(
        nothing, used=used, weights=weights, value=over.value, dof=pooled.dof, budget=rows,
        u_at_least=float(np.sqrt(systematic.var() + (weights**2) @ (moves.own_u**2))),
        pooled=pooled, units_u=over.units_u, status="value only", spreads=spreads,
        notes=("one pass", *_notes(tuple(passes), used)))
    if pooled.dof == 0:
        return made
    scope = f"{campaign}:{':'.join(key)}:sampling"
    result = observed(over.value, over.value + systematic,
                      (Sampling(scope, pooled.u, pooled.dof),), draws)
    notes = list(_notes(tuple(passes), used))
    single = len({p.this.patch for p in used}) == 1
    if single:
        notes = ["one patch: holds for this patch", *notes]
    if spreads and common:
        notes = [spreads.words(key, single), *notes]
    if len(used) <= 2:
        notes = ["two passes only" if len(used) == 2 else "one pass", *notes]
    made = replace(made, result=result, notes=tuple(notes),
                   status="qualified" if notes else "ok")
    _assert_floor(made, summarise(result, coverage), coverage)
    return made


@dataclass(frozen=True)
class _Over:
    """Value and weights per pass, the last pooling step, and the u of the units that went in."""

    value: float
    weights: FloatArray
    pooled: Pooled
    units_u: FloatArray


def _pool(used: tuple[PassEstimate, ...], own: FloatArray, common: Common | None) -> _Over:
    """Pool passes to patches, and patches (if several) to the surface."""
    values = np.array([p.value for p in used])
    patches = rows_by_patch(used)
    within = {name: pool(values[rows], own[rows], common) for name, rows in patches.items()}
    if len(patches) == 1:
        (only,) = within.values()
        return _Over(only.value, only.weights, only, own)
    u = np.array([own[rows[0]] if within[name].dof == 0 else within[name].u
                  for name, rows in patches.items()])
    over = pool([w.value for w in within.values()], u)
    weights = np.zeros(len(used))
    for share, (name, rows) in zip(over.weights, patches.items(), strict=True):
        weights[rows] = share * within[name].weights
    return _Over(over.value, weights, over, u)


def _notes(passes: tuple[PassEstimate, ...], used: tuple[PassEstimate, ...]) -> tuple[str, ...]:
    """Return what lowers the status of a surface: what half its passes or more are flagged with."""
    serious = ("calibration expired", "no calibration stated", "sun lower than",
               "small footprint share", "head radius not stated", "no dark reading",
               "cloud in the sky model", "few placements", "higher than", "field of view",
               "the spot is wider", "housing temperature not logged")
    seen = [f for p in used for f in p.flags if f.startswith(serious)]
    flags = [f for f in dict.fromkeys(seen) if 2 * seen.count(f) >= len(used)]
    left = [p for p in passes if not p.evaluated]
    notes = list(flags)
    if used[0].this.quantity == "ndvi" and {"clear", "diffuse"} <= {p.sky.kind for p in used}:
        notes.append("passes under a clear and under an overcast sky")
    if left:
        why = _why_not(tuple(left))[0]
        notes.append(f"{len(left)} of {len(passes)} passes not evaluated: {why}")
    return tuple(notes)


def _why_not(passes: tuple[PassEstimate, ...]) -> tuple[str, ...]:
    """Return the reason most passes share; a number in it is the mean over those passes."""
    kinds = [MEASURED.sub("#", p.note) for p in passes]
    best = max(dict.fromkeys(kinds), key=kinds.count)
    alike = [p.note for p, kind in zip(passes, kinds, strict=True) if kind == best]
    means = iter(np.mean([[int(n) for n in MEASURED.findall(note)] for note in alike], axis=0))
    return (MEASURED.sub(lambda _: f"{next(means):.0f}", alike[0]),)


def _assert_floor(group: Group, summary: Summary, coverage: float) -> None:
    floor = max((row["contribution"] for row in group.budget
                 if row["scope"].endswith((":gain", ":offset"))), default=0.0)
    half, least = (summary.upper - summary.lower) / 2, float(ndtri((1 + coverage) / 2)) * floor
    assert half >= 0.95 * least, (  # Monte Carlo may miss a quantile by a little
        f"{group.key}: half-width {half:g} is below its calibration's {least:g}")


def surface_table(found: Sequence[Group], coverage: float,
                  wanted: RelevantChange | None = None) -> pd.DataFrame:
    """Return the table `surfaces`; temperatures in degC, their u in K.

    `wanted` is the half-width asked for by quantity; `needed` says how many passes (patches where
    there are several) would give it.
    """
    rows = []
    for g in found:
        row: dict[str, Any] = {
            "campaign": g.campaign, "surface": g.surface, "quantity": g.quantity, "kind": g.kind,
            "unit": UNITS[g.quantity], "value": display(g.value, g.quantity), "u": np.nan,
            "lower": np.nan, "upper": np.nan, "coverage": coverage, "k": np.nan, "dof": np.nan,
            "n_patches": len({p.this.patch for p in g.used}), "n_passes": len(g.used),
            "n_records": sum(p.n_records for p in g.used),
            "n_effective": float(sum(p.n_effective for p in g.used)),
            "u_at_least": g.u_at_least, "spread": g.pooled.tau if g.pooled else np.nan,
            "end_error": np.nan, "needed": np.nan, "status": g.status,
            "note": "; ".join(g.notes)}
        if g.result is not None:
            s = summarise(g.result, coverage)
            row |= {"u": s.u, "lower": display(s.lower, g.quantity),
                    "upper": display(s.upper, g.quantity), "k": s.k, "dof": s.dof,
                    "end_error": s.end_error}
            if wanted and g.pooled and g.units_u is not None:
                row["needed"] = units_needed(g.budget, g.pooled, g.units_u, wanted.of(g.quantity),
                                             coverage)
        rows.append(row)
    return table("surfaces", rows)


def budget_table(found: Sequence[Group]) -> pd.DataFrame:
    """Return the table `budget`: contributions and variance shares, largest first."""
    return table("budget", [row for g in found for row in g.budget])


def pass_tables(campaign: str, estimates: Sequence[PassEstimate]) -> dict[str, pd.DataFrame]:
    """Return the tables `passes`, `dwells`, `corrections` and `histograms`."""
    passes, dwells, steps, bars = [], [], [], []
    for e in estimates:
        this, quantity = e.this, e.this.quantity
        where = {"campaign": campaign, "surface": this.surface, "pass": this.name}
        channel = next(iter(this.channels.values()))
        passes.append(where | {
            "patch": this.patch, "quantity": quantity, "kind": e.kind, "mode": this.mode,
            "instrument": channel.logger, "unit": UNITS[quantity],
            "start_utc": this.start_ns, "stop_utc": this.stop_ns,
            "value_raw": display(e.value_raw, quantity), "value": display(e.value, quantity),
            "u_within": e.u_within, "n_records": e.n_records, "n_effective": e.n_effective,
            "zenith_deg": e.zenith_deg, "flags": "; ".join(e.flags), "status": e.status,
            "note": e.note})
        for number, (start, stop, value, u, n) in enumerate(e.dwells, start=1):
            dwells.append(where | {
                "patch": this.patch, "dwell": number, "start_utc": start, "stop_utc": stop,
                "value": display(value, quantity), "u": u, "n_records": n})
        for step, value in e.steps:
            steps.append(where | {
                "quantity": quantity, "kind": e.kind, "unit": UNITS[quantity], "step": step,
                "value": display(value, quantity)})
        bars += [where | {"patch": this.patch, "quantity": quantity, "kind": e.kind,
                          "unit": UNITS[quantity], "lower": display(lower, quantity),
                          "upper": display(upper, quantity), "n_records": n}
                 for lower, upper, n in e.bars]
    return {"passes": table("passes", passes), "dwells": table("dwells", dwells),
            "corrections": table("corrections", steps), "histograms": table("histograms", bars)}


