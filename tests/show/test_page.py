"""The page: verdict first, self-contained, every name escaped."""

from __future__ import annotations

import html.parser
import re
from collections import Counter
from datetime import date

import pytest

from vib.show.page import render_page
from vib.show.words import CAUTION

VOID = {"meta", "br", "link", "img", "input", "hr"}


class Reader(html.parser.HTMLParser):
    """Collects tags, ids and visible text, and checks that tags are closed in order."""

    def __init__(self):
        super().__init__()
        self.tags: Counter[str] = Counter()
        self.ids, self.text, self.open = [], [], []
        self.references = []

    def handle_starttag(self, tag, attributes):
        self.tags[tag] += 1
        if tag not in VOID:
            self.open.append(tag)
        for name, value in attributes:
            assert not name.startswith("on"), f"{tag} has {name}"
            if name == "id":
                self.ids.append(value)
            if name in ("src", "href", "xlink:href", "action", "data"):
                self.references.append(value)

    def handle_startendtag(self, tag, attributes):
        self.handle_starttag(tag, attributes)
        if tag not in VOID:
            self.open.pop()

    def handle_endtag(self, tag):
        assert self.open.pop() == tag

    def handle_data(self, data):
        self.text.append(data)


def read(page):
    reader = Reader()
    reader.feed(page)
    reader.close()
    assert reader.open == []
    return reader


@pytest.fixture(scope="module")
def page(frame):
    return render_page(frame, date(2026, 1, 2))


def test_the_page_needs_nothing_else(page):
    reader = read(page)
    assert all(reference.startswith("#") for reference in reader.references)
    assert not set(reader.tags) & {
        "script",
        "link",
        "img",
        "iframe",
        "object",
        "embed",
        "form",
        "image",
        "foreignobject",
    }
    assert not re.search(r"@import|url\((?!#)", page)
    assert "default-src 'none'" in page


def test_ids_do_not_clash_and_every_reference_is_found(page):
    reader = read(page)
    assert [name for name, times in Counter(reader.ids).items() if times > 1] == []
    used = [reference[1:] for reference in reader.references] + re.findall(r"url\(#([^)]+)\)", page)
    assert set(used) <= set(reader.ids)


def test_names_are_text(page, frame):
    text = " ".join("".join(read(page).text).split())
    for name in (
        frame.study.title,
        "_legs $a_1$ <i>",
        "motor <svg onload=x>",
        "fan </title> $1$",
        "foot & pad",
    ):
        assert name in text
    assert "49" not in frame.study.title  # the template in the title was not run
    assert "{{ 7 * 7 }}" in text


def test_parts_come_in_order_with_verdict_first_and_caution_last(page):
    text = "".join(read(page).text)
    titles = ("Model", "Assumptions", "Modes", "Ring-down", "Resonance screening", "Numerical evidence")
    places = [text.index(mark) for mark in ("lie", *(f"\n{title}\n" for title in titles), CAUTION)]
    assert places == sorted(places)


def test_the_page_is_the_same_every_time(page, frame):
    assert render_page(frame, date(2026, 1, 2)) == page
    assert "2026-01-02" in page


def test_the_verdict_names_what_drives_which_mode(page, frame):
    verdict = page[page.index('class="verdict') : page.index("<h2>")]
    for row in frame.screening.objections:
        assert f"Mode {row.mode} at" in verdict
    assert frame.screening.objections


def test_evidence_is_told(page):
    text = " ".join("".join(read(page).text).split())
    for wanted in ("complete below", "± Hz", "condition number", "of the whole mass", "freedoms"):
        assert wanted in text


def test_an_unstable_study_without_forces_says_so_first_and_what_was_not_done(bare):
    page = render_page(bare)
    text = " ".join("".join(read(page).text).split())
    assert page.index("UNSTABLE") < page.index("<h2>")
    assert page[page.index('<section class="verdict') :].startswith('<section class="verdict bad"')
    assert text.index("UNSTABLE") < text.index("Not screened")
    assert "Not computed: the study has no [impact]." in text
    assert "Not done: the study names no [[excitations]]." in text
