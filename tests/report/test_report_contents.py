"""The page of all reports: by date, numbers as in the reports, whatever is missing."""

from __future__ import annotations

import sample
from bs4 import BeautifulSoup

from surveykit.report.contents import Entry, contents_page

FACTS = {**sample.facts(hostile=True), "site": "Mill Yard"}
T, EMPTY = sample.tables(), sample.empty_tables()


def entry(date: str, tables: dict) -> Entry:
    return Entry(f"yard-{date}/report.html", {**FACTS, "date": date, "title": f"Day of {date} <b>"},
                 tables["surfaces"], tables["changes"])


def test_campaigns_stand_by_date_with_values_as_in_their_reports() -> None:
    page = BeautifulSoup(contents_page([entry("2025-07-24", T), entry("2024-07-24", EMPTY)]),
                         "html5lib")
    campaigns, values = page.find_all("table")
    assert [row.th.get_text() for row in campaigns.tbody.find_all("tr")] == [
        "Day of 2024-07-24 <b>", "Day of 2025-07-24 <b>"]
    assert [a["href"] for a in campaigns.find_all("a")] == [
        "yard-2024-07-24/report.html", "yard-2025-07-24/report.html"]
    assert not page.find_all(["b", "script"])
    cells = [cell.get_text() for cell in campaigns.find_all("tr")[2].find_all("td")]
    # by hand from the sample: two of 16 have no value
    assert cells[2] == str(sum(row[8] for row in sample.VALUES))
    assert cells[3] == "14 of 16 values"
    verdicts = [verdict for verdict in T["changes"]["verdict"] if verdict]
    shown = [verdict for verdict in verdicts if verdict.startswith(("higher", "lower"))]
    assert cells[4] == f"{len(shown)} of {len(verdicts)} judged"
    assert "58.3\u00a0±\u00a01.2" in values.get_text()
    assert "not evaluated" not in values.get_text()
    assert all(caption.get_text().endswith(".") for caption in page.find_all("caption"))


def test_without_values_or_reports_a_sentence_stands() -> None:
    assert "No surface has a value yet." in contents_page([entry("2024-07-24", EMPTY)])
    assert "There is no report yet." in contents_page([])
