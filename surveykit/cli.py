"""The commands. Heavy imports come late, so that `--help` answers at once."""

from __future__ import annotations

import argparse
import io
import os
import sys
from collections.abc import Callable, Iterable
from functools import partial
from pathlib import Path

DONE, BUG, USER = 0, 1, 2
CAMPAIGN = ("FILE", "parameter file of a campaign, such as params/ID.yml")
REPORT = ("FOLDER", "a report, reports/ID")


def main(arguments: list[str] | None = None) -> int:
    """Run one command; 0 done, 2 the input is at fault, 1 a bug."""
    asked = _parser().parse_args(arguments)
    if isinstance(sys.stdout, io.TextIOWrapper):
        sys.stdout.reconfigure(errors="replace")  # where a terminal lacks a letter of a title
    if asked.allow_outside:
        os.environ["SURVEYKIT_ALLOW_OUTSIDE"] = "1"  # kernels and workers inherit it
    _heal(asked.paths or [Path()])
    if asked.command == "check":
        return max(_told(partial(_check, file)) for file in asked.paths)
    works: dict[str, Callable[[], int | None]] = {
        "run": lambda: _run(asked.paths, asked.jobs, asked.cluster),
        "new": lambda: _new(asked.name, asked.logs),
        "verify": lambda: _verify(asked.paths[0], asked.rerun),
        "netcdf": lambda: _netcdf(asked.paths[0]),
        "pack": lambda: _pack(asked.paths[0]),
        "plan": lambda: _plan(asked.paths[0])}
    return _told(works[asked.command])


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="surveykit",
        description="From a day's logger files and a field sheet to a report with uncertainties.")
    commands = parser.add_subparsers(dest="command", required=True, metavar="COMMAND")
    of = {}
    for name, words, named in (
            ("run", "run everything from the raw files and write the report", CAMPAIGN),
            ("check", "read parameters, field sheet and files; list every fault", CAMPAIGN),
            ("new", "write a parameter file and an empty field sheet", None),
            ("verify", "say whether a report still belongs to its inputs and tables", REPORT),
            ("netcdf", "write a report's passes and surfaces as one NetCDF file (extra netcdf)",
             REPORT),
            ("pack", "write one zip from which the report is made again elsewhere", CAMPAIGN),
            ("plan", "plan a survey day and write a field sheet to print", CAMPAIGN)):
        of[name] = commands.add_parser(name, help=words, description=words)
        of[name].set_defaults(paths=[], allow_outside=False)
        if named:
            of[name].add_argument("paths", nargs="+" if name in ("run", "check") else 1,
                                  type=Path, metavar=named[0], help=named[1])
            of[name].add_argument("--allow-outside", action="store_true",
                                  help="let parameter files name files outside the project folder")
    of["run"].add_argument("--jobs", type=_positive, default=1, metavar="N",
                           help="campaigns run at once, each in a process of its own")
    of["run"].add_argument("--cluster", metavar="ADDRESS",
                           help="run them on the workers of this dask scheduler instead")
    of["new"].add_argument("name", metavar="ID",
                           help="name of the campaign: lower-case letters, digits and -")
    of["new"].add_argument("--log", nargs="+", type=Path, default=[], metavar="FILE", dest="logs",
                           help="sample files of its loggers: write a first instruments file from "
                           "them")
    of["verify"].add_argument("--rerun", action="store_true",
                              help="compute the tables again and list every cell that moved")
    return parser


def _positive(text: str) -> int:
    if not (text.isdecimal() and int(text) > 0):
        raise argparse.ArgumentTypeError(f"got {text!r}; write a whole number from 1 on")
    return int(text)


def _told(work: Callable[[], int | None]) -> int:
    """Call `work`; print the user's faults, one line each, and return the exit code."""
    from surveykit.core import InputError, shown_faults
    from surveykit.swap import storage

    try:
        return work() or DONE
    except InputError as error:
        for fault in shown_faults(error.faults):
            print(fault, file=sys.stderr)  # noqa: T201
        return USER
    except OSError as error:
        print(storage(error), file=sys.stderr)  # noqa: T201
        return BUG
    except KeyboardInterrupt:
        print("stopped; what was not finished left the old report as it was",  # noqa: T201
              file=sys.stderr)
        return BUG


def _run(files: list[Path], jobs: int, cluster: str | None) -> int:
    from surveykit.season import run_campaigns, summary

    outcomes = run_campaigns(files, partial(print, flush=True), jobs=jobs, cluster=cluster)
    for one in outcomes:
        if one.code != DONE:
            print("\n".join(one.lines), file=sys.stderr)  # noqa: T201
    if len(outcomes) > 1:
        print("\n".join(["campaigns:", *(summary([one])[0] for one in outcomes)]))  # noqa: T201
    for one in outcomes:
        if one.report is not None:
            print(f"report: {_near(one.report)}")  # noqa: T201
    return max((one.code for one in outcomes), default=DONE)


def _check(path: Path) -> None:
    from surveykit.checking import check

    _show(check(path))


def _new(name: str, logs: list[Path]) -> None:
    from surveykit.starting import start

    _show(start(name, Path.cwd(), logs))


def _verify(folder: Path, rerun: bool) -> None:
    from surveykit.verifying import verify

    _show(verify(folder.resolve(), rerun=rerun, say=partial(print, flush=True)))


def _netcdf(folder: Path) -> None:
    from surveykit.exporting import export

    _show([f"wrote {_near(export(folder.resolve()))}"])


def _pack(path: Path) -> None:
    from surveykit.packing import pack

    _show([f"packed: {_near(pack(path))}"])


def _plan(path: Path) -> None:
    from surveykit.planner import plan

    _show(f"wrote {_near(written)}" for written in plan(path))


def _show(lines: Iterable[str]) -> None:
    for line in lines:
        print(line)  # noqa: T201


def _heal(paths: list[Path]) -> None:
    """Put right what stopped runs left in the projects that files or folders belong to."""
    from surveykit.core import InputError
    from surveykit.intake.params import find_root
    from surveykit.locking import heal_all

    for path in paths:
        try:
            heal_all(find_root(path.absolute().parent))
        except (InputError, OSError):
            continue  # the command itself says so


def _near(path: Path) -> Path:
    try:
        return path.resolve().relative_to(Path.cwd().resolve())
    except ValueError:
        return path


if __name__ == "__main__":
    sys.exit(main())
