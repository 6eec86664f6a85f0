"""Kill -9 at random moments of a run: the report stays whole, nothing lingers, the next run works.

Three moments in the plain command, SURVEYKIT_KILLS=40 in continuous integration, 100 with
SURVEYKIT_FULL=all.
"""

import os
import random
import signal
import sys
import time

import pytest
from small_campaigns import LIGHT, left_behind, processes, project, run, start, whole

KILLS = 100 if os.environ.get("SURVEYKIT_FULL") == "all" else int(
    os.environ.get("SURVEYKIT_KILLS", "3"))
NAME = "yard-kill"
pytestmark = pytest.mark.skipif(not sys.platform.startswith("linux"), reason="reads /proc")


def test_a_kill_at_any_moment_leaves_a_whole_report_and_nothing_else(tmp_path):
    folder = project(tmp_path / "project", [NAME])
    begun = time.monotonic()
    done = run(folder, [NAME], notebooks=LIGHT)
    assert done.returncode == 0, done.stdout + done.stderr
    takes_s = time.monotonic() - begun
    whole(folder, NAME)
    rng = random.Random(20251)
    killed = 0
    for number in range(KILLS):
        running = start(folder, [NAME], notebooks=LIGHT)
        # Every third one late, where the page is written and the folders change places.
        share = rng.uniform(0.8, 1.05) if number % 3 == 2 else rng.uniform(0.0, 1.0)
        try:
            running.wait(timeout=share * takes_s)
        except Exception:
            killed += 1
        kernels = [pid for pid in processes(folder) if pid != running.pid]
        if running.poll() is None:
            os.killpg(running.pid, signal.SIGKILL)
        if number % 2:  # every other time the kernels with it, else they end by themselves
            for pid in kernels:
                if pid in processes(folder):
                    os.kill(pid, signal.SIGKILL)
        running.communicate()
        whole(folder, NAME)
        if number % 4 == 0:
            continue  # the next run begins at once, while kernels of this one may still live
        limit = time.monotonic() + 5
        while processes(folder) and time.monotonic() < limit:
            time.sleep(0.1)
        assert processes(folder) == []
    assert killed > 0
    done = run(folder, [NAME], notebooks=LIGHT)
    assert done.returncode == 0, done.stdout + done.stderr
    whole(folder, NAME)
    assert left_behind(folder) == []
