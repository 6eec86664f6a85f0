"""Tables: strict HTML, scope and caption, escaping, rounding; a sentence where rows are absent."""

from __future__ import annotations

from collections.abc import Callable

import html5lib
import pandas as pd
import pytest
import sample
from bs4 import BeautifulSoup

from surveykit.report import tables as t
from surveykit.report.markup import Html
from surveykit.report.wording import NO_BREAK

BUILDERS: dict[str, Callable[[dict[str, pd.DataFrame], dict], Html]] = {
    "overview": lambda d, f: t.surface_overview(d["surfaces"], f["surfaces"]),
    "surfaces": lambda d, f: t.surface_table(d["surfaces"], f["surfaces"]),
    "passes": lambda d, f: t.pass_table(d["passes"], f["surfaces"], "Europe/Lisbon"),
    "differences": lambda d, f: t.difference_table(d["differences"], f["surfaces"]),
    "changes": lambda d, f: t.change_table(d["changes"], f["labels"]),
    "trends": lambda d, f: t.trend_table(d["trends"], f["labels"]),
    "derived": lambda d, f: t.derived_table(d["derived"].head(1), f["labels"]),
    "heights": lambda d, f: t.geometry_table(d["geometry"], f["labels"]),
    "checks": lambda d, f: t.check_table(d["checks"], f["surfaces"]),
    "ledger": lambda d, f: t.ledger_table(d["ledger"]),
    "clocks": lambda d, f: t.clock_table(d["clocks"]),
    "any frame": lambda d, f: t.frame_table(d["dwells"], "Dwells"),
}


def soup(html: Html) -> BeautifulSoup:
    document = f"<!DOCTYPE html><html><head><title>t</title></head><body>{html.html}</body></html>"
    html5lib.HTMLParser(strict=True).parse(document)
    return BeautifulSoup(document, "html5lib")


def cells(html: Html) -> list[list[str]]:
    return [[cell.get_text().replace(NO_BREAK, " ") for cell in row.find_all(["th", "td"])]
            for row in soup(html).find_all("tr")]


@pytest.mark.parametrize("name", BUILDERS)
def test_a_table_is_valid_scoped_and_captioned(name: str) -> None:
    page = soup(BUILDERS[name](sample.tables(), sample.facts()))
    assert len(page.find_all("table")) == 1
    assert page.caption.get_text(strip=True)
    assert all(th.get("scope") in {"col", "row", "rowgroup"} for th in page.find_all("th"))
    assert page.find("div", class_="table")["tabindex"] == "0"
    assert not page.find_all(id=True)
    width = len(page.thead.find_all("th"))
    for row in page.tbody.find_all("tr"):
        assert sum(int(c.get("colspan", 1)) for c in row.find_all(["th", "td"])) == width
    assert "nan" not in page.get_text().lower().split()


@pytest.mark.parametrize("name", BUILDERS)
def test_a_table_without_rows_is_a_sentence(name: str) -> None:
    page = soup(BUILDERS[name](sample.empty_tables(), sample.facts()))
    assert page.find("table") is None
    assert page.p.get_text().endswith(".")
    assert len(page.p.get_text().split()) >= 2


@pytest.mark.parametrize("name", ["overview", "passes", "checks", "changes", "differences"])
def test_markup_in_labels_and_notes_comes_out_as_text(name: str) -> None:
    html = BUILDERS[name](sample.tables(hostile=True), sample.facts(hostile=True))
    page = soup(html)
    assert not page.find_all(["script", "b", "i", "a"])
    if name != "checks":
        assert "<b>Lawn</b> {{ 7*7 }} & $x_1$ \"q\"" in page.get_text()
    else:
        assert "</td><script>alert(2)</script> & {{ config }}" in page.get_text()


def test_overview_shows_value_and_u_and_says_why_not() -> None:
    rows = {row[0]: row[1:] for row in cells(BUILDERS["overview"](sample.tables(), sample.facts()))}
    assert rows["Surface"] == ["Temperature, contact, °C", "Temperature, stand-off, °C",
                               "Albedo, clear", "NDVI"]
    assert rows["Worn asphalt"] == ["58.3 ± 1.2", "57.6 ± 1.7", "0.102 ± 0.007", "0.031 ± 0.010"]
    assert rows["Lawn"][0] == "not evaluatedc"  # the note's letter is set raised
    assert rows["Planting bed"][:2] == ["not surveyed", "36.5e"]
    notes = [li.get_text().replace(NO_BREAK, " ") for li in soup(
        BUILDERS["overview"](sample.tables(), sample.facts())).find_all("li")]
    assert "c No contact dwell settled for 3 s." in notes
    assert "e One pass; no interval; standard uncertainty at least 0.4 K." in notes


