"""The page: parsed by html5lib (strict) and BeautifulSoup, independent of what wrote it."""

from __future__ import annotations

import copy
import re
from pathlib import Path

import html5lib
import nbformat
import pytest
import sample
from bs4 import BeautifulSoup

from surveykit.report.page import build_page

ADDRESS = re.compile(r"url\(\s*['\"]?(?!data:|#)", re.IGNORECASE)


def check(html: str) -> BeautifulSoup:
    """Assert what holds for every page; return it parsed."""
    html5lib.HTMLParser(strict=True).parse(html)
    soup = BeautifulSoup(html, "html5lib")
    assert soup.html["lang"] == "en"
    assert len(soup.find_all("h1")) == 1
    assert not soup.find_all(["script", "link", "iframe", "object", "embed", "form"])
    ids = [tag["id"] for tag in soup.find_all(id=True)]
    assert len(ids) == len({*ids})
    levels = [int(tag.name[1]) for tag in soup.find_all(re.compile("^h[1-6]$"))]
    assert levels[0] == 1
    assert all(after <= before + 1 for before, after in zip(levels, levels[1:], strict=False))
    for tag in soup.find_all(True):
        for name in ("src", "href", "srcset", "action", "background", "poster"):
            assert str(tag.get(name, "#")).startswith(("#", "data:image/png;base64,"))
        assert not ADDRESS.search(str(tag.get("style", "")))
        assert not [name for name in tag.attrs if name.startswith("on")]
    assert not ADDRESS.search(soup.style.get_text())
    anchors = [a["href"][1:] for a in soup.find_all("a", href=True)]
    assert anchors
    assert {*anchors} <= {*ids}
    for tag in soup.find_all(attrs={"aria-labelledby": True}):
        assert tag["aria-labelledby"] in ids
    for img in soup.find_all("img"):
        assert len(img["alt"]) > 40
        assert any(map(str.isdigit, img["alt"]))
        assert "No description" not in img["alt"]
    alts = [img["alt"] for img in soup.find_all("img")]
    assert len(alts) == len({*alts})
    for table in soup.find_all("table"):
        assert table.caption.get_text(strip=True)
        assert table.find_all("tr")[1:]
    soup.style.extract()
    text = soup.get_text(" ")
    assert not re.search(r"\b(nan|NaN|NaT|None|inf)\b", text)
    assert not re.search(r"\b(safe|compliant)\b", text, re.IGNORECASE)
    assert not re.search(r"(?<![\w.-])-\d", text)  # a number's minus sign is never a hyphen
    return soup


def test_the_page_is_valid_and_stands_alone(page: str) -> None:
    soup = check(page)
    assert len(soup.find_all("figure")) == 16
    assert len(page) < 3e6


def test_the_hostile_page_is_as_valid_and_shows_markup_as_text(hostile_page: str) -> None:
    soup = check(hostile_page)
    text = soup.get_text()
    for said in ("<b>Lawn</b> {{ 7*7 }} & $x_1$ \"q\"", "Bed </table><script>alert(1)</script>",
                 "</td><script>alert(2)</script> & {{ config }}", "<i>&</i>",
                 "<b>3</b> loggers & their files"):
        assert said in text
    assert "49" not in soup.find(string=re.compile("Lawn"))  # 7*7 was not worked out
    assert not soup.find_all(["b", "i"])


def test_a_campaign_with_nothing_is_as_readable(sparse_page: str) -> None:
    soup = check(sparse_page)
    summary = soup.find(id="summary").get_text(" ")
    for said in ("No two surfaces could be compared.",
                 "No uncertainty budget could be drawn up.",
                 "No earlier campaign was named, so no change was looked for."):
        assert said in summary
    assert "Not stated." in soup.header.get_text()
    assert "certifies nothing" in summary


