"""Bombs and oversize files end in bounded time and memory with a located message, exit 2."""

import os
import resource
import subprocess
import sys
import time

import pytest
from small_campaigns import project, write

from surveykit.checking import check
from surveykit.core import InputError, shown_faults
from surveykit.opening import open_file

NAME = "yard-limits"
LONGEST_S = 20 if os.environ.get("CI") else 10


@pytest.fixture(scope="module")
def base(tmp_path_factory):
    folder = project(tmp_path_factory.mktemp("limits") / "project", [])
    return folder, write(folder, NAME).read_text(encoding="utf-8")


def yaml_bombs(text):
    names = "abcdefghij"
    aliases = "a: &a [x]\n" + "".join(
        f"{n}: &{n} [{', '.join([f'*{m}'] * 9)}]\n" for m, n in zip(names, names[1:], strict=False))
    return {
        "alias bomb": aliases + text,
        "million-character line": f"title: \"{'x' * 1_000_000}\"\n",
        "long text within the limit": text.replace("title: Invented yard",
                                                   f"title: {'x' * 200_000}"),
        "deep nesting": "a: " + "[" * 100_000 + "]" * 100_000,
        "deep mapping": "".join(" " * n + "a:\n" for n in range(600)),
        "many keys": text + "".join(f"k{n}: 1\n" for n in range(15_000)),
        "many surfaces": text.replace("surfaces:\n", "surfaces:\n" + "".join(
            f"  s{n}: {{label: x}}\n" for n in range(8_000)) + "  more:\n    label: x\n", 1),
        "huge number": text.replace("latitude: 41.3", "latitude: " + "9" * 5_000),
        "endless pattern": text.replace("pair_*.csv", "**/" * 30 + "*" * 60 + "q"),
        "many draws": text + "statistics: 1\n",
    }


@pytest.mark.parametrize("which", [*yaml_bombs("")])
def test_a_parameter_file_cannot_take_time(base, which):
    folder, text = base
    path = folder / "params" / f"{NAME}.yml"
    path.write_text(yaml_bombs(text)[which], encoding="utf-8")
    begun = time.monotonic()
    with pytest.raises(InputError) as refused:
        open_file(path)
    path.write_text(text, encoding="utf-8")
    assert time.monotonic() - begun < LONGEST_S
    assert f"params/{NAME}.yml" in refused.value.faults[0]
    assert all(len(fault) < 2_000 for fault in refused.value.faults[:50])


def data_bombs(sheet, log):
    lines = log.splitlines()
    return {
        ("sheet.csv", "million-character cell"): sheet.replace("court", "x" * 1_000_000, 1),
        ("sheet.csv", "many rows"): sheet + "pass,court,C1\n" * 100_000,
        ("sheet.csv", "many columns"): "\n".join(
            line + "," * 20_000 for line in sheet.splitlines()),
        ("sheet.csv", "open quote"): sheet + '"' + "x,\n" * 200_000,
        ("sheet.csv", "huge counts"): sheet.replace(",4,4,", ",1e308,99999999999999999999,"),
        ("pair_0.csv", "million-character line"): "\n".join([*lines[:5], "1" * 3_000_000]),
        ("pair_0.csv", "many columns"): "\n".join([lines[0] + ",x" * 50_000, *lines[1:9]]),
        ("pair_0.csv", "no line ends"): "x" * 5_000_000,
        ("pair_0.csv", "open quote"): lines[0] + '\n"' + "x,\n" * 500_000,
        ("pair_0.csv", "zero bytes"): "\0" * 3_000_000,
    }


@pytest.mark.parametrize("which", [*data_bombs("", "\n")], ids=" ".join)
def test_a_data_file_cannot_take_time(base, which):
    folder, _ = base
    path = folder / "data-of" / NAME / which[0]
    kept = path.read_text(encoding="utf-8")
    sheet, log = ((path.parent / name).read_text(encoding="utf-8")
                  for name in ("sheet.csv", "pair_0.csv"))
    path.write_text(data_bombs(sheet, log)[which], encoding="utf-8")
    begun = time.monotonic()
    try:
        told = check(folder / "params" / f"{NAME}.yml")
    except InputError as error:
        told = list(error.faults)
        assert any(which[0].split("_")[0] in fault for fault in told), told[0][:300]
    finally:
        path.write_text(kept, encoding="utf-8")
    assert time.monotonic() - begun < LONGEST_S
    assert sum(map(len, shown_faults(told))) < 1_000_000


def test_the_command_refuses_a_bomb_in_little_memory(base):
    folder, text = base
    path = folder / "params" / f"{NAME}.yml"
    path.write_text(yaml_bombs(text)["alias bomb"], encoding="utf-8")
    done = subprocess.run(
        [sys.executable, "-m", "surveykit.cli", "run", str(path)], cwd=folder, check=False,
        capture_output=True, text=True, timeout=60,
        preexec_fn=lambda: resource.setrlimit(resource.RLIMIT_AS, (3 << 30, 3 << 30)))
    path.write_text(text, encoding="utf-8")
    assert done.returncode == 2, done.stderr
    assert "aliases" in done.stderr
    assert "Traceback" not in done.stderr
