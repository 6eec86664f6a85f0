"""Passes pooled to patches and surfaces, with shared draws and a budget by scope."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from scipy.special import ndtri

from surveykit.core import FloatArray, Input, table
from surveykit.evidence import models
from surveykit.evidence.estimates import UNITS, PassEstimate, display
from surveykit.statistics.draws import Draws, Result, Sampling, Summary, observed, summarise
from surveykit.statistics.pooling import Pooled, pool

SAMPLING = "scatter between passes and patches"
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

    @property
    def key(self) -> tuple[str, str, str]:
        """(surface, quantity, kind): what the group is compared as."""
        return self.surface, self.quantity, self.kind

    def mean(self, name: str) -> float:
        """Return the weighted mean of an attribute of the used passes; NaN if one lacks it."""
        values = np.array([getattr(p, name) for p in self.used], dtype=np.float64)
        return float(values @ self.weights) if values.size else float("nan")


def groups(campaign: str, estimates: Sequence[PassEstimate], draws: Draws, *,
           coverage: float) -> tuple[Group, ...]:
    """Pool the estimates by surface, quantity and kind, in the order of the passes.

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
    return tuple(_group(campaign, key, tuple(some), draws, coverage)
                 for key, some in found.items())


def _group(campaign: str, key: tuple[str, str, str], passes: tuple[PassEstimate, ...],
           draws: Draws, coverage: float) -> Group:
    surface, quantity, kind = key
    used = tuple(p for p in passes if p.evaluated)
    if not used:
        return Group(campaign, surface, quantity, kind, passes, used, np.zeros(0), np.nan, np.nan,
                     0, None, "not evaluated", _why_not(passes))
    own = np.array([_own_u(campaign, p) for p in used])
    value, weights, pooled = _pool(used, own)
    systematic = np.zeros(draws.size)
    for weight, p in zip(weights, used, strict=True):
        systematic += weight * models.deviations(p.model, p.inputs, draws,
                                                 f"{campaign}:pass:{p.this.name}")
    if not np.isfinite(systematic).all():
        return Group(campaign, surface, quantity, kind, passes, (), np.zeros(0), np.nan, np.nan,
                     0, None, "not evaluated", ("the stated uncertainties of its inputs reach "
                                                "beyond the range of the model",))
    at_least = float(np.sqrt(systematic.var() + (weights**2) @ (own**2)))
    notes = _notes(passes, used)
    rows = _budget(campaign, used, weights, pooled, float(np.sqrt((weights**2) @ (own**2))))
    if len(used) == 1:
        return Group(campaign, surface, quantity, kind, passes, used, weights, value, at_least, 0,
                     None, "value only", ("one pass", *notes), rows)
    scope = f"{campaign}:{surface}:{quantity}:{kind}:sampling"
    result = observed(value, value + systematic - systematic.mean(),
                      (Sampling(scope, pooled.u, pooled.dof),), draws)
    n_patches = len({p.this.patch for p in used})
    if n_patches == 1:
        notes = ("one patch: holds for this patch", *notes)
    if len(used) == 2:
        notes = ("two passes only", *notes)
    group = Group(campaign, surface, quantity, kind, passes, used, weights, value, at_least,
                  pooled.dof, result, "qualified" if notes else "ok", notes, rows)
    _assert_floor(group, summarise(result, coverage), coverage)
    return group


def _pool(used: tuple[PassEstimate, ...],
          own: FloatArray) -> tuple[float, FloatArray, Pooled]:
    """Pool passes to patches, and patches (if several) to the surface; weights per pass."""
    values = np.array([p.value for p in used])
    patches: dict[str, list[int]] = {}
    for i, p in enumerate(used):
        patches.setdefault(p.this.patch, []).append(i)
    within = {name: pool(values[rows], own[rows]) for name, rows in patches.items()}
    if len(patches) == 1:
        (only,) = within.values()
        return only.value, only.weights, only
    u = [own[rows[0]] if len(rows) == 1 else within[name].u for name, rows in patches.items()]
    over = pool([w.value for w in within.values()], u)
    weights = np.zeros(len(used))
    for share, (name, rows) in zip(over.weights, patches.items(), strict=True):
        weights[rows] = share * within[name].weights
    return over.value, weights, over


