"""A project folder of a test's own, and the command line as a user calls it."""

import os
import shutil
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).parent.parent
DATES = ("2025-06-11", "2025-07-16", "2025-09-17")
DEMO = tuple(f"pellowick-yard-{date}" for date in DATES)


def copy_project(folder: Path) -> Path:
    """Copy what a project folder needs (notebooks, params, demo, valley day) into `folder`."""
    shutil.copytree(ROOT / "notebooks", folder / "notebooks",
                    ignore=shutil.ignore_patterns(".ipynb_checkpoints"))
    (folder / "params").mkdir(parents=True)
    for name in ("instruments", *DEMO):
        shutil.copy(ROOT / "params" / f"{name}.yml", folder / "params")
    for name in DEMO:
        shutil.copytree(ROOT / "demo_data" / name, folder / "demo_data" / name)
    shutil.copytree(ROOT / "tests/data/valley-winter-day", folder / "tests/data/valley-winter-day")
    return folder


def surveykit(project: Path, *arguments: str) -> subprocess.CompletedProcess[str]:
    """Run the command line as a user would, in a project folder."""
    return subprocess.run([sys.executable, "-m", "surveykit.cli", *arguments], cwd=project,
                          capture_output=True, text=True, check=False,
                          env={**os.environ, "PYTHONWARNINGS": "default"})
