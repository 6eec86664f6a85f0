"""Reading logs costs little beside what pandas does for the same values: ratios, never seconds.

The asks are ratios to a plain way of doing the same work, measured in turns (median of five) in one
process, since machines are noisy; each benchmark compares the values as well. The reader's two
threads want two cores: where others have taken them, processor times are compared instead, which
say nothing of the threads: hence HEADROOM_BUSY.
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from surveykit.intake.loggers import read_logger
from surveykit.intake.params import Instrument
from surveykit.intake.times import read_times

pytestmark = pytest.mark.slow
FULL = os.environ.get("SURVEYKIT_FULL") == "all"
HEADROOM, HEADROOM_BUSY, TURNS = 1.25, 2.0, 5
ISO_ASK, DAY_FIRST_ASK, COMMA_ASK, BYTES_ASK = 1.3, 0.3, 0.35, 120


def entry(layout: dict[str, Any] | None = None) -> Instrument:
    return Instrument.model_validate({
        "time": {"column": "time", "format": "iso8601", "zone": "UTC"}, "layout": layout or {},
        "columns": {"target": {"quantity": "brightness_temperature", "unit": "degC",
                               "u_offset": 0.2},
                    "body": {"quantity": "housing_temperature", "unit": "degC"}},
        "time_constant_s": 0.3})


def table(rows: int) -> pd.DataFrame:
    rng = np.random.default_rng(1)
    times = pd.date_range("2025-07-24T08:00", periods=rows, freq="200ms")
    frame = pd.DataFrame({"time": times})
    for name, level in (("target", 40), ("body", 30), ("battery", 12)):
        frame[name] = np.round(level + rng.normal(size=rows), 2)
    return frame


def busy() -> bool:
    """Return whether others have taken the cores that the reader's threads want."""
    return hasattr(os, "getloadavg") and os.getloadavg()[0] > (os.cpu_count() or 1)


def in_turns(ours: Callable[[], Any], plain: Callable[[], Any]) -> tuple[float, Any, Any]:
    """Return the ratio of the medians, and what both gave; of processor time where it is busy."""
    clock = time.process_time if busy() else time.perf_counter
    durations: tuple[list[float], list[float]] = ([], [])
    for _ in range(TURNS):
        for work, taken in zip((ours, plain), durations, strict=True):
            start = clock()
            got = work()
            taken.append(clock() - start)
            if work is ours:
                one = got
            else:
                other = got
    return statistics.median(durations[0]) / statistics.median(durations[1]), one, other


def held(ratio: float, ask: float) -> None:
    print(f"ratio {ratio:.3f}, asked {ask:g}{', busy machine' if busy() else ''}")  # noqa: T201
    limit = ask * (HEADROOM_BUSY if busy() else HEADROOM)
    assert ratio <= limit, f"{ratio:.3f} of the plain way, asked {ask:g}"


def test_an_iso_log_costs_little_more_than_bare_pandas(tmp_path):
    frame = table(400_000)
    path = tmp_path / "log.csv"
    frame["time"] = frame["time"].dt.strftime("%Y-%m-%dT%H:%M:%S.%f").str[:-3]
    frame.to_csv(path, index=False)
    known = entry()
    ratio, records, plain = in_turns(
        lambda: read_logger("thermal", known, [path], tmp_path),
        lambda: pd.read_csv(path, parse_dates=["time"]))
    assert_allclose(records.channels["target"], plain["target"] + 273.15, rtol=1e-12)
    assert_array_equal(records.time_ns, plain["time"].dt.as_unit("ns").astype("int64"))
    held(ratio, ISO_ASK)


def test_day_first_times_cost_a_fraction_of_an_explicit_format():
    form = "%d.%m.%Y %H:%M:%S"
    texts = pd.Series(table(200_000)["time"].dt.strftime(form).to_numpy(dtype=object))
    ratio, (wall, _), plain = in_turns(
        lambda: read_times(texts, form), lambda: pd.to_datetime(texts, format=form))
    assert_array_equal(wall, plain.dt.as_unit("ns").astype("int64"))
    held(ratio, DAY_FIRST_ASK)


def test_decimal_commas_cost_a_fraction_of_reading_texts(tmp_path):
    frame = table(200_000)
    frame["time"] = frame["time"].dt.strftime("%Y-%m-%d %H:%M:%S.%f").str[:-3]
    path = tmp_path / "log.csv"
    text = frame.to_csv(index=False, sep=";").replace(".", ",")
    path.write_text("station 4\nserial 7, in use\n" + text)
    known = entry({"delimiter": ";", "decimal": ",", "skip_lines": 2})

    def all_texts() -> pd.DataFrame:
        read = pd.read_csv(path, sep=";", skiprows=2, dtype=str)
        for name in ("target", "body", "battery"):
            read[name] = read[name].str.replace(",", ".").astype(float)
        read["time"] = pd.to_datetime(read["time"].str.replace(",", "."),
                                      format="%Y-%m-%d %H:%M:%S.%f")
        return read

    ratio, records, plain = in_turns(
        lambda: read_logger("thermal", known, [path], tmp_path), all_texts)
    assert_allclose(records.channels["body"], plain["body"] + 273.15, rtol=1e-12)
    assert_array_equal(records.time_ns, plain["time"].dt.as_unit("ns").astype("int64"))
    held(ratio, COMMA_ASK)


MEMORY = """
import sys
import time
from pathlib import Path
sys.path.insert(0, {here!r})
from test_reading import entry, read_logger
folder = Path({folder!r})
known = entry()
read_logger("thermal", known, [folder / "few.csv"], folder)
def peak_kib():  # of this process alone; ru_maxrss would bring the parent's through exec
    status = Path("/proc/self/status").read_text()
    return int(status.split("VmHWM:")[1].split()[0])
base, begun = peak_kib(), time.perf_counter()
records = read_logger("thermal", known, [folder / "many.csv"], folder)
took = time.perf_counter() - begun
print(len(records), (peak_kib() - base) * 1024 / len(records), took / len(records) * 1e6)
"""


@pytest.mark.skipif(sys.platform != "linux", reason="reads /proc")
def test_memory_of_a_long_log(tmp_path):
    # 2 million rows stand for 10 million, which SURVEYKIT_FULL=all reads, beside .2 and 1 million
    frame = table(200_000)
    frame["time"] = frame["time"].dt.strftime("%Y-%m-%dT%H:%M:%S.%f").str[:-3]
    head, body = frame.to_csv(index=False).split("\n", 1)
    (tmp_path / "few.csv").write_text(head + "\n" + body[: body.find("\n", 10_000) + 1])
    code = MEMORY.format(here=str(Path(__file__).parent), folder=str(tmp_path))
    seconds = []
    for parts in (1, 5, 50) if FULL else (10,):
        with (tmp_path / "many.csv").open("w") as file:
            file.write(head + "\n")
            for day in pd.date_range("2025-05-01", periods=parts):  # so that times ascend
                file.write(body.replace("2025-07-24", f"{day:%Y-%m-%d}"))
        done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True,
                              check=True)
        rows, size, took = (float(word) for word in done.stdout.split())
        print(f"{rows:.0f} rows: {size:.0f} bytes a row, asked {BYTES_ASK}; "  # noqa: T201
              f"{took:.2f} s a million")
        assert rows == parts * len(frame)
        if parts > 1:
            assert 16 < size <= BYTES_ASK  # time and two channels alone take 24
            seconds.append(took)
    assert max(seconds) <= 1.5 * min(seconds)  # linear
