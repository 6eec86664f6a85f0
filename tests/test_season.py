"""Many campaigns in one command: order, failures, workers lost, the page that lists them."""

import multiprocessing
import os
import signal
import subprocess
import sys
import time
from concurrent.futures import ProcessPoolExecutor
from datetime import date, timedelta
from functools import partial
from pathlib import Path

import html5lib
import pytest
from bs4 import BeautifulSoup
from small_campaigns import LIGHT, left_behind, processes, project, run_here, whole, write

from surveykit import season
from surveykit.index import write_index
from surveykit.season import BUG, DONE, USER, Outcome, run_all

FULL = os.environ.get("SURVEYKIT_FULL") == "all"
MANY = 200 if FULL else int(os.environ.get("SURVEYKIT_SEASON", "3"))


def quiet(line):
    """Take a line of progress and drop it."""


@pytest.fixture(scope="module")
def yards(tmp_path_factory):
    """Four campaigns: b needs a, c is at fault, d needs c; named so that order must be found."""
    folder = project(tmp_path_factory.mktemp("season") / "project", [])
    write(folder, "z-first", date="2025-06-11")
    write(folder, "a-second", date="2025-07-11",
          comparison={"earlier": ["params/z-first.yml"], "control": "court"})
    bad = write(folder, "m-bad", date="2025-06-12")
    bad.write_text(bad.read_text(encoding="utf-8").replace("latitude: 41.3", "latitude: 141.3"),
                   encoding="utf-8")
    write(folder, "b-on-bad", date="2025-08-11",
          comparison={"earlier": ["params/m-bad.yml"], "control": "court"})
    return folder


@pytest.mark.parametrize("jobs", [1, 2])
def test_order_and_failures(yards, jobs):
    said = []
    paths = [yards / "params" / f"{name}.yml"
             for name in ("a-second", "b-on-bad", "m-bad", "z-first")]
    outcomes = {one.path.stem: one for one in
                run_all(paths, said.append, jobs=jobs, notebooks=())}
    assert {name: (one.code, one.word) for name, one in outcomes.items()} == {
        "z-first": (DONE, "done"), "a-second": (DONE, "done"),
        "m-bad": (USER, "input at fault"), "b-on-bad": (USER, "not run")}
    assert "latitude" in outcomes["m-bad"].lines[0]
    assert outcomes["b-on-bad"].lines == ("b-on-bad.yml: needs m-bad, which failed",)
    for name in ("z-first", "a-second"):
        whole(yards, name)
    first, second = ((yards / "reports" / name / "run.json").stat().st_mtime_ns
                     for name in ("z-first", "a-second"))
    assert first < second
    assert left_behind(yards) == []


def test_an_earlier_campaign_that_stands_is_not_run_again(yards):
    assert run_here(yards, ["z-first"])[0] == DONE
    before = (yards / "reports" / "z-first" / "run.json").stat().st_mtime_ns
    outcomes = run_all([yards / "params" / "a-second.yml"], quiet, notebooks=())
    assert [(one.path.stem, one.word) for one in outcomes] == [
        ("z-first", "stands"), ("a-second", "done")]
    assert (yards / "reports" / "z-first" / "run.json").stat().st_mtime_ns == before


def test_a_circle_is_told_by_each_and_stops_nobody(yards):
    for name, other in (("c-one", "c-two"), ("c-two", "c-one")):
        path = write(yards, name, date="2025-06-13")
        text = path.read_text(encoding="utf-8")
        path.write_text(f"{text}comparison: {{earlier: [params/{other}.yml]}}\n", encoding="utf-8")
    paths = [yards / "params" / f"{name}.yml" for name in ("c-one", "c-two", "z-first")]
    outcomes = {one.path.stem: one for one in run_all(paths, quiet, notebooks=())}
    assert outcomes["z-first"].code == DONE
    for name in ("c-one", "c-two"):
        assert outcomes[name].code == USER
        assert "leads back to this campaign" in outcomes[name].lines[0]


def die_once(marker: Path, path: Path, only_if_needed: bool, **more: object) -> Outcome:
    """Stand for a worker that the system stops at its first campaign."""
    if not marker.exists():
        marker.write_text("died", encoding="utf-8")
        os.kill(os.getpid(), signal.SIGKILL)
    return Outcome(path, DONE, "done")


def die(path: Path, only_if_needed: bool, **more: object) -> Outcome:
    """Stand for a campaign that no worker outlives."""
    os.kill(os.getpid(), signal.SIGKILL)
    raise AssertionError


def test_a_worker_that_dies_is_replaced_and_its_campaign_tried_again(yards, tmp_path, monkeypatch):
    monkeypatch.setattr(season, "work", partial(die_once, tmp_path / "marker"))
    outcomes = run_all([yards / "params" / f"{name}.yml" for name in ("z-first", "a-second")],
                       quiet, jobs=2)
    assert [one.word for one in outcomes] == ["done", "done"]


@pytest.mark.skipif(MANY < 20, reason="the longer share: SURVEYKIT_SEASON=20")
def test_a_campaign_that_kills_its_worker_twice_is_given_up(yards, monkeypatch):
    monkeypatch.setattr(season, "work", die)
    outcomes = run_all([yards / "params" / f"{name}.yml" for name in ("z-first", "a-second")],
                       quiet, jobs=2)
    assert [(one.code, one.word) for one in outcomes] == [(BUG, "worker died"), (BUG, "not run")]


