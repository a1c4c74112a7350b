import re
from collections import Counter
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path

import pytest

from assess.decisions.results import RunRecord
from assess.report import words
from assess.report.content import build_document
from assess.report.document import BulletList, Document, Paragraph, Section, strong
from assess.report.html import render
from assess.report.writer import write_report

VOID = {"meta", "br", "link", "img", "hr", "input"}


class Page(HTMLParser):
    """Collects what the tests ask about; fails on tags that do not close."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.attributes: list[tuple[str, dict[str, str | None]]] = []
        self.words: list[str] = []
        self.open: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.attributes.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.attributes.append((tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        if self.open and self.open[-1] != "style":
            self.words.append(data)

    @property
    def text(self) -> str:
        return " ".join("".join(self.words).split())


@pytest.fixture(scope="module")
def page(html: str) -> Page:
    return Page(html)


def test_tags_balance(page: Page) -> None:
    assert page.open == []


def test_ids_are_unique_and_every_reference_has_its_target(page: Page) -> None:
    ids = [found["id"] for _, found in page.attributes if "id" in found]
    assert [name for name, number in Counter(ids).items() if number > 1] == []
    for _, found in page.attributes:
        for key in ("href", "clip-path"):
            for name in re.findall(r"#([^)\"]+)", found.get(key) or ""):
                assert name in ids
        for name in (found.get("aria-labelledby") or "").split():
            assert name in ids


def test_nothing_is_loaded_from_outside(html: str, page: Page) -> None:
    for tag, found in page.attributes:
        for key in ("src", "href", "xlink:href", "data", "action", "poster"):
            value = found.get(key)
            assert value is None or value.startswith(("#", "data:")), (tag, value)
    assert "script" not in {tag for tag, _ in page.attributes}
    assert not re.search(r"url\((?!#|data:)", html)
    assert "@import" not in html
    assert "@font-face" not in html


def test_language_viewport_skip_link_and_contents(page: Page) -> None:
    tags = dict(page.attributes)
    assert tags["html"]["lang"] == "en"
    metas = [found for tag, found in page.attributes if tag == "meta"]
    assert any(found.get("name") == "viewport" for found in metas)
    first = next(found for tag, found in page.attributes if tag == "a")
    assert first == {"class": "skip", "href": "#content"}
    assert "Contents" in page.text


def test_pictures_have_titles_and_tables_have_captions_and_scopes(html: str, page: Page) -> None:
    pictures = [found for tag, found in page.attributes if tag == "svg"]
    assert len(pictures) > 40
    assert all(found["role"] == "img" for found in pictures)
    assert html.count("<desc ") == len(pictures)
    assert html.count("<table>") == html.count("<caption ") > 10
    heads = [found for tag, found in page.attributes if tag == "th"]
    assert {found.get("scope") for found in heads} == {"col", "row", "rowgroup"}


def test_headings_descend_without_a_gap(page: Page) -> None:
    levels = [int(tag[1]) for tag, _ in page.attributes if re.fullmatch(r"h[1-6]", tag)]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert all(b - a <= 1 for a, b in zip(levels, levels[1:], strict=False))


def test_parts_come_in_their_order(page: Page) -> None:
    order = ["Table 1. Verdict", "What to read first", "What was asked", "Table 4. Data sets",
             "Index before and after the surveys The", "References Target"]  # fmt: skip
    body = page.text[page.text.index("Question.") :]  # behind the contents list
    places = [body.index(clue) for clue in order]
    assert places == sorted(places)


def test_same_run_gives_the_same_bytes(record: RunRecord, html: str, tmp_path: Path) -> None:
    path = tmp_path / "again.html"
    write_report(record, path)
    assert path.read_bytes() == html.encode()
    assert [item.name for item in tmp_path.iterdir()] == ["again.html"]


def test_text_is_escaped_everywhere(record: RunRecord) -> None:
    evil = '<script>alert("1")</script> & $\\frac$'
    variables = [replace(item, label=evil + str(k)) for k, item in enumerate(record.variables)]
    results = [replace(item, section=evil, note=evil) for item in record.results[:1]]
    results = [replace(item, stage=stage.name) for item in results for stage in record.stages]
    text = render(
        build_document(
            replace(
                record,
                title=evil,
                description=evil,
                doubts=[evil],
                assumptions=[evil],
                variables=variables,
                results=results,
                options=[],
                provenance=replace(record.provenance, command=evil),
            )
        )  # fmt: skip
    )
    assert "<script" not in text
    assert evil in Page(text).text


def test_invented_data_are_said_before_the_first_number(record: RunRecord, page: Page) -> None:
    assert page.text.index("invented for demonstration") < page.text.index("Question.")
    assert "invented" not in str(build_document(replace(record, invented=False)).lead)


def test_a_verdict_against_its_index_is_called_out(record: RunRecord, page: Page) -> None:
    assert "Verdict and index disagree" not in page.text
    higher = replace(record, target=replace(record.target, index=4.2))
    text = Page(render(build_document(higher))).text
    assert "Verdict and index disagree" in text[: text.index("Question.")]


def test_safe_is_never_said(page: Page) -> None:
    assert not re.search(r"\b(un)?safe(ly|ty)?\b", page.text, re.IGNORECASE)
    assert "licensed engineer" in page.text


def test_accepted_run_warns_in_every_section(unconverged: RunRecord) -> None:
    accepted = replace(unconverged, accepted_unconverged=True)
    document = build_document(accepted)
    text = render(document)
    parts = text.split("<section ")
    assert len(parts) == len(document.sections) + 1
    assert all(words.UNCONVERGED_TITLE in part for part in parts)
    assert words.WITHHELD not in Page(text).text


def test_unconverged_indices_are_withheld_everywhere(unconverged: RunRecord) -> None:
    text = Page(render(build_document(unconverged))).text
    last = unconverged.stages[-1].name
    hidden = [f"{r.reference.index[0]:.2f}" for r in unconverged.results if r.stage == last]
    earlier = {f"{r.reference.index[0]:.2f}" for r in unconverged.results if r.stage != last}
    start, end = text.index("Table 1."), text.index("What to read first", text.index("Table 1."))
    for value in set(hidden) - earlier:
        assert value not in text[start:end]
    assert text[start:end].count(words.WITHHELD) >= 6 * 6
    assert "Indices withheld" in text
    assert "after survey 2025-09-30 are withheld" in text


def test_withheld_indices_are_in_no_picture_description(unconverged: RunRecord) -> None:
    text = render(build_document(unconverged))
    described = " ".join(re.findall(r"<desc [^>]*>([^<]*)</desc>", text))
    assert "Index of each section" in described
    assert "4.35" not in described
    assert "2.61" not in described


def test_draws_of_an_unconverged_stage_carry_a_warning(unconverged: RunRecord) -> None:
    sections = render(build_document(unconverged)).split("<section ")
    for heading in ("What the surveys taught", "Dependence between the variables"):
        part = next(item for item in sections if f">{heading}</h2>" in item)
        assert "nothing may be concluded from them" in part


def test_a_record_without_results_is_refused(record: RunRecord) -> None:
    with pytest.raises(ValueError, match="3 stages and 0 results given"):
        build_document(replace(record, results=[]))


def test_a_single_prior_stage_makes_a_report(record: RunRecord) -> None:
    results = [item for item in record.results if item.stage == "prior"]
    alone = replace(record, stages=record.stages[:1], results=results, data=[], options=[],
                    conflicts=[], doubts=[])  # fmt: skip
    text = Page(render(build_document(alone))).text
    assert "No survey data were given" in text
    assert "before (prior)" in text


def test_nested_sections_and_emphasis() -> None:
    inner = Section("Inner", [Paragraph([strong("bold"), " plain"]), BulletList([["one"]])])
    text = render(Document("t", "s", [], [Section("Outer", [inner])]))
    assert '<h3 id="s1-1-h">Inner</h3>' in text
    assert "<p><strong>bold</strong> plain</p>" in text
    assert Page(text).open == []


def contrast(first: str, second: str) -> float:
    """WCAG 2.2 contrast ratio of two colours, from the definition of relative luminance."""

    def luminance(colour: str) -> float:
        parts = [int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)]
        linear = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
        return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]

    high, low = sorted((luminance(first), luminance(second)), reverse=True)
    return (high + 0.05) / (low + 0.05)


def test_contrast_of_text_is_aa(html: str) -> None:
    assert contrast("#000000", "#ffffff") == pytest.approx(21.0)
    names = dict(re.findall(r"--([a-z-]+): (#[0-9a-f]{6})", html))
    for name in ("ink", "soft", "accent"):
        assert contrast(names[name], "#ffffff") >= 4.5
        assert contrast(names[name], names["wash"]) >= 4.5
    assert contrast(names["warn"], names["warn-wash"]) >= 4.5
    for colour in set(re.findall(r"<text[^>]*fill: (#[0-9a-f]{6})", html)):
        assert contrast(colour, "#ffffff") >= 4.5, colour
