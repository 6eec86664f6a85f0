"""The commands. Heavy imports come late, so that `--help` answers at once."""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Callable
from functools import partial
from pathlib import Path

DONE, BUG, USER = 0, 1, 2


def main(arguments: list[str] | None = None) -> int:
    """Run one command; 0 done, 2 the input is at fault, 1 a bug."""
    parser = argparse.ArgumentParser(
        prog="surveykit",
        description="From a day's logger files and a field sheet to a report with uncertainties.")
    commands = parser.add_subparsers(dest="command", required=True, metavar="COMMAND")
    for name, words in (("run", "run everything from the raw files and write the report"),
                        ("check", "read parameters, field sheet and files; list every fault")):
        one = commands.add_parser(name, help=words, description=words)
        one.add_argument("files", nargs="+", type=Path, metavar="FILE",
                         help="parameter file of a campaign, such as params/ID.yml")
        one.add_argument("--allow-outside", action="store_true",
                         help="let parameter files name files outside the project folder")
        if name == "run":
            one.add_argument("--jobs", type=_positive, default=1, metavar="N",
                             help="campaigns run at once, each in a process of its own")
            one.add_argument("--cluster", metavar="ADDRESS",
                             help="run them on the workers of this dask scheduler instead")
    new = commands.add_parser("new", help="write a parameter file and an empty field sheet",
                              description="write a parameter file and an empty field sheet")
    new.add_argument("name", metavar="ID",
                     help="name of the campaign: lower-case letters, digits and -")
    new.add_argument("--log", nargs="+", type=Path, default=[], metavar="FILE", dest="logs",
                     help="sample files of its loggers: write a first instruments file from them")
    verify = commands.add_parser(
        "verify", help="say whether a report still belongs to its inputs and tables",
        description="say whether a report still belongs to its inputs and tables")
    verify.add_argument("folder", type=Path, metavar="FOLDER", help="a report, reports/ID")
    verify.add_argument("--rerun", action="store_true",
                        help="compute the tables again and list every cell that moved")
    netcdf = commands.add_parser(
        "netcdf", help="write a report's passes and surfaces as one NetCDF file",
        description="write a report's passes and surfaces as one NetCDF file (extra netcdf)")
    netcdf.add_argument("folder", type=Path, metavar="FOLDER", help="a report, reports/ID")
    for name, words in (("pack", "write one zip from which the report is made again elsewhere"),
                        ("plan", "plan a survey day and write a field sheet to print")):
        one = commands.add_parser(name, help=words, description=words)
        one.add_argument("file", type=Path, metavar="FILE",
                         help="parameter file of a campaign, such as params/ID.yml")
    asked = parser.parse_args(arguments)
    if asked.command == "new":
        return _told(lambda: _new(asked.name, asked.logs))
    if asked.command == "verify":
        return _told(lambda: _verify(asked.folder, asked.rerun))
    if asked.command == "netcdf":
        return _told(lambda: _netcdf(asked.folder))
    if asked.command in ("pack", "plan"):
        return _told(partial(_pack if asked.command == "pack" else _plan, asked.file))
    if asked.allow_outside:
        os.environ["SURVEYKIT_ALLOW_OUTSIDE"] = "1"  # kernels and workers inherit it
    if asked.command == "run":
        return _told(lambda: _run(asked.files, asked.jobs, asked.cluster))
    return max(_told(partial(_check, file)) for file in asked.files)


def _positive(text: str) -> int:
    number = int(text)
    if number < 1:
        raise ValueError(text)
    return number


def _told(work: Callable[[], int | None]) -> int:
    """Call `work`; print the user's faults, one line each, and return the exit code."""
    from surveykit.core import InputError, shown_faults

    try:
        return work() or DONE
    except InputError as error:
        for fault in shown_faults(error.faults):
            print(fault, file=sys.stderr)  # noqa: T201
        return USER
    except OSError as error:
        print(error, file=sys.stderr)  # noqa: T201
        return BUG
    except KeyboardInterrupt:
        print("stopped; no report was touched", file=sys.stderr)  # noqa: T201
        return BUG


def _run(files: list[Path], jobs: int, cluster: str | None) -> int:
    from surveykit.season import run_campaigns, summary

    _heal(files[0])
    outcomes = run_campaigns(files, lambda line: print(line, flush=True),  # noqa: T201
                             jobs=jobs, cluster=cluster)
    for one in outcomes:
        if one.code != DONE:
            print("\n".join(one.lines), file=sys.stderr)  # noqa: T201
    if len(outcomes) > 1:
        print("\n".join(["campaigns:", *summary(outcomes)]))  # noqa: T201
    for one in outcomes:
        if one.report is not None:
            print(f"report: {_near(one.report)}")  # noqa: T201
    return max((one.code for one in outcomes), default=DONE)


def _check(path: Path) -> None:
    from surveykit.checking import check

    for line in check(path):
        print(line)  # noqa: T201


def _new(name: str, logs: list[Path]) -> None:
    from surveykit.starting import start

    for line in start(name, Path.cwd(), logs):
        print(line)  # noqa: T201


def _verify(folder: Path, rerun: bool) -> None:
    from surveykit.verifying import verify

    _heal(folder)
    say = partial(print, flush=True)
    for line in verify(folder.resolve(), rerun=rerun, say=say):
        say(line)


def _netcdf(folder: Path) -> None:
    from surveykit.exporting import export

    print(f"wrote {_near(export(folder.resolve()))}")  # noqa: T201


def _pack(path: Path) -> None:
    from surveykit.packing import pack

    _heal(path)
    print(f"packed: {_near(pack(path))}")  # noqa: T201


def _plan(path: Path) -> None:
    from surveykit.planner import plan

    for written in plan(path):
        print(f"wrote {_near(written)}")  # noqa: T201


def _heal(path: Path) -> None:
    """Put right what a stopped run left in the project that a file or folder belongs to."""
    from surveykit.core import InputError
    from surveykit.intake.params import find_root
    from surveykit.locking import heal_all

    try:
        heal_all(find_root(path.absolute().parent))
    except InputError:
        return  # no project: the command itself says so


def _near(path: Path) -> Path:
    try:
        return path.resolve().relative_to(Path.cwd().resolve())
    except ValueError:
        return path


if __name__ == "__main__":
    sys.exit(main())
