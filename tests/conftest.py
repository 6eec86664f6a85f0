"""What several tests share: a project folder of their own, and one run of the whole demo."""

import sys
from pathlib import Path

import hypothesis
import pytest

sys.path.insert(0, str(Path(__file__).parent))

from projects import DEMO, copy_project, surveykit

# Machines that others share are slow at times, and a failure must come again: no deadline, the same
# examples in every run.
hypothesis.settings.register_profile("fixed", deadline=None, derandomize=True, database=None,
                                     print_blob=True)
hypothesis.settings.load_profile("fixed")


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
