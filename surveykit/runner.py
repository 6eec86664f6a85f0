"""Runs one campaign from its raw files, and swaps the finished report folder in whole.

Kernels start first and import while this process does; heavy imports therefore come late here.
"""

from __future__ import annotations

import os
import shutil
import time
from collections.abc import Callable, Iterator
from concurrent.futures import Future, ThreadPoolExecutor, as_completed
from contextlib import contextmanager
from pathlib import Path

from surveykit.core import InputError
from surveykit.handover import load_facts
from surveykit.kernels import Kernels, execute
from surveykit.locking import locked
from surveykit.opening import Survey, open_file
from surveykit.swap import SwapError, heal, swap_in

NOTEBOOKS = ("01_ingest", "02_quality", "03_surfaces", "04_comparison")
Say = Callable[[str], None]


def cores() -> int:
    """Return the number of cores this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def run(path: Path, say: Say, *, lanes: int | None = None,
        notebooks: tuple[str, ...] = NOTEBOOKS, done: tuple[Path, ...] = ()) -> Path:
    """Run a campaign from its raw files and return the path of its report.

    Earlier campaigns named by it are run first where their report is missing or their inputs
    changed. A second run of a campaign waits for the first.

    Parameters
    ----------
    path : Path
        The parameter file.
    say : callable
        Takes one line of progress.
    lanes : int, optional
        How many notebooks run at once; the number of cores where it is not given.
    notebooks : tuple of str
        Those that run; without any the page holds summary and appendix alone.
    done : tuple of Path
        Parameter files that are being run above this one, to find circles.

    Raises
    ------
    InputError
        If an input is at fault; nothing of an earlier report is touched.
    OSError
        If something cannot be written; nothing of an earlier report is touched.
    """
    survey = open_file(path)
    here = survey.parameters.path.resolve()
    if here in done:
        raise InputError(f"{survey.inputs[0]['path']}: comparison.earlier leads back to this "
                         "campaign; name earlier campaigns only")
    for earlier in survey.parameters.earlier:
        if not up_to_date(open_file(earlier)):
            run(earlier, say, lanes=lanes, notebooks=notebooks, done=(*done, here))
    return _run_one(survey, say, lanes or cores(), notebooks)


def up_to_date(survey: Survey) -> bool:
    """Return whether a campaign's report stands and belongs to its present inputs."""
    folder = survey.parameters.root / "reports" / survey.campaign.campaign
    try:
        kept = load_facts(folder / "run.json")
        now = [item for path in survey.parameters.earlier for item in open_file(path).inputs]
    except (OSError, ValueError, InputError):
        return False
    return (kept.get("key") == survey.key and kept.get("earlier_inputs") == now
            and (folder / "report.html").is_file())


def _run_one(survey: Survey, say: Say, lanes: int, notebooks: tuple[str, ...]) -> Path:
    started = time.perf_counter()
    name, root = survey.campaign.campaign, survey.parameters.root
    reports = root / "reports"
    earlier = tuple(path.stem for path in survey.parameters.earlier)
    with locked(root, name, earlier, say) as lock, _new_folder(reports, name) as new:
        lanes = min(lanes, len(notebooks))
        with Kernels(root, ahead=lanes, inherited=(lock,)) as kernels:
            from surveykit import producing  # heavy: while the kernels import

            say(f"{name}: {survey.campaign.title}")
            producing.compute(survey)
            durations = _execute(survey, new / "notebooks", kernels, say, notebooks, lanes)
        producing.write(survey, new, notebooks, durations, started)
        swap_in(reports, name)
    say(f"  report in {time.perf_counter() - started:.1f} s")
    return reports / name / "report.html"


@contextmanager
def _new_folder(reports: Path, name: str) -> Iterator[Path]:
    """Yield the folder beside the old report; it is gone after a failure, but for a failed swap."""
    reports.mkdir(exist_ok=True)
    heal(reports, name)
    new = reports / f".{name}.new"
    if new.exists():
        shutil.rmtree(new)
    (new / "notebooks").mkdir(parents=True)
    try:
        yield new
    except BaseException as error:
        if not isinstance(error, SwapError):
            shutil.rmtree(new, ignore_errors=True)
        raise


def _execute(survey: Survey, folder: Path, kernels: Kernels, say: Say,
             notebooks: tuple[str, ...], lanes: int) -> dict[str, float]:
    """Run the notebooks, `lanes` at once, each in a kernel of its own; a line of progress each.

    They need not wait for one another: what the stages made is in the run folder already.
    """
    if not notebooks:
        return {}
    durations: dict[str, float] = {}
    with ThreadPoolExecutor(lanes) as pool:
        asked: dict[Future[float], str] = {
            pool.submit(_execute_one, survey, folder, kernels, name): name for name in notebooks}
        try:
            for one in as_completed(asked):
                durations[asked[one]] = one.result()
                say(f"  {asked[one]:<14} {durations[asked[one]]:5.1f} s")
        except BaseException:
            pool.shutdown(wait=False, cancel_futures=True)
            kernels.close()
            raise
    return durations


def _execute_one(survey: Survey, folder: Path, kernels: Kernels, name: str) -> float:
    begun = time.perf_counter()
    root = survey.parameters.root
    execute(root / "notebooks" / f"{name}.ipynb", folder / f"{name}.ipynb", root,
            {"params_file": survey.inputs[0]["path"],
             "run_folder": survey.run_folder.relative_to(root).as_posix()}, kernels.take())
    return time.perf_counter() - begun
