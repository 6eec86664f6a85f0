"""Many campaigns: in the order they need one another, several at once, none stopping the rest."""

from __future__ import annotations

import multiprocessing
import os
import threading
import time
import traceback
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import (
    FIRST_COMPLETED,
    BrokenExecutor,
    Executor,
    Future,
    ProcessPoolExecutor,
    wait,
)
from contextlib import contextmanager
from dataclasses import dataclass, replace
from functools import partial
from graphlib import CycleError, TopologicalSorter
from multiprocessing.connection import wait as wait_for
from pathlib import Path

from surveykit import runner
from surveykit.core import InputError, shown_faults
from surveykit.intake.params import is_kit_file, load
from surveykit.opening import open_file
from surveykit.swap import UNTOUCHED, storage

DONE, BUG, USER = 0, 1, 2
TRIES = 2  # of a campaign whose worker died
Say = Callable[[str], None]
Work = Callable[[Path, bool], "Outcome"]
Submit = Callable[[Work, Path, bool], Future["Outcome"]]


@dataclass(frozen=True)
class Outcome:
    """What became of one campaign: its exit code, its report or why there is none."""

    path: Path
    code: int
    word: str
    seconds: float = 0.0
    lines: tuple[str, ...] = ()
    report: Path | None = None


def work(path: Path, only_if_needed: bool, *, lanes: int | None = None,
         notebooks: tuple[str, ...] = runner.NOTEBOOKS, say: Say | None = None) -> Outcome:
    """Run one campaign; whatever goes wrong becomes its outcome.

    `only_if_needed` leaves a report alone that belongs to its inputs.
    """
    begun = time.perf_counter()
    made = partial(Outcome, path)
    try:
        if only_if_needed and runner.up_to_date(open_file(path)):
            return made(DONE, "stands")
        report = runner.run(path, say or (lambda line: None), lanes=lanes, notebooks=notebooks)
        return made(DONE, "done", time.perf_counter() - begun, (), report)
    except InputError as error:
        return made(USER, "input at fault", time.perf_counter() - begun,
                    tuple(shown_faults(error.faults)))
    except OSError as error:
        return made(BUG, "not written", time.perf_counter() - begun,
                    (f"{path.name}: {storage(error)}",))
    except Exception:
        return made(BUG, "bug", time.perf_counter() - begun,
                    (f"{path}: a bug; please report it:", traceback.format_exc()))


