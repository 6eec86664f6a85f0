"""The page's few kinds of markup: tables, lists and paragraphs, every text escaped here.

No identifiers are written, so the same table may stand twice on one page. A table without rows
becomes a sentence that says so.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from html import escape

from .typeset import NO_BREAK, typeset
from .wording import label, sentence_case

Columns = dict[str, str]  # a heading: how its cells are set: text, short, long, number or code


@dataclass(frozen=True)
class Html:
    """Finished markup: a notebook shows it by its `_repr_html_`, the page puts it in as it is."""

    html: str
    text: str = ""

    def _repr_html_(self) -> str:
        return self.html

    def __html__(self) -> str:
        return self.html

    def __repr__(self) -> str:
        return self.text


@dataclass(frozen=True)
class Cell:
    """A cell: a muted word (`quiet`), a link, a note's letter, or a number and its U.

    `tail` follows the number in a box `room` digits wide: equal over a column, the decimal marks
    of values and of uncertainties stand in line.
    """

    text: str
    note: str = ""
    quiet: bool = False
    tail: str = ""
    room: float = 0.0
    link: str = ""

    @property
    def html(self) -> str:
        """The cell's escaped content."""
        inner = _set(self.text)
        if self.quiet:
            inner = f'<span class="quiet">{inner}</span>'
        if self.link:
            inner = f'<a href="{escape(self.link)}">{inner}</a>'
        note = f'<sup class="note">{escape(self.note)}</sup>' if self.note else ""
        tail = f"{NO_BREAK}{_set(self.tail)}{note}" if self.tail else ""
        if not tail:
            inner += note
        if self.room:
            inner += f'<span class="tail" style="min-width:{self.room:g}ch">{tail}</span>'
        return inner


def with_labels(text: str, labels: Mapping[str, str] | None) -> str:
    """Return a text in which each whole name is told by its label.

    Examples
    --------
    >>> with_labels("brick-path since path-2, surfaces.path.x", {"brick-path": "Path", "path": "Y"})
    'Path since path-2, surfaces.path.x'
    """
    names = "|".join(map(re.escape, labels or {}))
    return re.sub(rf"(?<![\w.-])({names})(?![\w-]|\.\w)", lambda m: label(m[1], labels),
                  text) if names else text


class Notes:
    """The notes below a table: each text once, under its letter, names told by their labels."""

    def __init__(self, labels: Mapping[str, str] | None = None) -> None:
        self.labels, self.letters = labels, dict[str, str]()

    def letter(self, *notes: str) -> str:
        """Return the letters of the notes, those of new ones the next free; "" for none."""
        told = [self.letters.setdefault(note, chr(ord("a") + len(self.letters) % 26)
                                        * (len(self.letters) // 26 + 1)) for note in notes if note]
        return ", ".join(told)

    def listed(self) -> list[tuple[str, str]]:
        """Return letters and notes as they stand below the table."""
        return [(letter, sentence_case(with_labels(note, self.labels)))
                for note, letter in self.letters.items()]


Row = Sequence[str | Cell]
Group = tuple[str, Sequence[Row]]  # its heading, "" for none


def table(caption: str, columns: Columns, rows: Sequence[Row], *, empty: str,
          notes: Iterable[tuple[str, str]] = ()) -> Html:
    """Return a table whose first column heads its rows, without groups; see `grouped_table`."""
    return grouped_table(caption, columns, [("", rows)], empty=empty, notes=notes)


def grouped_table(caption: str, columns: Columns, groups: Sequence[Group], *, empty: str,
                  notes: Iterable[tuple[str, str]] = ()) -> Html:
    """Return a table whose first column heads its rows, in groups under headings of their own.

    Parameters
    ----------
    caption : str
        What the table shows, with units and coverage where they hold for all of it.
    columns : mapping of str to str
        Heading of each column and how its cells are set, see `Columns`.
    groups : sequence of (heading, rows)
        A row is a sequence of str or Cell; a group without rows is left out.
    empty : str
        The sentence that stands in place of a table without rows.
    notes : iterable of (letter, text)
        Notes set below the table.
    """
    filled = [(heading, rows) for heading, rows in groups if rows]
    if not filled:
        return paragraph(empty, "empty")
    head = "".join(f'<th scope="col" class="{align}">{_set(heading)}</th>'
                   for heading, align in columns.items())
    body = "".join(_group(columns, heading, rows) for heading, rows in filled)
    below = "".join(f'<li><span class="letter">{escape(letter)}</span> {_set(text)}</li>'
                    for letter, text in notes)
    html = (f'<div class="table" role="group" aria-label="{_set(caption)}" tabindex="0">\n'
            f"<table>\n<caption><span>{_set(caption)}</span></caption>\n"
            f"<thead><tr>{head}</tr></thead>\n{body}</table>\n</div>\n")
    if below:
        html += f'<ul class="notes">{below}</ul>\n'
    return Html(html, f"{caption} ({sum(len(rows) for _, rows in filled)} rows)")


def paragraph(text: str, css: str = "") -> Html:
    """Return one escaped paragraph."""
    attribute = f' class="{css}"' if css else ""
    return Html(f"<p{attribute}>{_set(text)}</p>\n", text)


def bullets(lines: Sequence[str], *, empty: str = "") -> Html:
    """Return escaped sentences as a list; one as a paragraph; none as the sentence `empty`.

    A line's beginning up to a first ": " is set strong where it is short: it names the subject.
    """
    if not lines:
        return paragraph(empty, "empty") if empty else Html("")
    if len(lines) == 1:
        return Html(f"<p>{_lead(lines[0])}</p>\n", lines[0])
    items = "".join(f"<li>{_lead(line)}</li>\n" for line in lines)
    return Html(f"<ul>\n{items}</ul>\n", "\n".join(lines))


def _group(columns: Columns, heading: str, rows: Sequence[Row]) -> str:
    head = (f'<tr class="group"><th scope="rowgroup" colspan="{len(columns)}">'
            f"<span>{_set(heading)}</span></th></tr>\n") if heading else ""
    body = "".join(f"<tr>{_row(columns, row)}</tr>\n" for row in rows)
    return f"<tbody>\n{head}{body}</tbody>\n"


def _row(columns: Columns, row: Row) -> str:
    written = []
    for place, (align, cell) in enumerate(zip(columns.values(), row, strict=True)):
        inner = (cell.html if isinstance(cell, Cell) else escape(cell) if align == "code"
                 else _set(cell))
        tag = 'th scope="row"' if place == 0 else "td"
        written.append(f'<{tag} class="{align}">{inner}</{tag.split()[0]}>')
    return "".join(written)


def _lead(line: str) -> str:
    subject, colon, rest = line.partition(": ")
    if colon and len(subject) <= 90:
        return f"<strong>{_set(subject)}:</strong> {_set(rest)}"
    return _set(line)


def _set(text: str) -> str:
    return escape(typeset(text))
