"""Placements of a contact pass: settled records only, found between lifts."""

from __future__ import annotations

import numpy as np
import pytest
from small_survey import CERTAIN, CONTACT, DAY, KIT, lines, row, small

NS = 1_000_000_000


def contact_log(time_constant_s, seed=7, dwells=24):
    """A first-order head pressed for 6 to 7.5 s, lifted for 1.5 s, logged at 2 Hz, noise .08 K.

    Returns readings [degC] and the true spans [s]. Lifted, it looks at what is 10 to 24 K colder.
    """
    rng = np.random.default_rng(seed)
    step = 0.02
    truth, spans, now = [], [], 20.0
    truth += [35.0] * round(now / step)
    for _ in range(dwells):
        held = rng.uniform(6, 7.5)
        truth += [47 + rng.normal(0, 0.8)] * round(held / step)
        spans.append((now, now + held))
        truth += list(47 - rng.uniform(10, 24) * np.sin(np.pi * np.arange(0, 1, step / 1.5)))
        now = len(truth) * step
    seen = np.empty(len(truth))
    seen[0] = truth[0]
    keep = np.exp(-step / time_constant_s)
    for i in range(1, seen.size):
        seen[i] = keep * seen[i - 1] + (1 - keep) * truth[i]
    read = seen[:: round(0.5 / step)]
    return read + rng.normal(0, 0.08, read.size), spans


@pytest.mark.parametrize("time_constant_s", [0.1, 0.3, 0.5])
def test_settled_placements_are_found_and_no_lift_is(tmp_path, time_constant_s):
    """Settling to 1 % takes 4.6 time constants of a first-order head (analytic)."""
    target, spans = contact_log(time_constant_s)
    kit = {"thermal": KIT["thermal"] | {"time_constant_s": time_constant_s, "interval_s": 0.5}}
    stop = np.datetime64(f"{DAY}T12:00:00") + int(spans[-1][1])
    sheet = [row(**CONTACT, start="12:00:20", stop=str(stop).split("T")[1])]
    log = lines("thermal", n=target.size, step_s=0.5, kit=kit, target=target)
    survey = small(tmp_path, sheet, {"thermal": log}, kit=kit, settings=CERTAIN)
    chosen = survey.quality().passes["C1-contact-1"]
    time = survey.records["thermal"].time_ns[chosen.index] / NS
    midnight = np.datetime64(f"{DAY}T12:00:00", "ns").astype(np.int64) / NS
    found = [(time[a] - midnight, time[b - 1] - midnight) for a, b in chosen.dwells]
    # the trim takes 5 time constants off each end, and with them the first or the last placement
    inner = spans[1:-1]
    assert sum(any(a <= first and last <= b for first, last in found) for a, b in inner) >= len(
        inner) - 1
    assert all(any(a <= first and last <= b + 0.1 for a, b in spans) for first, last in found)
    values = survey.records["thermal"].channels["target"][chosen.index] - 273.15
    for (first, last), (a, b) in zip(found, chosen.dwells, strict=True):
        assert last - first >= 0.5
        assert np.ptp(values[a:b]) < 0.8  # ten times the noise: no lift is in it


def test_a_contact_pass_that_never_settles_is_refused(tmp_path):
    target = 47 + 10 * np.sin(np.arange(160))
    survey = small(tmp_path, [row(**CONTACT)], {"thermal": lines("thermal", target=target)})
    chosen = survey.quality().passes["C1-contact-1"]
    assert chosen.refusal == "no settled placement of the head was found"