def _own_u(campaign: str, p: PassEstimate) -> float:
    """Return what a pass does not share: scatter within it and inputs of its own scope."""
    moves = models.sensitivities(p.model, p.inputs)
    alone = [moves[i.name] for i in p.inputs
             if i.u > 0 and i.scope == f"{campaign}:pass:{p.this.name}"]
    return float(np.sqrt(p.u_within**2 + np.sum(np.square(alone))))


def _budget(campaign: str, used: tuple[PassEstimate, ...], weights: FloatArray, pooled: Pooled,
            own: float) -> tuple[dict[str, Any], ...]:
    """Return one row a scope: its input u and its contribution, signs kept until they add up."""
    sums: dict[str, float] = {}
    inputs: dict[str, Input] = {}
    for weight, p in zip(weights, used, strict=True):
        moves = models.sensitivities(p.model, p.inputs)
        for i in p.inputs:
            if i.u > 0 and i.scope != f"{campaign}:pass:{p.this.name}":
                sums[i.scope] = sums.get(i.scope, 0.0) + weight * moves[i.name]
                if i.u > inputs.get(i.scope, i).u or i.scope not in inputs:
                    inputs[i.scope] = i
    quantity = used[0].this.quantity
    unit = {"temperature": "K"}.get(quantity, "1")
    base = {"campaign": campaign, "surface": used[0].this.surface, "quantity": quantity,
            "kind": used[0].kind, "unit": unit}
    rows: list[dict[str, Any]] = [
        base | {"scope": scope, "source": inputs[scope].source, "u_input": inputs[scope].u,
                "contribution": abs(total)} for scope, total in sums.items()]
    scatter = pooled.u if pooled.dof > 0 else own
    rows.append(base | {
        "scope": f"{campaign}:{used[0].this.surface}:sampling",
        "source": SAMPLING if pooled.dof > 0 else "scatter within the one pass",
        "u_input": scatter, "contribution": scatter})
    variance = sum(row["contribution"] ** 2 for row in rows)
    for row in rows:
        row["share"] = row["contribution"] ** 2 / variance if variance > 0 else 0.0
    return tuple(sorted(rows, key=lambda row: (-row["contribution"], row["scope"])))


def _notes(passes: tuple[PassEstimate, ...], used: tuple[PassEstimate, ...]) -> tuple[str, ...]:
    """Return what lowers the status of a surface: what half its passes or more are flagged with."""
    serious = ("calibration expired", "no calibration stated", "sun lower than",
               "small footprint share", "head radius not stated", "no dark reading",
               "cloud in the sky model", "few placements", "higher than", "field of view")
    seen = [f for p in used for f in p.flags if f.startswith(serious)]
    flags = [f for f in dict.fromkeys(seen) if 2 * seen.count(f) >= len(used)]
    left = [p for p in passes if not p.evaluated]
    notes = list(flags)
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


def surface_table(found: Sequence[Group], coverage: float) -> pd.DataFrame:
    """Return the table `surfaces`; temperatures in degC, their u in K."""
    rows = []
    for g in found:
        row: dict[str, Any] = {
            "campaign": g.campaign, "surface": g.surface, "quantity": g.quantity, "kind": g.kind,
            "unit": UNITS[g.quantity], "value": display(g.value, g.quantity), "u": np.nan,
            "lower": np.nan, "upper": np.nan, "coverage": coverage, "k": np.nan, "dof": np.nan,
            "n_patches": len({p.this.patch for p in g.used}), "n_passes": len(g.used),
            "n_records": sum(p.n_records for p in g.used),
            "n_effective": float(sum(p.n_effective for p in g.used)),
            "u_at_least": g.u_at_least, "status": g.status, "note": "; ".join(g.notes)}
        if g.result is not None:
            s = summarise(g.result, coverage)
            row |= {"u": s.u, "lower": display(s.lower, g.quantity),
                    "upper": display(s.upper, g.quantity), "k": s.k, "dof": s.dof}
        rows.append(row)
    return table("surfaces", rows)


def budget_table(found: Sequence[Group]) -> pd.DataFrame:
    """Return the table `budget`: contributions and variance shares, largest first."""
    return table("budget", [row for g in found for row in g.budget])


def pass_tables(campaign: str, estimates: Sequence[PassEstimate]) -> dict[str, pd.DataFrame]:
    """Return the tables `passes`, `dwells` and `corrections`."""
    passes, dwells, steps = [], [], []
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
    return {"passes": table("passes", passes), "dwells": table("dwells", dwells),
            "corrections": table("corrections", steps)}


