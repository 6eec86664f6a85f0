"""One self-contained page: summary first, then the executed notebooks, then the appendix.

The page holds no script and asks the network for nothing; equal inputs give equal bytes. Code is
not shown; what the cells printed to standard error stays in the executed notebooks.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from html import escape, unescape
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import pandas as pd
from jinja2 import Environment, FileSystemLoader, StrictUndefined
from nbconvert import HTMLExporter
from nbformat import NotebookNode
from traitlets.config import Config

from . import sentences, standing
from . import tables as t
from . import wording as w
from .markup import Html, bullets, paragraph
from .typeset import typeset

Section = tuple[str, str, list[Html]]  # identifier, heading, markup
TEMPLATES = Path(__file__).parent / "template"
LEFT_OUT = {"remove_cell", "page-skip"}  # cells with one of these tags are not on the page
HEADING = re.compile(r"<h([1-6])[^>]*>(.*?)</h\1>", re.DOTALL)
ACTIVE = {"script", "link", "iframe", "object", "embed", "base", "form"}
ADDRESSES = {"src", "href", "srcset", "action", "poster", "data", "background"}


def build_page(notebooks: Sequence[NotebookNode], tables: Mapping[str, pd.DataFrame],
               facts: Mapping[str, Any]) -> str:
    """Return the report as one HTML page.

    Parameters
    ----------
    notebooks : sequence of NotebookNode
        Executed, in reading order; each becomes a part named by its first level-one heading.
    tables : mapping of str to DataFrame
        All tables of `core.TABLES`.
    facts : mapping
        The run's plain facts (site, date, conditions, inputs, versions, settings, ...).

    Returns
    -------
    str
        HTML, the same for equal inputs.

    Raises
    ------
    ValueError
        If a notebook holds a failed cell, or something on the page would leave it (a script, a
        remote image or link).
    """
    return render("page.html.j2", facts, notebooks, title_block=_title_block(tables, facts),
                  summary=_summary(tables, facts), appendix=_appendix(tables, facts))


def render(template: str, facts: Mapping[str, Any], notebooks: Sequence[NotebookNode], *,
           links: frozenset[str] = frozenset(), **fields: Any) -> str:
    """Return a page of the house style: executed notebooks and finished fields in a template.

    `links` are the addresses of other pages that it may lead to.

    Raises
    ------
    ValueError
        As `build_page`.
    """
    parts = [_part(notebook, place) for place, notebook in enumerate(notebooks, start=1)]
    environment = Environment(loader=FileSystemLoader(TEMPLATES), autoescape=True,
                              undefined=StrictUndefined, trim_blocks=True, lstrip_blocks=True)
    page: str = environment.get_template(template).render(
        facts=facts, css=Html((TEMPLATES / "page.css").read_text("utf-8")), parts=parts, **fields)
    watch = _Watch(links)
    watch.feed(page)
    if watch.found:
        raise ValueError("the page would not stand alone; write sources in words, show figures by "
                         f"figures.show: {'; '.join(watch.found)}")
    return page


class _Watch(HTMLParser):
    """Finds what would run on the page or ask the network for something."""

    def __init__(self, links: frozenset[str]) -> None:
        super().__init__()
        self.links, self.found = links, list[str]()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        if tag in ACTIVE:
            self.found.append(f"<{tag}>")
        for name, value in attrs:
            remote = (name in ADDRESSES and not (value or "").startswith(("#", "data:image/"))
                      and not (name == "href" and value in self.links))
            if remote or name.startswith("on") or (name == "style" and "url(" in (value or "")):
                self.found.append(f'<{tag} {name}="{(value or "")[:60]}">')

    def handle_data(self, data: str) -> None:
        if self.cdata_elem == "style" and re.search(r"@import|url\(", data):
            self.found.append("an address in a style sheet")


def _part(notebook: NotebookNode, place: int) -> dict[str, Any]:
    """Return one notebook as a part: its title and its body under numbered anchors."""
    cells = [cell for cell in notebook.cells
             if not LEFT_OUT & {*cell.get("metadata", {}).get("tags", [])}]
    for cell in cells:
        for output in cell.get("outputs", []):
            _refuse_unfit(output, place)
    exporter = HTMLExporter(
        config=Config({"NbConvertBase": {"display_data_priority": [
            "text/html", "image/png", "text/plain"]}}),
        extra_template_basedirs=[str(TEMPLATES.parent)], template_name=TEMPLATES.name,
        exclude_input=True, exclude_anchor_links=True, mathjax_url="", require_js_url="",
        jquery_url="", mermaid_js_url="", embed_images=False)
    body, _ = exporter.from_notebook_node(NotebookNode(
        cells=cells, metadata=notebook.metadata, nbformat=notebook.nbformat,
        nbformat_minor=notebook.nbformat_minor))
    title = f"Notebook {place}"
    first = HEADING.search(body)
    if first and first[1] == "1":
        title, body = unescape(re.sub("<[^>]+>", "", first[2])), body.replace(first[0], "", 1)
    headings = _Headings(f"part-{place}")
    body = HEADING.sub(headings.renumber, body)
    return {"id": f"part-{place}", "title": title, "body": Html(body), "headings": headings.found}


class _Headings:
    """Sets a part's headings below its own (h2), without a jump, each with its anchor."""

    def __init__(self, prefix: str) -> None:
        self.prefix, self.level, self.count = prefix, 2, 0
        self.found: list[tuple[str, str]] = []

    def renumber(self, match: re.Match[str]) -> str:
        self.level = max(3, min(int(match[1]) + 1, self.level + 1, 6))
        self.count += 1
        anchor = f"{self.prefix}-{self.count}"
        if self.level == 3:
            self.found.append((anchor, unescape(re.sub("<[^>]+>", "", match[2]))))
        return f'<h{self.level} id="{anchor}">{match[2]}</h{self.level}>'


