"""What several tests share: a project folder of their own, and one run of the whole demo."""

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))

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


@pytest.fixture
def project(tmp_path):
    return copy_project(tmp_path / "project")


@pytest.fixture(scope="session")
def demo(tmp_path_factory):
    """A project in which the last demo date was run, and the earlier ones with it."""
    folder = copy_project(tmp_path_factory.mktemp("demo") / "project")
    done = surveykit(folder, "run", f"params/{DEMO[2]}.yml")
    assert done.returncode == 0, done.stderr
    return folder, done