def test_summary_comes_first_and_in_order(page: str) -> None:
    soup = BeautifulSoup(page, "html5lib")
    assert soup.main.find_all(["h2", "h3"])[0].get_text() == "Summary"
    heads = [h.get_text() for h in soup.find(id="summary").find_all(["h2", "h3"])]
    assert heads == ["Summary", "What differs", "What changed",
                     "What could not be evaluated, and why",
                     "What would narrow the uncertainty most", "Cautions",
                     "What was not corrected or not checked", "Notes on this run"]
    header = soup.header.get_text(" ")
    for said in ("mill-yard-2025-07-24", "24 July 2025", "41.3000° N", "7.7500° W",
                 "No rain in the 48 hours before.", "Worn asphalt"):
        assert said in header
    assert "58.3\u00a0±\u00a01.2" in soup.find("table").get_text()


def test_parts_are_listed_numbered_and_without_code(page: str) -> None:
    soup = BeautifulSoup(page, "html5lib")
    entries = [a.get_text() for a in soup.find("nav", class_="contents").find_all("a")]
    assert entries[:4] == ["From files to passes", "How to read this", "How to read this",
                           "Surfaces, differences & changes"]
    assert soup.find(id="part-2").get_text() == "Surfaces, differences & changes"
    assert "sys.path" not in page
    assert "not for the page" not in page
    assert soup.find_all("pre")[0].get_text() == "<b>3</b> loggers & their files\n"


def test_appendix_has_what_a_rerun_needs(page: str) -> None:
    soup = BeautifulSoup(page, "html5lib")
    rest = " ".join(soup.find(id="appendix").find_parent("section").get_text(" ").split())
    for said in ("a7" * 32, "numpy 2.4.0", "20251", "zenith_max_deg", "thermal-2025-02",
                 "2025-02-10", "surveykit run params/mill-yard-2025-07-24.yml"):
        assert said in rest


def test_no_path_of_this_machine_is_on_the_page(page: str) -> None:
    assert "/tmp/" not in page
    assert "/home/" not in page
    assert str(Path(__file__).parents[2]) not in page


def test_twice_gives_the_same_bytes_whatever_the_cells_are_called(
        books: list[nbformat.NotebookNode], page: str) -> None:
    renamed = copy.deepcopy(books)
    for book in renamed:
        for place, cell in enumerate(book.cells):
            cell.id = f"other-{place}"
            cell.metadata["execution"] = {"iopub.execute_input": "2031-01-01T00:00:00"}
    before = copy.deepcopy(books)
    assert build_page(renamed, sample.tables(), sample.facts()) == page
    assert books == before


def _book(source: str, output: nbformat.NotebookNode | None = None) -> nbformat.NotebookNode:
    book = nbformat.v4.new_notebook()
    cell = nbformat.v4.new_code_cell("", outputs=[output] if output else [])
    book.cells = [nbformat.v4.new_markdown_cell(source), cell]
    return book


@pytest.mark.parametrize(("book", "said"), [
    (_book("# A\n\n[there](http://example.org/)"), "example.org"),
    (_book("# A\n\n![x](https://example.org/x.png)"), "example.org"),
    (_book("# A\n\n<script>alert(1)</script>"), "<script>"),
    (_book("# A\n\n<p onclick='x()'>y</p>"), "onclick"),
    (_book("# A", nbformat.v4.new_output("error", ename="ValueError", evalue="no", traceback=[])),
     "failed cell"),
    (_book("# A", nbformat.v4.new_output("display_data", data={"image/png": "AAAA"})), "alt text"),
], ids=["link", "image", "script", "handler", "error", "no alt"])
def test_what_would_spoil_the_page_is_refused(book: nbformat.NotebookNode, said: str) -> None:
    with pytest.raises(ValueError, match=re.escape(said)):
        build_page([book], sample.tables(), sample.facts())


def test_words_that_look_like_addresses_are_no_offence() -> None:
    facts = sample.facts()
    facts["notes"] = ["see src=http://example.org and url(http://example.org) <script>"]
    assert "src=http://example.org" in build_page([], sample.tables(), facts)


def test_a_notebook_without_a_title_still_makes_a_part() -> None:
    page = build_page([_book("## Only a section")], sample.tables(), sample.facts())
    soup = check(page)
    assert soup.find(id="part-1").get_text() == "Notebook 1"
    assert soup.find(id="part-1-1").get_text() == "Only a section"
