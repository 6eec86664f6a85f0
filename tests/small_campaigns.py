"""Small invented campaigns in a project folder of their own, and ways to run and watch them."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
from pathlib import Path

import small_survey

from surveykit import season
from surveykit.verifying import verify

ROOT = Path(__file__).parent.parent
LIGHT = ("01_ingest", "02_quality")  # kernels and all, without the costly figures
DRIVER = """\
import sys
from pathlib import Path
from surveykit import season

if __name__ == "__main__":
    jobs, notebooks, *files = sys.argv[1:]
    outcomes = season.run_campaigns([Path(f) for f in files], lambda line: print(line, flush=True),
                                    jobs=int(jobs), notebooks=tuple(notebooks.split(",")[:-1]))
    print("\\n".join(season.summary(outcomes)))
    sys.exit(max((one.code for one in outcomes), default=0))
"""


def project(folder: Path, names: list[str], **sections: object) -> Path:
    """Write a project of small campaigns with one albedo and one NDVI pass on two surfaces."""
    folder.mkdir(parents=True, exist_ok=True)
    shutil.copytree(ROOT / "notebooks", folder / "notebooks", dirs_exist_ok=True,
                    ignore=shutil.ignore_patterns(".ipynb_checkpoints"))
    for name in names:
        write(folder, name, **sections)
    (folder / "driver.py").write_text(DRIVER, encoding="utf-8")
    return folder


def write(folder: Path, name: str, *, date: str = small_survey.DAY, **sections: object) -> Path:
    """Write one campaign, on the day `date`; return its parameter file."""
    data = folder / "data"
    sheet = [small_survey.row(**small_survey.ALBEDO),
             small_survey.row(surface="lawn", patch="L1", start="12:03:00", stop="12:05:00",
                              **small_survey.ALBEDO)]
    small_survey.small(folder, sheet, {"pair": small_survey.lines("pair", n=330)}, campaign=name,
                       **sections)
    mine = folder / "data-of" / name
    mine.parent.mkdir(exist_ok=True)
    shutil.rmtree(mine, ignore_errors=True)
    data.rename(mine)
    path = folder / "params" / f"{name}.yml"
    text = path.read_text(encoding="utf-8").replace("data_folder: data\n",
                                                    f"data_folder: data-of/{name}\n")
    path.write_text(text.replace(small_survey.DAY, date), encoding="utf-8")
    for file in mine.iterdir():
        content = file.read_text(encoding="utf-8")
        file.write_text(content.replace(small_survey.DAY, date), encoding="utf-8")
    return path


def command(names: list[str], *, notebooks: tuple[str, ...] = (), jobs: int = 1) -> list[str]:
    return [sys.executable, "driver.py", str(jobs), ",".join([*notebooks, ""]),
            *(f"params/{name}.yml" for name in names)]


def run(folder: Path, names: list[str], *, notebooks: tuple[str, ...] = (), jobs: int = 1,
        **more: object) -> subprocess.CompletedProcess[str]:
    return subprocess.run(command(names, notebooks=notebooks, jobs=jobs), cwd=folder, check=False,
                          capture_output=True, text=True, **more)


def run_here(folder: Path, names: list[str]) -> tuple[int, str]:
    """Run stages and page in this process; return the exit code and all that was said."""
    said: list[str] = []
    outcomes = season.run_campaigns([folder / "params" / f"{name}.yml" for name in names],
                                    said.append, notebooks=())
    return max(one.code for one in outcomes), "\n".join([*said, *season.summary(outcomes)])


def start(folder: Path, names: list[str], **more: object) -> subprocess.Popen[str]:
    """Start a run in a process group of its own."""
    return subprocess.Popen(command(names, **more), cwd=folder, text=True, stdout=subprocess.PIPE,
                            stderr=subprocess.STDOUT, start_new_session=True)


def processes(folder: Path) -> list[int]:
    """Return the processes that work in a folder: the run, its kernels, its workers."""
    found = []
    for entry in Path("/proc").iterdir():
        if entry.name.isdigit():
            try:
                here = os.readlink(entry / "cwd")
                state = (entry / "stat").read_text().rpartition(")")[2].split()[0]
            except OSError:
                continue
            if here == str(folder) and state != "Z":
                found.append(int(entry.name))
    return found


def whole(folder: Path, name: str) -> None:
    """Fail unless the report stands whole: every hash in run.json is that of its file."""
    report = folder / "reports" / name
    assert verify(report)[0].startswith(f"reports/{name}: ")
    notebooks = {p.name for p in (report / "notebooks").iterdir()}
    durations = json.loads((report / "run.json").read_text(encoding="utf-8"))["durations_s"]
    assert notebooks == {f"{one}.ipynb" for one in durations}


def left_behind(folder: Path) -> list[str]:
    """Return the names in reports/ that no finished run leaves."""
    reports = folder / "reports"
    return sorted(p.name for p in reports.iterdir() if p.name.startswith(".")) \
        if reports.is_dir() else []