def test_interval_with_unequal_arms_prints_both_ends() -> None:
    frame = sample.tables()["surfaces"].iloc[[0]].assign(lower=57.0, upper=61.0)
    assert cells(t.surface_table(frame))[2][1] == "58.3 (57.0 to 61.0)"


def test_times_are_those_of_the_named_zone() -> None:
    # 10:05 UTC on a July day is 11:05 in Lisbon (IANA time zone database, summer time UTC+1)
    rows = cells(BUILDERS["passes"](sample.tables(), sample.facts()))
    assert rows[2][:4] == ["W1-contact-1", "Worn asphalt", "11:05:00", "11:08:05"]


def test_what_every_pass_shares_is_told_once_in_the_heading() -> None:
    passes = sample.tables()["passes"]
    passes = passes[passes["quantity"] == "ndvi"].copy()
    passes["flags"] = ["no swap; few effective records"] + ["no swap"] * (len(passes) - 1)
    rows = cells(t.pass_table(passes))
    assert rows[1] == ["NDVI; every pass: no swap"]
    assert [row[-1] for row in rows[2:]] == ["oka"] + ["ok"] * (len(passes) - 1)
    assert soup(t.pass_table(passes)).ul.get_text() == "a Few effective records."


def test_many_degrees_of_freedom_print_as_more_than_a_thousand() -> None:
    frame = sample.tables()["surfaces"].iloc[[0, 1, 2]].assign(dof=[135685.2, 1000.0, 4.4])
    assert [row[3] for row in cells(t.surface_table(frame))[2:]] == ["> 1000", "1000", "4"]


def test_ledger_shares_are_of_each_loggers_total() -> None:
    rows = cells(BUILDERS["ledger"](sample.tables(), sample.facts()))
    heads = [row[0].replace("\u202f", " ") for row in rows if len(row) == 1]
    # hand sums: 930 + 3 + 1227; 6720 + 655 + 14225; 8420 + 2311 + 12 + 10857
    assert heads == ["rednir, 2 160 records", "shortwave, 21 600 records",
                     "thermal, 21 600 records"]
    assert ["used", "", "930", "43 %"] in rows  # 930 / 2160 = 0.4306
    assert ["excluded", "unreadable line", "3", "< 1 %"] in rows


def test_checks_come_most_severe_first() -> None:
    rows = cells(BUILDERS["checks"](sample.tables(), sample.facts()))
    assert [row[1] for row in rows[1:]] == ["refuse", "exclude", "flag", "note"]
    assert rows[1][4] == "The sun stood 72° from the zenith, beyond 70°."


def test_settings_say_what_is_yours_and_split_maps() -> None:
    rows = cells(t.settings_table(sample.facts()["settings"]))
    assert ["zenith_max_deg", "65", "°", "yours", "parameter file"] in rows
    assert ["ranges.temperature_k", "233.15, 393.15", "", "engineering default", ""] in rows
    assert t.settings_table([]).html.startswith("<p")


def test_changes_say_why_not_and_what_could_have_been_missed() -> None:
    rows = cells(BUILDERS["changes"](sample.tables(), sample.facts()))
    # 1.4 * 1.90 = 2.66 and 1.4 * 0.0103 = 0.0144 by the sample's own rule
    assert rows[1] == ["Temperature, contact, K, since 12 June 2025"]
    assert ["Pale concrete slabs", "+0.3 ± 1.9", "no difference shown", "2.7", "partly matcheda",
            "ratio to control"] in rows
    assert ["Lawn", "none", "not evaluatedb", "", "not matched", "ratio to control"] in rows
    assert rows[2] == ["Coated court", "−7.9 ± 1.6", "lower", "2.3", "partly matched",
                       "ratio to control; in place of it: difference in differences −8.3 ± 1.6, "
                       "raw −2.1 ± 1.9"]
    notes = [li.get_text().replace(NO_BREAK, " ") for li in soup(
        BUILDERS["changes"](sample.tables(), sample.facts())).find_all("li")]
    assert notes[:2] == ["a Wind not stated on 2025-06-12.", "b No contact dwell settled for 3 s."]


def test_intervals_that_hold_together_stand_beside_the_single_ones() -> None:
    frame = sample.tables()["differences"].iloc[[0]].assign(
        difference=8.47, lower=6.8, upper=10.0, lower_all=6.2, upper_all=10.7)
    rows = cells(t.difference_table(frame, sample.LABELS))
    assert rows[0][:3] == ["Pair", "Difference ± U", "All pairs at once"]
    assert rows[2][:3] == ["Worn asphalt − Coated court", "+8.5 ± 1.6", "+6.2 to +10.7"]