def test_the_page_that_lists_all_reports(yards):
    run_here(yards, ["z-first", "a-second"])
    page = yards / "reports" / "index.html"
    text = page.read_text(encoding="utf-8")
    html5lib.HTMLParser(strict=True).parse(text)
    soup = BeautifulSoup(text, "html5lib")
    assert soup.find("script") is None
    links = {a["href"] for a in soup.find_all("a", href=True)}
    assert links == {"z-first/report.html", "a-second/report.html"}
    for link in links:
        assert (page.parent / link).is_file()
    albedo = [cell.get_text() for cell in soup.select("td.number")]
    assert any(cell.startswith("0.2") for cell in albedo)  # 180 / 900, the levels of small_survey
    assert str(yards) not in text
    write_index(yards)
    assert page.read_text(encoding="utf-8") == text


def test_a_contents_page_that_cannot_be_written_hides_no_report(yards, monkeypatch):
    def full(root):
        raise OSError(28, "No space left on device", "reports/index.html")

    monkeypatch.setattr("surveykit.index.write_index", full)
    made, page = season.run_campaigns([yards / "params" / "z-first.yml"], quiet, notebooks=())
    assert (made.code, made.word) == (DONE, "done")
    assert (page.code, page.word) == (BUG, "not written")
    assert "No space left on device; make room" in page.lines[0]


def test_a_broken_report_is_left_out_of_the_page(yards):
    run_here(yards, ["z-first"])
    broken = yards / "reports" / "broken"
    broken.mkdir()
    (broken / "run.json").write_text("{", encoding="utf-8")
    write_index(yards)
    assert "broken" not in (yards / "reports" / "index.html").read_text(encoding="utf-8")
    (broken / "run.json").unlink()
    broken.rmdir()


def memory_mb() -> float:
    pages = int(Path("/proc/self/statm").read_text(encoding="utf-8").split()[1])
    return pages * os.sysconf("SC_PAGE_SIZE") / 1e6


def in_turn(paths: list[Path]) -> list[float]:
    """Run campaigns one after the other; return the memory held after each [MB]."""
    held = []
    for path in paths:
        outcome = season.work(path, False, notebooks=())
        assert outcome.code == DONE, outcome.lines
        held.append(memory_mb())
    return held


def test_a_folder_of_campaigns_runs_to_the_end_in_flat_memory(tmp_path):
    """3 in the plain command, SURVEYKIT_SEASON=20 in CI, 200 with SURVEYKIT_FULL=all."""
    folder = project(tmp_path / "project", [])
    days = [date(2025, 3, 1) + timedelta(days=day) for day in range(MANY)]
    paths = [write(folder, f"yard-{day}", date=str(day)) for day in days]
    if MANY < 20:
        outcomes = run_all(paths, quiet, jobs=1, notebooks=())
        assert {one.code for one in outcomes} == {DONE}
    else:
        half = len(paths) // 2
        spawn = multiprocessing.get_context("spawn")
        with ProcessPoolExecutor(2, spawn) as pool:
            for held in pool.map(in_turn, [paths[:half], paths[half:]]):
                assert held[-1] - held[4] < 30
    write_index(folder)
    page = (folder / "reports" / "index.html").read_text(encoding="utf-8")
    assert all(f'href="yard-{day}/report.html"' in page for day in days)


CLUSTER = os.environ.get("SURVEYKIT_REQUIRE_CLUSTER") or FULL


@pytest.mark.skipif(not CLUSTER, reason="the cluster's share: SURVEYKIT_REQUIRE_CLUSTER=1")
def test_a_cluster_that_loses_a_worker_makes_every_report(tmp_path):
    """A scheduler and three workers of this machine; one is killed in mid-run."""
    folder = project(tmp_path / "project", [])
    names = [f"yard-{number}" for number in range(6)]
    for number, name in enumerate(names):
        write(folder, name, date=f"2025-06-{11 + number}")
    script = tmp_path / "cluster.py"
    script.write_text(
        "import sys\nfrom distributed import LocalCluster\n"
        "if __name__ == '__main__':\n"
        "    with LocalCluster(n_workers=3, threads_per_worker=1, dashboard_address=None,\n"
        "                      processes=True) as cluster:\n"
        "        print(cluster.scheduler_address, flush=True)\n"
        "        print(*[n.pid for n in cluster.workers.values()], flush=True)\n"
        "        sys.stdin.read()\n", encoding="utf-8")
    serving = subprocess.Popen([sys.executable, str(script)], cwd=tmp_path, text=True,
                               stdin=subprocess.PIPE, stdout=subprocess.PIPE)
    try:
        address = serving.stdout.readline().strip()
        workers = [int(pid) for pid in serving.stdout.readline().split()]
        assert len(workers) == 3
        running = subprocess.Popen(
            [sys.executable, "-c",
             "import sys\nfrom pathlib import Path\nfrom surveykit import season\n"
             f"out = season.run_campaigns([Path('params') / (n + '.yml') for n in {names}], print,"
             f" cluster={address!r}, notebooks={LIGHT})\n"
             "print('\\n'.join(season.summary(out)))\nsys.exit(max(o.code for o in out))"],
            cwd=folder, text=True, stdout=subprocess.PIPE, stderr=subprocess.STDOUT)
        limit = time.monotonic() + 120
        while len(processes(folder)) < 3 and time.monotonic() < limit:
            time.sleep(0.1)  # until kernels live
        os.kill(workers[0], signal.SIGKILL)
        text = running.communicate(timeout=400)[0]
        assert running.returncode == 0, text
    finally:
        serving.communicate(input="", timeout=60)
    for name in names:
        whole(folder, name)
    assert left_behind(folder) == []