def _refuse_unfit(output: NotebookNode, place: int) -> None:
    if output.output_type == "error":
        raise ValueError(f"part {place} holds a failed cell ({output.ename}: {output.evalue}); "
                         "a failed run has no page")
    image = "image/png" in output.get("data", {}) and "text/html" not in output.data
    if image and not output.get("metadata", {}).get("image/png", {}).get("alt"):
        raise ValueError(f"part {place} shows an image without alt text; show it by figures.show")


def _title_block(tables: Mapping[str, pd.DataFrame],
                 facts: Mapping[str, Any]) -> list[tuple[str, list[str]]]:
    site, labels, zone = facts["site"], facts["labels"], facts["time_zone"]
    where = ", ".join([site["name"], _degrees(site["latitude"], "N", "S"),
                       _degrees(site["longitude"], "E", "W"),
                       f"{w.number(site['elevation_m'], 0)} m above sea level"])
    conditions = [*facts.get("conditions", [])] or ["Not stated."]
    height = 90 - tables["passes"]["zenith_deg"].dropna()
    if len(height):
        ends = dict.fromkeys(f"{w.number(end, 0)}°" for end in (height.min(), height.max()))
        conditions.append(f"Sun {' to '.join(ends)} above the horizon during the passes.")
    rows = {"Date": [w.date_text(facts["date"])], "Site": [where],
            "Crew": [", ".join(facts.get("crew") or []) or "Not stated."],
            "Conditions": conditions, "Notes": [*facts.get("remarks", [])]}
    if facts.get("earlier"):
        rows["Compared with"] = [w.label(name, labels) for name in facts["earlier"]]
        rows["Control"] = [w.label(facts["control"] or "", labels) or "None named."]
    rows["Times"] = [zone if zone == "UTC" else f"{zone} unless UTC is stated."]
    return [(term, [typeset(line) for line in lines]) for term, lines in rows.items() if lines]


def _summary(tables: Mapping[str, pd.DataFrame], facts: Mapping[str, Any]) -> list[Section]:
    """Return the sections of the summary: identifier, heading, markup; the first has no heading."""
    labels, surfaces = facts["labels"], tables["surfaces"]
    beside = [*sentences.two_kinds(surfaces, labels), *sentences.value_only(surfaces, labels)]
    return [
        ("", "", [bullets(sentences.abstract(tables, facts)),
                  t.surface_overview(surfaces, labels), *(paragraph(line) for line in beside)]),
        ("differs", "What differs", [bullets(
            sentences.differs(tables["differences"], facts),
            empty="No two surfaces could be compared.")]),
        ("changed", "What changed", [_changes(tables, facts)]),
        ("not-evaluated", "What could not be evaluated, and why", [bullets(
            sentences.not_evaluated(tables, labels),
            empty="Nothing was surveyed." if surfaces.empty else
            "Everything on the field sheet was evaluated.")]),
        ("narrowing", "What would narrow the uncertainty most", [bullets(
            sentences.narrowing(tables, facts),
            empty="No uncertainty budget could be drawn up.")]),
        ("cautions", "Cautions", [bullets(standing.cautions(surfaces, labels))]),
        ("flags", "What was not corrected or not checked", [bullets(
            sentences.flagged(tables["passes"]), empty="No pass carries a flag.")]),
        *([("notes", "Notes on this run", [bullets([*facts["notes"]])])]
          if facts.get("notes") else []),
    ]


def _changes(tables: Mapping[str, pd.DataFrame], facts: Mapping[str, Any]) -> Html:
    changes = tables["changes"]
    if not facts.get("earlier") and changes.empty:
        return paragraph("No earlier campaign was named, so no change was looked for.", "empty")
    lines = [*sentences.changed(changes, facts), *sentences.trending(tables["trends"], facts)]
    return bullets(lines, empty=(
        "The earlier campaigns share no surface and quantity with this one." if changes.empty else
        "No change could be judged; the reasons stand in the next section."))


def _appendix(tables: Mapping[str, pd.DataFrame], facts: Mapping[str, Any]) -> list[Section]:
    """Return the sections of the appendix: identifier, heading, markup."""
    verify, again = (Html(f"<pre>{escape(command)}</pre>\n") for command in (
        f"surveykit verify reports/{facts['campaign']}", facts["rerun"]))
    return [
        ("reading", "How to read the numbers", [bullets(standing.reading(facts, tables))]),
        ("methods", "Methods and their sources", [bullets(standing.methods(tables))]),
        ("instruments", "Instruments and calibrations",
         [t.instrument_table(facts.get("instruments", []))]),
        ("settings", "Settings", [t.settings_table(facts.get("settings", []))]),
        ("inputs", "Input files", [t.inputs_table(facts.get("inputs", []))]),
        ("versions", "Programs", [paragraph(standing.programs(facts))]),
        ("rerun", "How to run it again", [
            paragraph("From the project’s folder, with the input files listed above. First: do "
                      "inputs, tables and page still belong together?"), verify,
            paragraph("The same page and tables again, on one machine and with the programs "
                      "listed above byte for byte:"), again]),
    ]


def _degrees(value: float, positive: str, negative: str) -> str:
    return f"{abs(value):.4f}° {positive if value >= 0 else negative}"