def test_trends_and_products_read_as_the_tables_say() -> None:
    rows = cells(BUILDERS["trends"](sample.tables(), sample.facts()))
    # the sample's arms are 0.21 either way
    assert rows[1:] == [
        ["Albedo, clear, a⁻¹"],
        ["Coated court", "+0.310 ± 0.210", "weighted line", "3", "0.010", "higher"],
        ["Coated court", "+0.310 ± 0.210", "ordinary line", "3", "0.010", "not judged"]]
    rows = cells(t.derived_table(sample.tables()["derived"], sample.LABELS))
    assert rows == [["Surface", "As measured"], ["Lawn", "512 ± 28"],
                    ["Surface", "Value"], ["Lawn", "not evaluateda"]]


def test_products_in_kelvin_follow_the_page_rule() -> None:
    base = sample.tables()["derived"].iloc[[0]]
    excess = base.assign(product="surface_minus_air", unit="K", value=20.56, lower=19.44,
                         upper=21.68)
    assert cells(t.derived_table(excess, sample.LABELS))[1] == ["Lawn", "20.6 ± 1.1"]


def test_a_caution_shows_its_bound_and_says_the_same_only_once() -> None:
    base = sample.tables()["derived"].iloc[[0]].assign(product="caution", unit="degC",
                                                       lower=float("nan"))
    note = ("caution: upper bound {} degC (95th percentile of the records, plus U) exceeds the "
            "40 degC entered (a threshold), consult local codes and the safety officer")
    rows = pd.concat([
        base.assign(form="contact", value=44.96, upper=46.04, note=note.format("46.0")),
        base.assign(form="stand-off", value=44.2, upper=45.4, note=note.format("45.4"))])
    html = t.derived_table(rows.reset_index(drop=True), sample.LABELS)
    page = soup(html)
    assert page.caption.get_text() == (
        "Caution, °C: 95th percentile of the records, and what it may reach with U.")
    assert cells(html)[1] == ["Lawn", "45.0 to 46.0a", "44.2 to 45.4a"]
    assert [li.get_text().replace(NO_BREAK, " ") for li in page.find_all("li")] == [
        "a Caution: upper bound (95th percentile of the records, plus U) exceeds the 40 °C entered "
        "(a threshold), consult local codes and the safety officer."]


def test_notes_of_the_overview_tell_names_by_their_labels() -> None:
    frame = sample.tables()["surfaces"].iloc[[2]].assign(note="see lawn on mill-yard-2025-06-12")
    page = soup(t.surface_overview(frame, sample.facts()["labels"]))
    assert page.li.get_text() == "a See Lawn on 12 June 2025."


def test_heights_used_stand_beside_the_best_ones() -> None:
    rows = cells(BUILDERS["heights"](sample.tables(), sample.facts()))
    # hand arithmetic as in the sample: 0.03165 at 50 cm, 0.01125 at 10 cm, foreign 0.25 / 4
    assert rows[1] == ["W1", "Worn asphalt", "50", "3 %", "6 %", "10", "1 %", "E1918-likea"]
    first, other = (sample.tables()["geometry"].query(f"surface == '{name}'")
                    for name in ("worn-asphalt", "lawn"))
    mixed = pd.concat([first, other, first.assign(patch="W2", **{"pass": "W2-albedo-1"})])
    assert [row[0] for row in cells(t.geometry_table(mixed))[1:]] == ["W1", "W2", "L1"]


def test_inputs_carry_the_whole_hash() -> None:
    rows = cells(t.inputs_table(sample.facts()["inputs"]))
    assert rows[2][1].replace("\u202f", " ") == "2 418 337"
    assert rows[2][2] == "a7" * 32


def test_show_displays_frames_sentences_and_tables(monkeypatch: pytest.MonkeyPatch) -> None:
    shown: list[Html] = []
    monkeypatch.setattr("surveykit.report.tables.display", shown.append)
    t.show(sample.tables()["dwells"], "Dwells", ["pass", "value"])
    t.show(["First: one.", "Second."])
    t.show([])
    t.show(t.clock_table(sample.tables()["clocks"]))
    assert cells(shown[0])[:2] == [["Pass", "Value"], ["W1-contact-1", "58.1"]]
    assert shown[1].html.count("<li>") == 2
    assert shown[2].html == '<p class="empty">There is none.</p>\n'
    assert "<caption>" in shown[3].html
