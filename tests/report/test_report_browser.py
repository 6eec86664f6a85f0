"""The page in headless Chromium: no request, no console message, no accessibility violation by
axe-core (WCAG A, AA and best practice), no sideways scrolling, light and dark, desk and phone."""

from __future__ import annotations

import os
import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, sync_playwright

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")
pytestmark = pytest.mark.skipif(CHROMIUM is None and not os.environ.get("CI"),
                                reason="no Chromium on this machine")


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    with sync_playwright() as player:
        found = player.chromium.launch(executable_path=CHROMIUM, args=[
            "--no-sandbox", "--disable-gpu", "--disable-background-networking"])
        yield found
        found.close()


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("width", [1280, 390])
@pytest.mark.parametrize("which", ["page", "hostile_page"])
def test_quiet_accessible_and_no_wider_than_the_screen(
        browser: Browser, tmp_path: Path, request: pytest.FixtureRequest, which: str, width: int,
        scheme: str) -> None:
    path = tmp_path / "report.html"
    path.write_text(request.getfixturevalue(which), encoding="utf-8")
    context = browser.new_context(viewport={"width": width, "height": 900}, color_scheme=scheme)
    tab, requests, messages = context.new_page(), [], []
    tab.on("request", lambda r: requests.append(r.url))
    tab.on("console", lambda m: messages.append(m.text))
    tab.on("pageerror", lambda e: messages.append(str(e)))
    tab.goto(path.as_uri())
    assert [url for url in requests if not url.startswith("data:")] == [path.as_uri()]
    assert messages == []
    assert tab.evaluate("document.documentElement.scrollWidth") <= width
    over = tab.evaluate(
        "[...document.querySelectorAll('main *')].filter(e => !e.closest('.table') && "
        "e.getBoundingClientRect().right > innerWidth + 1).map(e => e.outerHTML.slice(0, 80))")
    assert over == []
    found = Axe().run(tab).response["violations"]
    assert [(v["id"], v["nodes"][0]["html"][:120]) for v in found] == []
    context.close()


def test_decimal_marks_of_a_column_stand_in_line(browser: Browser, tmp_path: Path,
                                                 page: str) -> None:
    path = tmp_path / "report.html"
    path.write_text(page, encoding="utf-8")
    tab = browser.new_page()
    tab.goto(path.as_uri())
    edges = tab.evaluate(
        "[...document.querySelector('table').rows].slice(1).map(r => r.cells[2])"
        ".filter(c => c.querySelector('.tail')).map(c => "
        "c.querySelector('.tail').getBoundingClientRect().left)")
    assert len(edges) == 4  # 57.6, 49.0, 33.1 with U 10.4, and 36.5 without U
    assert max(edges) - min(edges) < 1.0
    tab.close()
