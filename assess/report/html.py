"""Write the document tree as one self-contained HTML file: no script, nothing from outside."""

import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from html import escape
from importlib.resources import files
from itertools import groupby
from operator import itemgetter

from assess.report import numbers
from assess.report.document import (
    Block,
    BulletList,
    Callout,
    CalloutKind,
    Cell,
    Column,
    Document,
    Emphasis,
    FigureNode,
    Inline,
    Panel,
    Paragraph,
    References,
    Run,
    Section,
    Table,
)
from assess.report.style import to_svg

TAGS = {Emphasis.STRONG: "strong", Emphasis.LIGHT: "em", Emphasis.CODE: "code"}
PX_PER_INCH = 96
UNBROKEN = re.compile("\\d+(?:\u2013\\d+)?[ \u00a0]%|\\d{4}-\\d\\d-\\d\\d")
MAX_UNBROKEN = 13  # characters
# Nothing may be fetched, not even by a value that slipped through escaping.
POLICY = "default-src 'none'; style-src 'unsafe-inline'; img-src data:"


@dataclass(slots=True)
class _Counters:
    """Numbers given so far, so that captions and ids are unique."""

    tables: int = 0
    figures: int = 0
    pictures: int = 0
    contents: list[tuple[str, str]] = field(default_factory=list)


def render(document: Document) -> str:
    """Write a document as HTML text.

    Parameters
    ----------
    document : Document
        The tree; its figures are drawn here, one at a time.

    Returns
    -------
    str
        A whole HTML file; the same document gives the same text.
    """
    counters = _Counters()
    lead = "\n".join(_block(block, counters, 2) for block in document.lead)
    body = "\n".join(
        _section(section, counters, 2, f"s{position}")
        for position, section in enumerate(document.sections, 1)
    )
    items = "\n".join(
        f'<li><a href="#{name}">{escape(heading)}</a></li>' for name, heading in counters.contents
    )
    style = files("assess.report").joinpath("report.css").read_text(encoding="utf-8")
    return f"""<!DOCTYPE html>
<html lang="{escape(document.language)}">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="{POLICY}">
<meta name="viewport" content="width=device-width, initial-scale=1">
<title>{escape(document.title)}: {escape(document.subtitle)}</title>
<style>
{style}</style>
</head>
<body>
<a class="skip" href="#content">Skip to the answer</a>
<div class="page">
<header>
<h1>{escape(document.title)}</h1>
<p>{escape(document.subtitle)}</p>
</header>
<nav aria-label="Contents">
<h2>Contents</h2>
<ol>
<li><a href="#content">Question and answer</a></li>
{items}
</ol>
</nav>
<main id="content">
{lead}
{body}
</main>
</div>
</body>
</html>
"""


def _section(section: Section, counters: _Counters, level: int, name: str) -> str:
    if level == 2:
        counters.contents.append((name, section.heading))
    parts, inner = [], 0
    for block in section.blocks:
        if isinstance(block, Section):
            inner += 1
            parts.append(_section(block, counters, level + 1, f"{name}-{inner}"))
        else:
            parts.append(_block(block, counters, level + 1))
    heading = f'<h{level} id="{name}-h">{escape(section.heading)}</h{level}>'
    inside = "\n".join(parts)
    return f'<section id="{name}" aria-labelledby="{name}-h">\n{heading}\n{inside}\n</section>'


def _text(words: str) -> str:
    """Escape words, and keep intervals of percentages and dates on one line."""
    return UNBROKEN.sub(r'<span class="short">\g<0></span>', escape(words))


def _inline(runs: Sequence[Inline]) -> str:
    parts = []
    for item in runs:
        run = Run(item) if isinstance(item, str) else item
        text = _text(run.text)
        tag = TAGS.get(run.emphasis)
        parts.append(f"<{tag}>{text}</{tag}>" if tag else text)
    return "".join(parts)


def _block(block: Block, counters: _Counters, level: int) -> str:
    match block:
        case Paragraph(runs):
            return f"<p>{_inline(runs)}</p>"
        case BulletList(items):
            inside = "\n".join(f"<li>{_inline(item)}</li>" for item in items)
            return f"<ul>\n{inside}\n</ul>"
        case Table():
            return _table(block, counters)
        case FigureNode():
            return _figure(block, counters)
        case Callout():
            return _callout(block)
        case References(items):
            inside = "\n".join(f"<li>{escape(item)}</li>" for item in items)
            return f'<ol class="refs">\n{inside}\n</ol>'
        case Section():
            return _section(block, counters, level, f"x{len(counters.contents)}-{level}")
    raise TypeError(f"no way to write a {type(block).__name__}; see assess.report.document.Block")