def run_all(paths: Sequence[Path], say: Say, *, jobs: int = 1, cluster: str | None = None,
            notebooks: tuple[str, ...] = runner.NOTEBOOKS) -> list[Outcome]:
    """Run campaigns, each after the earlier ones it names; return what became of each.

    Kits among the files are passed over. An earlier campaign that is not among them is run where
    its report is missing or its inputs changed. What needs one that failed is not run.

    Parameters
    ----------
    paths : sequence of Path
        Parameter files.
    say : callable
        Takes lines of progress.
    jobs : int
        How many campaigns at once, each in a process of its own.
    cluster : str, optional
        Address of a dask scheduler whose workers run them instead.
    notebooks : tuple of str
        Those that run in each.
    """
    campaigns = []
    for path in dict.fromkeys(path.absolute() for path in paths):
        if is_kit_file(path):
            say(f"{path.name}: a kit of instruments, nothing to run; passed over")
        else:
            campaigns.append(path)
    needs = _needs(campaigns)
    asked = {_same(path) for path in campaigns}
    one = partial(work, notebooks=notebooks)
    if cluster is None and (jobs == 1 or len(needs) < 2):
        return _ordered(needs, asked, partial(_now, partial(one, say=say)), say, jobs=1)
    if cluster is not None:
        workers, lanes, jobs = _cluster(cluster), 1, len(needs)
    else:
        workers, lanes = _processes(jobs), max(1, runner.cores() // jobs)
    one = partial(one, lanes=lanes)
    with workers as submit:
        return _ordered(needs, asked, partial(submit, one), say, jobs=jobs)


def run_campaigns(paths: Sequence[Path], say: Say, *, jobs: int = 1, cluster: str | None = None,
                  notebooks: tuple[str, ...] = runner.NOTEBOOKS) -> list[Outcome]:
    """As `run_all`, and write reports/index.html last.

    Raises
    ------
    InputError
        If the cluster cannot be reached.
    """
    outcomes = run_all(paths, say, jobs=jobs, cluster=cluster, notebooks=notebooks)
    if any(one.report is not None for one in outcomes):
        from surveykit.index import write_index

        for root in {one.report.parents[2] for one in outcomes if one.report is not None}:
            try:
                write_index(root)
            except OSError as error:
                outcomes.append(Outcome(root / "reports" / "index.html", BUG, "not written",
                                        lines=(storage(error),)))
    return outcomes


def summary(outcomes: Iterable[Outcome]) -> list[str]:
    """Return the final table: a line a campaign, and of what failed every reason."""
    lines = []
    for one in outcomes:
        lines.append(f"  {one.path.stem:<40} {one.word:<15} {one.seconds:6.1f} s")
        lines += [f"    {line}" for text in one.lines for line in text.splitlines()]
    return lines


def _same(path: Path) -> Path:
    return Path(os.path.realpath(path))


def _needs(campaigns: list[Path]) -> dict[Path, set[Path]]:
    """Return for each campaign those it needs; edges that form a circle are left to its run."""
    needs: dict[Path, set[Path]] = {}
    waiting = list(campaigns)
    while waiting:
        path = _same(waiting.pop())
        if path not in needs:
            needs[path] = {_same(earlier) for earlier in _earlier(path)} - {path}
            waiting += needs[path]
    while True:
        try:
            TopologicalSorter(needs).prepare()
        except CycleError as circle:
            for path in circle.args[1]:
                needs[path] = set()
        else:
            return needs


def _earlier(path: Path) -> tuple[Path, ...]:
    """Return the earlier campaigns a file names; none where it is at fault: its run says so."""
    try:
        return load(path).earlier
    except InputError:
        return ()


def _ordered(needs: dict[Path, set[Path]], asked: set[Path],
             submit: Callable[[Path, bool], Future[Outcome]], say: Say, *,
             jobs: int) -> list[Outcome]:
    sorter = TopologicalSorter(needs)
    sorter.prepare()
    ready: list[Path] = []
    tries: dict[Path, int] = {}
    running: dict[Future[Outcome], Path] = {}
    outcomes: dict[Path, Outcome] = {}

    def settle(outcome: Outcome) -> None:
        outcomes[outcome.path] = outcome
        if jobs > 1:
            say(summary([outcome])[0])
        sorter.done(outcome.path)

    while sorter.is_active():
        ready += sorted(sorter.get_ready())
        while ready and len(running) < jobs:
            path = ready.pop(0)
            failed = sorted(p.stem for p in needs[path] if outcomes[p].code != DONE)
            if failed:
                code = max(outcomes[p].code for p in needs[path])
                settle(Outcome(path, code, "not run", 0.0, (
                    f"{path.name}: needs {', '.join(failed)}, which failed",)))
                ready += sorted(sorter.get_ready())
                continue
            tries[path] = tries.get(path, 0) + 1
            running[submit(path, path not in asked)] = path
        for one in wait(running, return_when=FIRST_COMPLETED).done:
            path = running.pop(one)
            try:
                settle(replace(one.result(), path=path))
            except Exception as error:  # the worker died, not the campaign
                if tries[path] < TRIES:
                    ready.insert(0, path)
                else:
                    settle(Outcome(path, BUG, "worker died", 0.0, (
                        f"{path.name}: its worker died twice ({type(error).__name__}), as when "
                        f"memory runs out; {UNTOUCHED}",)))
    return [outcomes[path] for path in TopologicalSorter(needs).static_order()]


def _now(one: Work, path: Path, only_if_needed: bool) -> Future[Outcome]:
    done: Future[Outcome] = Future()
    done.set_result(one(path, only_if_needed))
    return done


@contextmanager
def _processes(jobs: int) -> Iterator[Submit]:
    """Yield what hands work to processes of this machine; a broken pool of them is replaced."""
    def started() -> Executor:
        return ProcessPoolExecutor(jobs, multiprocessing.get_context("spawn"), _end_with_parent)

    pool = started()

    def submit(one: Work, path: Path, only_if_needed: bool) -> Future[Outcome]:
        nonlocal pool
        try:
            return pool.submit(one, path, only_if_needed)
        except BrokenExecutor:
            pool = started()
            return pool.submit(one, path, only_if_needed)

    try:
        yield submit
    finally:
        pool.shutdown(wait=True, cancel_futures=True)


@contextmanager
def _cluster(address: str) -> Iterator[Submit]:
    """Yield what hands work to a dask cluster that sees the project folder under the same path."""
    try:
        from distributed import Client
    except ImportError:
        raise InputError("--cluster: dask.distributed is not installed; write: pip install "
                         "'surveykit[cluster]'") from None
    try:
        client = Client(address, timeout=10)
    except (OSError, ValueError) as error:
        raise InputError(f"--cluster: got {address!r}: {error}; write the address of a "
                         "scheduler, such as tcp://host:8786") from None
    with client:
        yield client.get_executor(pure=False).submit


def _end_with_parent() -> None:
    """End this worker when its parent is gone, so that none outlives a killed run."""
    parent = multiprocessing.parent_process()
    if parent is not None:
        sentinel = parent.sentinel

        def watch() -> None:
            wait_for([sentinel])
            os._exit(1)

        threading.Thread(target=watch, daemon=True).start()
