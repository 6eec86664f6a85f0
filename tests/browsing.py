"""Pages in headless Chromium: what the tests of the report and of the plan ask of each."""

from __future__ import annotations

import os
import re
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page, sync_playwright

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")
needs_browser = pytest.mark.skipif(
    CHROMIUM is None and not os.environ.get("SURVEYKIT_REQUIRE_BROWSER"),
    reason="no Chromium on this machine; set SURVEYKIT_REQUIRE_BROWSER to fail instead")
MM = 96 / 25.4
SIDE, TOP_AND_BOTTOM = 32, 38  # the style sheet's page margins together [mm]
PAPER = {"A4": (210, 297), "Letter": (215.9, 279.4)}  # ISO 216; ANSI/ASME Y14.1 [mm]
WIDER = """[...document.querySelectorAll('main *, header *')].filter(e => !e.closest('.table') &&
e.getBoundingClientRect().right > innerWidth + 1).map(e => e.outerHTML.slice(0, 80))"""
ANCHORS = """[...document.querySelectorAll('a')].map(a => a.getAttribute('href')).filter(h =>
!(h && h.startsWith('#') && document.getElementById(h.slice(1))))"""
FIGURES = """[...document.querySelectorAll('figure')].map(f => {
const box = f.getBoundingClientRect(), image = f.querySelector('img').getBoundingClientRect();
return {height: box.height, width: image.width, inside: getComputedStyle(f).breakInside,
        loaded: f.querySelector('img').naturalWidth > 0}})"""


@contextmanager
def chromium() -> Iterator[Browser]:
    """Start the system's Chromium."""
    assert CHROMIUM, "SURVEYKIT_REQUIRE_BROWSER is set and there is no Chromium"
    with sync_playwright() as player:
        found = player.chromium.launch(executable_path=CHROMIUM, args=[
            "--no-sandbox", "--disable-gpu", "--disable-background-networking"])
        yield found
        found.close()


def look(browser: Browser, path: Path, width: int, scheme: str, *, axe: bool = True) -> None:
    """Assert: offline, no request, no message, no violation by axe-core, nothing too wide."""
    context = browser.new_context(viewport={"width": width, "height": 900}, color_scheme=scheme,
                                  offline=True)
    tab, requests, messages = context.new_page(), [], []
    tab.on("request", lambda r: requests.append(r.url))
    tab.on("console", lambda m: messages.append(m.text))
    tab.on("pageerror", lambda e: messages.append(str(e)))
    tab.goto(path.as_uri())
    assert [url for url in requests if not url.startswith("data:")] == [path.as_uri()]
    assert messages == []
    assert tab.evaluate("document.documentElement.scrollWidth") <= width
    assert tab.evaluate(WIDER) == []
    assert tab.evaluate(ANCHORS) == []
    assert tab.evaluate("document.querySelectorAll('[tabindex]:not([tabindex=\"0\"])').length") == 0
    if axe:
        found = Axe().run(tab, options={"resultTypes": ["violations"]}).response["violations"]
        assert [(v["id"], v["nodes"][0]["html"][:120]) for v in found] == []
    context.close()


def pages(tab: Page, paper: str) -> int:
    """Print to PDF; return the number of pages (page objects of the file's own syntax)."""
    return len(re.findall(rb"/Type\s*/Page(?![A-Za-z])", tab.pdf(format=paper)))


def print_it(browser: Browser, path: Path, paper: str) -> tuple[int, int]:
    """Print; assert that every figure fits a page whole. Return pages and figures.

    A box that may not break inside and is no taller than a page is never cut.
    """
    wide, tall = PAPER[paper]
    context = browser.new_context(viewport={"width": int((wide - SIDE) * MM), "height": 900})
    tab = context.new_page()
    tab.goto(path.as_uri())
    tab.emulate_media(media="print")
    figures = tab.evaluate(FIGURES)
    for figure in figures:
        assert figure["loaded"]
        assert figure["inside"] == "avoid"
        assert figure["height"] <= (tall - TOP_AND_BOTTOM) * MM
        assert figure["width"] <= (wide - SIDE) * MM + 1
    height = tab.evaluate("document.documentElement.scrollHeight")
    count = pages(tab, paper)
    assert count >= height / (tall * MM)  # nothing is left out
    context.close()
    return count, len(figures)