def _callout(callout: Callout) -> str:
    kind = "callout" if callout.kind is CalloutKind.CAUTION else "callout note"
    return (
        f'<div class="{kind}" role="note"><p><strong>{escape(callout.title)}.</strong> '
        f"{_text(callout.text)}</p></div>"
    )


def _table(table: Table, counters: _Counters) -> str:
    counters.tables += 1
    name = f"t{counters.tables}"
    heads = "".join(_head(column) for column in table.columns)
    named = [(numbers.cell_text(row[0]), row) for row in table.rows]
    groups = [
        _row_group(name, [row for _, row in rows], table.columns)
        for name, rows in groupby(named, key=itemgetter(0))
    ]
    inside = "\n".join(groups)
    notes = "".join(f'<p class="notes">{_text(note)}</p>' for note in table.notes)
    return (
        f'<div class="tablebox"><div class="scroll" tabindex="0" role="region" '
        f'aria-labelledby="{name}">\n<table>\n<caption id="{name}"><span>Table '
        f"{counters.tables}. {_text(table.caption)}</span></caption>\n"
        f"<thead><tr>{heads}</tr></thead>\n"
        f"{inside}\n</table>\n</div>{notes}</div>"
    )


def _row_group(name: str, rows: Sequence[Sequence[Cell]], columns: Sequence[Column]) -> str:
    """Write rows of one name; the name stands once, over all of them."""
    span = f' rowspan="{len(rows)}"' if len(rows) > 1 else ""
    scope = "rowgroup" if len(rows) > 1 else "row"
    head = f'<th scope="{scope}"{span}>{_text(name)}</th>'
    written = []
    for row in rows:
        cells = "".join(
            _cell(cell, column) for cell, column in zip(row[1:], columns[1:], strict=True)
        )
        written.append(f"<tr>{head}{cells}</tr>")
        head = ""
    return "<tbody>\n" + "\n".join(written) + "\n</tbody>"


def _head(column: Column) -> str:
    unit = f' <span class="unit">[{escape(column.unit)}]</span>' if column.unit else ""
    kind = ' class="num"' if column.right else ""
    return f'<th scope="col"{kind}>{_text(column.heading)}{unit}</th>'


def _cell(cell: Cell, column: Column) -> str:
    text = escape(numbers.cell_text(cell))
    short = len(text) <= MAX_UNBROKEN  # a date would break at its hyphens
    kind = " ".join(
        name
        for name, holds in (("num", column.right), ("wide", column.wide), ("short", short))
        if holds
    )
    kind = f' class="{kind}"' if kind else ""
    return f"<td{kind}>{f'<strong>{text}</strong>' if cell.strong else text}</td>"


def _figure(figure: FigureNode, counters: _Counters) -> str:
    counters.figures += 1
    pixels = round(figure.width * PX_PER_INCH)
    kind, columns = _grid(len(figure.panels), pixels)
    key = f'<div class="key">{_picture(figure.key, counters)}</div>\n' if figure.key else ""
    panels = "\n".join(f"<div>{_picture(panel, counters)}</div>" for panel in figure.panels)
    return (
        f'<figure>\n{key}<div class="panels {kind}" style="grid-template-columns: {columns}">\n'
        f"{panels}\n</div>\n<figcaption><b>Figure {counters.figures}.</b> "
        f"{_text(figure.caption)}</figcaption>\n</figure>"
    )


def _grid(count: int, pixels: int) -> tuple[str, str]:
    """Panels fill a phone's width and stand side by side, near their own size, on a desk."""
    if count == 1:
        return "single", f"minmax(0, {round(1.4 * pixels)}px)"
    narrow = min(round(0.9 * pixels), 400)
    kind = "small" if pixels < 400 else "medium"
    return kind, f"repeat(auto-fill, minmax(min(100%, {narrow}px), 1fr))"


def _picture(panel: Panel, counters: _Counters) -> str:
    counters.pictures += 1
    name = f"p{counters.pictures}"
    svg = to_svg(panel.factory(), name)
    names = f'role="img" aria-labelledby="{name}-title {name}-desc"'
    words = (
        f'<title id="{name}-title">{escape(panel.title)}</title>'
        f'<desc id="{name}-desc">{escape(panel.alt)}</desc>'
    )
    head, rest = svg.split(">", 1)
    return f"{head} {names}>{words}{rest}"
