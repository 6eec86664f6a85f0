"""Full, read-only and unwritable folders, a clock set back, two runs at once, a lost kernel.

Each ends with a clear message and exit 1, the old report byte for byte as it was. Mounting needs
root; without it folders are closed by their permissions.
"""

import hashlib
import itertools
import os
import shutil
import signal
import socket
import subprocess
import sys
import time
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager

import pytest
from small_campaigns import LIGHT, left_behind, processes, project, run_here, start, whole

from surveykit import season
from surveykit.locking import idle, locked

NAME = "yard-storage"
ROOT_USER = hasattr(os, "geteuid") and os.geteuid() == 0
pytestmark = pytest.mark.skipif(not sys.platform.startswith("linux"), reason="mounts, reads /proc")


def absent(why):
    """Skip where a machine cannot mount; CI sets the variable that makes it a failure."""
    if "SURVEYKIT_REQUIRE_MOUNT" in os.environ:
        pytest.fail(why)
    pytest.skip(why)


@contextmanager
def mounted(folder, options):
    """A small memory file system in place of a folder, holding what the folder held."""
    kept = folder.with_name(folder.name + "-kept")
    shutil.copytree(folder, kept)
    first = options.replace("ro,", "")
    done = subprocess.run(["mount", "-t", "tmpfs", "-o", first, "tmpfs", str(folder)],
                          capture_output=True, text=True, check=False)
    if done.returncode:
        absent(f"mounting is impossible here: {done.stderr.strip()}")
    try:
        shutil.copytree(kept, folder, dirs_exist_ok=True)
        if options.startswith("ro,"):
            subprocess.run(["mount", "-o", "remount,ro", str(folder)], check=True)
        yield
    finally:
        subprocess.run(["umount", "-l", str(folder)], check=True)


@contextmanager
def closed(folder):
    """A folder that may not be written."""
    if ROOT_USER:  # permissions do not bind root
        with mounted(folder, "ro,size=64m"):
            yield
        return
    folder.chmod(0o555)
    try:
        yield
    finally:
        folder.chmod(0o755)


def snapshot(folder):
    return {p.relative_to(folder): hashlib.sha256(p.read_bytes()).hexdigest()
            for p in sorted(folder.rglob("*")) if p.is_file()}


