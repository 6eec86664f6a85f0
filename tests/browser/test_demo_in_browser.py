"""The demo's report, and the plan of its last date, in headless Chromium and on paper."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from browsing import chromium, look, needs_browser, print_it
from playwright.sync_api import Browser
from projects import DEMO, surveykit

pytestmark = needs_browser


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    with chromium() as found:
        yield found


@pytest.fixture(scope="module")
def report(demo) -> Path:
    return demo[0] / "reports" / DEMO[2] / "report.html"


@pytest.fixture(scope="module")
def plan(demo) -> Path:
    done = surveykit(demo[0], "plan", f"params/{DEMO[2]}.yml")
    assert done.returncode == 0, done.stderr
    return demo[0] / "reports" / f"{DEMO[2]}.plan"


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("width", [1280, 390])
def test_the_report_is_quiet_accessible_and_no_wider_than_the_screen(browser, report, width,
                                                                     scheme):
    look(browser, report, width, scheme)


@pytest.mark.parametrize("name", ["plan.html", "field_sheet.html"])
def test_the_plan_is_as_quiet_and_accessible(browser, plan, name):
    look(browser, plan / name, 1280, "light")
    look(browser, plan / name, 390, "dark")


@pytest.mark.parametrize("paper", ["A4", "Letter"])
def test_the_report_prints_without_a_cut_figure(browser, report, paper):
    count, figures = print_it(browser, report, paper)
    assert figures > 15
    assert figures / 3 < count < 60


def test_the_report_is_small_enough_to_send(report):
    assert report.stat().st_size < 3e6
