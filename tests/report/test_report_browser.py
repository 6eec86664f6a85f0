"""The sample pages in headless Chromium: no request, no console message, no violation by axe-core
(WCAG A, AA and best practice), no sideways scrolling, light and dark, desk and phone."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from browsing import chromium, look, needs_browser, print_it
from playwright.sync_api import Browser

pytestmark = needs_browser


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    with chromium() as found:
        yield found


def written(folder: Path, html: str) -> Path:
    path = folder / "report.html"
    path.write_text(html, encoding="utf-8")
    return path


@pytest.mark.parametrize(("width", "scheme"), [(1280, "light"), (1280, "dark"), (390, "light"),
                                               (390, "dark")])
def test_the_page_is_quiet_accessible_and_no_wider_than_the_screen(
        browser: Browser, tmp_path: Path, page: str, width: int, scheme: str) -> None:
    look(browser, written(tmp_path, page), width, scheme)


@pytest.mark.parametrize(("width", "scheme"), [(1280, "light"), (390, "dark")])
def test_a_hostile_page_is_as_good(browser: Browser, tmp_path: Path, hostile_page: str,
                                   width: int, scheme: str) -> None:
    look(browser, written(tmp_path, hostile_page), width, scheme)


@pytest.mark.parametrize(("width", "scheme"), [(1280, "light"), (390, "dark")])
def test_a_sparse_page_is_as_good(browser: Browser, tmp_path: Path, sparse_page: str,
                                  width: int, scheme: str) -> None:
    look(browser, written(tmp_path, sparse_page), width, scheme)


def test_the_page_prints_without_a_cut_figure(browser: Browser, tmp_path: Path,
                                              page: str) -> None:
    count, figures = print_it(browser, written(tmp_path, page), "A4")
    assert figures == 16
    assert 5 <= count <= 30


def test_decimal_marks_of_a_column_stand_in_line(browser: Browser, tmp_path: Path,
                                                 page: str) -> None:
    tab = browser.new_page()
    tab.goto(written(tmp_path, page).as_uri())
    edges = tab.evaluate(
        "[...document.querySelector('table').rows].slice(1).map(r => r.cells[2])"
        ".filter(c => c.querySelector('.tail')).map(c => "
        "c.querySelector('.tail').getBoundingClientRect().left)")
    assert len(edges) == 4  # 57.6, 49.0, 33.1 with U 10.4, and 36.5 without U
    assert max(edges) - min(edges) < 1.0
    tab.close()
