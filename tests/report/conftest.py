"""Pages built once for the report's tests: two small notebooks on invented tables.

Their cells are run here, without a kernel: what they display is kept as a kernel would keep it.
"""

from __future__ import annotations

import contextlib
import io
from typing import Any

import nbformat
import pytest
import sample

from surveykit.report import figures, tables
from surveykit.report.page import build_page

FIRST = """tables.show(tables.clock_table(t["clocks"]))
figures.show(figures.day_timeline(t["passes"], sample.sky(), sample.weather(), zone, labels))
tables.show(tables.pass_table(t["passes"], labels, zone))
figures.show(figures.ledger_plot(t["ledger"]))
tables.show(tables.ledger_table(t["ledger"]))
tables.show(tables.check_table(t["checks"], labels))
print("<b>3</b> loggers & their files")"""
SECOND = """figures.show(figures.interval_plots(t["surfaces"], labels))
tables.show(tables.surface_table(t["surfaces"], labels))
figures.show(figures.budget_plot(t["budget"], labels))
figures.show(figures.rank_plots(t["ranks"], labels))
figures.show(figures.difference_matrices(t["differences"], labels))
tables.show(tables.difference_table(t["differences"], labels))
figures.show(figures.change_plots(t["changes"], facts["relevant_change"], labels))
tables.show(tables.change_table(t["changes"], labels))
tables.show(tables.trend_table(t["trends"], labels))
figures.show(figures.height_plot(t["geometry"], labels), figures.histogram_plots(t["histograms"]))
tables.show(tables.geometry_table(t["geometry"], labels))
tables.show(t["corrections"], "Correction steps", ["pass", "step", "value"])"""


def notebook(title: str, *cells: str) -> nbformat.NotebookNode:
    """Return an unexecuted notebook: headings that jump and repeat, a skipped cell, `cells`."""
    v4 = nbformat.v4
    book = v4.new_notebook()
    book.cells = [v4.new_markdown_cell(f"# {title}\n\nWhat this step asks."),
                  v4.new_markdown_cell("## How to read this\n\nFirst *words*, then the figure.")]
    book.cells += [v4.new_code_cell(cell) for cell in cells]
    skipped = v4.new_code_cell('print("not for the page")')
    skipped.metadata.tags = ["page-skip"]
    book.cells += [v4.new_markdown_cell("#### A jump\n\n## How to read this\n\nAgain."), skipped]
    return book


def executed(hostile: bool) -> list[nbformat.NotebookNode]:
    facts = sample.facts(hostile=hostile)
    names = {"t": sample.tables(hostile=hostile), "facts": facts, "labels": facts["labels"],
             "zone": facts["time_zone"], "sample": sample, "figures": figures, "tables": tables}
    books = [notebook("From files to passes", FIRST),
             notebook("Surfaces, differences & changes", SECOND)]
    for book in books:
        for cell in book.cells:
            if cell.cell_type == "code":
                cell.outputs = _run(cell.source, names)
    return books


def _run(source: str, names: dict[str, Any]) -> list[nbformat.NotebookNode]:
    outputs, new = [], nbformat.v4.new_output

    def keep(item: Any, *, raw: bool = False, metadata: dict[str, Any] | None = None) -> None:
        data = item if raw else {"text/html": item._repr_html_(), "text/plain": repr(item)}
        outputs.append(new("display_data", data=data, metadata=metadata or {}))

    printed = io.StringIO()
    with pytest.MonkeyPatch.context() as patch, contextlib.redirect_stdout(printed):
        patch.setattr("surveykit.report.style.display", keep)
        patch.setattr("surveykit.report.tables.display", keep)
        exec(source, dict(names))
    return [*outputs, *([new("stream", text=printed.getvalue())] if printed.getvalue() else [])]


@pytest.fixture(scope="session")
def books() -> list[nbformat.NotebookNode]:
    return executed(hostile=False)


@pytest.fixture(scope="session")
def page(books: list[nbformat.NotebookNode]) -> str:
    return build_page(books, sample.tables(), sample.facts())


@pytest.fixture(scope="session")
def hostile_page() -> str:
    return build_page(executed(hostile=True), sample.tables(hostile=True),
                      sample.facts(hostile=True))


@pytest.fixture(scope="session", params=["empty", "bare"])
def sparse_page(request: pytest.FixtureRequest) -> str:
    """Return the page of a campaign with nothing, or with one surface that was refused."""
    tables = sample.empty_tables() if request.param == "empty" else sample.bare_tables()
    facts = sample.facts()
    for key in ("conditions", "earlier", "notes", "instruments", "settings",
                "inputs", "versions"):
        del facts[key]
    facts["control"] = None
    return build_page([], tables, facts)
