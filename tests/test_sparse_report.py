"""The report of a campaign in which everything is missing that can be: it reads as well."""

from __future__ import annotations

import re
import shutil

import html5lib
import pytest
from bs4 import BeautifulSoup
from projects import ROOT, surveykit
from small_survey import ALBEDO, DAY, STAND_OFF, lines, row, small

NAME = f"yard-{DAY}"


@pytest.fixture(scope="module")
def page(tmp_path_factory):
    """One pass a quantity, no weather, no control, no clock, no emissivity, nothing stated."""
    root = tmp_path_factory.mktemp("sparse") / "project"
    shutil.copytree(ROOT / "notebooks", root / "notebooks")
    loggers = {name: {"files": f"{name}_*.csv"} for name in ("pair", "thermal")}
    small(root, [row(**ALBEDO), row(**STAND_OFF)],
          {"pair": lines("pair"), "thermal": lines("thermal")}, loggers=loggers, watch={},
          surfaces={"court": {"label": "Court"}}, conditions={}, settings={})
    done = surveykit(root, "run", f"params/{NAME}.yml")
    assert done.returncode == 0, done.stderr
    assert "Traceback" not in done.stderr
    return (root / "reports" / NAME / "report.html").read_text(encoding="utf-8")


def test_it_is_valid_and_holds_no_empty_table_and_no_nan(page):
    html5lib.HTMLParser(strict=True).parse(page)
    soup = BeautifulSoup(page, "html5lib")
    for table in soup.find_all("table"):
        assert table.caption.get_text(strip=True)
        assert table.find_all("td"), table.caption.get_text()
    for image in soup.find_all("img"):
        assert re.search(r"\d", image["alt"])
    soup.style.extract()
    text = soup.get_text(" ")
    assert not re.search(r"\b(nan|NaN|NaT|None|inf|Traceback)\b", text)
    for section in soup.find_all("h3"):  # a heading is always followed by something to read
        after = section.find_next_sibling()
        assert after is not None, section.get_text()
        assert after.name not in ("h2", "h3"), section.get_text()


def test_each_absence_is_explained(page):
    text = " ".join(BeautifulSoup(page, "html5lib").get_text(" ").split())
    for said in ("Not stated.", "Air temperature was not logged.",
                 "No two surfaces could be compared.",
                 "No earlier campaign was named, so no change was looked for.",
                 "Value without an interval: albedo", "a single pass cannot show how much",
                 "temperature (stand-off) of Court was not evaluated",
                 "nobody compared this clock", "ASTM E1918: ",
                 "no conformity is claimed", "more than one pass of each surface",
                 "no dark reading (every pass)"):
        assert said in text, said