def size(folder):
    return sum(-(-p.stat().st_size // 4096) * 4096 for p in folder.rglob("*"))


@pytest.fixture(scope="module")
def old(tmp_path_factory):
    """A project with a finished report."""
    folder = project(tmp_path_factory.mktemp("storage") / "project", [NAME])
    code, text = run_here(folder, [NAME])
    assert code == 0, text
    whole(folder, NAME)
    return folder


@pytest.mark.parametrize("room", [16 * 1024, 96 * 1024])
def test_a_full_disk_leaves_the_old_report(old, room):
    if not ROOT_USER:
        absent("mounting is impossible without root")
    before = snapshot(old / "reports")
    with mounted(old / "reports", f"size={size(old / 'reports') + room}"):
        assert snapshot(old / "reports") == before
        code, text = run_here(old, [NAME])
        assert code == 1, text
        assert "No space left on device" in text
        assert "nothing of an earlier report was touched" in text
        assert "Traceback" not in text
        assert snapshot(old / "reports") == before
        assert left_behind(old) == []
    shutil.rmtree(old / "reports-kept")


def test_a_full_run_folder_leaves_the_old_report(old):
    if not ROOT_USER:
        absent("mounting is impossible without root")
    before = snapshot(old / "reports")
    for stage in ("ingest", "quality", "surfaces", "comparison"):
        shutil.rmtree(old / ".surveykit" / NAME / stage)
    with mounted(old / ".surveykit", "size=24k"):
        code, text = run_here(old, [NAME])
        assert code == 1, text
        assert "No space left on device" in text
        assert "Traceback" not in text
    shutil.rmtree(old / ".surveykit-kept")
    assert snapshot(old / "reports") == before
    assert left_behind(old) == []


@pytest.mark.parametrize("place", ["reports", ".surveykit"])
def test_a_folder_that_may_not_be_written_is_named(old, place):
    before = snapshot(old / "reports")
    with closed(old / place):
        code, text = run_here(old, [NAME])
        assert code == 1, text
        assert place in text
        assert "Read-only file system" in text or "Permission denied" in text
        assert "Traceback" not in text
        assert snapshot(old / "reports") == before
    shutil.rmtree(old / f"{place}-kept", ignore_errors=True)


def test_a_refused_run_leaves_no_files(old):
    bad = old / "params" / "yard-bad.yml"
    text = (old / "params" / f"{NAME}.yml").read_text(encoding="utf-8")
    bad.write_text(text.replace(f"campaign: {NAME}", "campaign: yard-bad").replace(
        "sheet.csv", "no_sheet.csv"), encoding="utf-8")
    before = {p for p in old.rglob("*") if "__pycache__" not in p.parts}
    code, text = run_here(old, ["yard-bad"])
    assert code == 2
    assert "no file 'no_sheet.csv'" in text
    assert {p for p in old.rglob("*") if "__pycache__" not in p.parts} == before
    bad.unlink()


def test_a_clock_set_back_does_no_harm(old, monkeypatch):
    """Hashes, not times, say what is old: a file from the future and a clock that jumps back."""
    future = time.time() + 20 * 365 * 86400
    for path in (*(old / "reports" / NAME).rglob("*"), old / "params" / f"{NAME}.yml"):
        os.utime(path, (future, future))
    real, jumps = time.time, itertools.count()
    monkeypatch.setattr(time, "time", lambda: real() - 86400 * next(jumps))
    code, text = run_here(old, [NAME])
    monkeypatch.undo()
    assert code == 0, text
    whole(old, NAME)
    assert (old / "reports" / NAME / "run.json").stat().st_mtime < future - 86400


def test_the_second_of_two_runs_waits_for_the_first(old):
    said: list[str] = []
    path = old / "params" / f"{NAME}.yml"
    with ThreadPoolExecutor(1) as pool:
        with locked(old, NAME):  # as the first run holds it, through whole its life
            second = pool.submit(season.run_all, [path], said.append, notebooks=())
            limit = time.monotonic() + 30
            while not said and time.monotonic() < limit:
                time.sleep(0.02)
            assert said == [f"{NAME}: waits for another run that uses it (process {os.getpid()} on "
                            f"{socket.gethostname()})"]
            with idle(old, NAME) as free:
                assert not free
            assert not second.done()
        assert [one.word for one in second.result(timeout=60)] == ["done"]
    with idle(old, NAME) as free:
        assert free
    whole(old, NAME)
    assert left_behind(old) == []


@pytest.mark.skipif("SURVEYKIT_KILLS" not in os.environ and
                    os.environ.get("SURVEYKIT_FULL") != "all", reason="the longer share")
def test_three_runs_at_once_end_with_one_whole_report(old):
    running = [start(old, [NAME], notebooks=LIGHT) for _ in range(3)]
    texts = [one.communicate(timeout=300)[0] for one in running]
    assert [one.returncode for one in running] == [0, 0, 0], texts
    whole(old, NAME)
    assert left_behind(old) == []


def test_a_lock_of_a_dead_process_holds_nobody_up(old):
    (old / ".surveykit" / f"{NAME}.lock").write_text("process 999999 on gone\n", encoding="utf-8")
    code, text = run_here(old, [NAME])
    assert code == 0
    assert "waits" not in text


def test_a_kernel_that_the_system_stops_is_said_so(old):
    before = snapshot(old / "reports")
    running = start(old, [NAME], notebooks=LIGHT)
    limit = time.monotonic() + 60
    kernels = []
    while not kernels and time.monotonic() < limit and running.poll() is None:
        kernels = [pid for pid in processes(old) if pid != running.pid]
        time.sleep(0.05)
    assert kernels
    os.kill(kernels[0], signal.SIGKILL)
    text = running.communicate(timeout=120)[0]
    assert running.returncode == 1, text
    assert "the system stopped its kernel" in text
    assert "Traceback" not in text
    assert snapshot(old / "reports") == before
    assert left_behind(old) == []
