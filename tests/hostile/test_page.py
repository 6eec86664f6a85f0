"""One real run with a payload in every text that takes one: code, page, tables, browser.

Its own parameter file, kit, field sheet, logger file and columns carry the payloads, so does plain
papermill's injection in test_fields.
"""

import csv
import os
import shutil
from pathlib import Path

import pytest
import small_survey
import yaml
from bs4 import BeautifulSoup
from payloads import PAYLOADS, full_campaign, put, read_document, text_places
from small_campaigns import ROOT, left_behind

from surveykit import season
from surveykit.core import TABLES, InputError
from surveykit.report.datapackage import FORMULA_STARTS

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")
SHOWN = (0, 1, 2)  # payloads put into the run: markup, formula, templates
NEEDED_AS_IT_IS = {"campaign", "date", "data_folder", "field_sheet", "time", "layout", "format"}


def hostile_document(folder: Path) -> tuple[dict, int]:
    """Return the campaign with the first payload in every text that takes it alone."""
    document = full_campaign()
    document["instruments"] = {"pair": document["instruments"]["pair"]}
    taken = 0
    for number, place in enumerate(text_places(document)):
        if {*map(str, place)} & NEEDED_AS_IT_IS or place[0] in ("loggers", "comparison"):
            continue
        for turn in range(len(SHOWN)):
            changed = put(document, place, PAYLOADS[SHOWN[(number + turn) % len(SHOWN)]])
            try:
                read_document(changed, folder / "params" / "yard.yml")
            except InputError:
                continue
            document, taken = changed, taken + 1
            break
    return document, taken


@pytest.fixture(scope="module")
def hostile(tmp_path_factory):
    folder = tmp_path_factory.mktemp("hostile") / "project"
    shutil.copytree(ROOT / "notebooks", folder / "notebooks")
    sheet = [small_survey.row(**small_survey.ALBEDO, note=PAYLOADS[0]),
             small_survey.row(**small_survey.ALBEDO, patch="C2", start="12:03:00",
                              stop="12:05:00", note="=1+1")]
    small_survey.small(folder, [{k: v for k, v in row.items() if k != "note"} for row in sheet],
                       {"pair": small_survey.lines("pair", n=330)}, campaign="yard")
    data = folder / "data"
    with open(data / "sheet.csv", "w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, [*small_survey.SHEET, "<script>window.canary=1</script>"])
        writer.writeheader()
        writer.writerows(sheet)
    odd = data / "pair_<img src=x onerror=window.canary=1>.csv"
    (data / "pair_0.csv").rename(odd)
    head = "<b onclick=window.canary=1>{{7*7}}"
    document, taken = hostile_document(folder)
    columns = document["instruments"]["pair"]["columns"]
    columns[head] = columns.pop("sky")
    odd.write_text(odd.read_text(encoding="utf-8").replace("sky", head, 1), encoding="utf-8")
    path = folder / "params" / "yard.yml"
    path.write_text(yaml.safe_dump(document, sort_keys=False), encoding="utf-8")
    outcomes = season.run_campaigns([path], lambda line: None)
    assert outcomes[0].code == 0, outcomes[0].lines
    assert taken > 4
    return folder


def test_no_code_ran_and_nothing_else_was_written(hostile):
    assert [p for p in hostile.rglob("*") if p.name == "CANARY"] == []
    assert not Path("CANARY").exists()
    assert left_behind(hostile) == []
    assert sorted(p.name for p in hostile.iterdir()) == [
        ".surveykit", "data", "notebooks", "params", "reports"]


@pytest.mark.parametrize("name", ["yard/report.html", "index.html"])
def test_every_payload_stands_on_the_page_as_text(hostile, name):
    soup = BeautifulSoup((hostile / "reports" / name).read_text(encoding="utf-8"), "html5lib")
    assert soup.find(["script", "iframe", "object", "embed", "form", "link", "svg", "b"]) is None
    for tag in soup.find_all(True):
        assert not [attribute for attribute in tag.attrs if attribute.startswith("on")], tag
        if tag.name == "img":
            assert tag["src"].startswith("data:image/png;base64,")
        if tag.get("href"):
            assert tag["href"].startswith("#") or tag["href"] == "yard/report.html"
    text = soup.get_text()
    assert "<script>window.canary=1</script>" in text or "=HYPERLINK(" in text
    if name.startswith("yard"):
        for piece in ("<script>window.canary=1</script>", "=HYPERLINK(", "{{7*7}}",
                      "<img src=x onerror=window.canary=1>"):
            assert piece in text, piece
    assert "49{%" not in text


def test_no_cell_of_a_table_is_a_formula(hostile):
    seen = 0
    for path in (hostile / "reports" / "yard" / "tables").glob("*.csv"):
        texts = [name for name, kind in TABLES[path.stem].items() if kind == "text"]
        with open(path, encoding="utf-8", newline="") as file:
            for row in csv.DictReader(file):
                for name in texts:
                    assert not row[name].startswith(FORMULA_STARTS), (path.name, row[name])
                    seen += bool(row[name])
    assert seen > 20


@pytest.mark.skipif(CHROMIUM is None and not os.environ.get("SURVEYKIT_REQUIRE_BROWSER"),
                    reason="no Chromium on this machine")
def test_the_canary_lives_in_a_browser(hostile):
    from playwright.sync_api import sync_playwright

    with sync_playwright() as player:
        browser = player.chromium.launch(executable_path=CHROMIUM, args=[
            "--no-sandbox", "--disable-gpu", "--disable-background-networking"])
        for name in ("yard/report.html", "index.html"):
            address = (hostile / "reports" / name).as_uri()
            tab, asked, said = browser.new_page(), [], []
            tab.on("request", lambda r, asked=asked: asked.append(r.url))
            tab.on("dialog", lambda d, said=said: said.append(d.message))
            tab.on("pageerror", lambda e, said=said: said.append(str(e)))
            tab.goto(address)
            tab.evaluate("document.querySelectorAll('main *:not(a, a *)').forEach(e => e.click())")
            assert tab.evaluate("window.canary") is None
            assert said == []
            assert {url for url in asked if not url.startswith("data:")} <= {
                address, (hostile / "reports/yard/report.html").as_uri()}
        browser.close()
