from __future__ import annotations

import pytest

from vib.show.blocks import Bullets, Column, Facts, Heading, Sentence, Table, text_column, unit_label
from vib.show.terminal import plainer, render

LONG = "a description that is much longer than what is left of a line of eighty columns, so that it must wrap"


def table(rows, sums=0):
    return Table("Figures", (text_column("name"), Column("mass", "kg m^2"), text_column("words")), rows, sums)


@pytest.mark.parametrize("width", [60, 80, 200])
def test_no_line_is_wider_than_the_terminal(width):
    blocks = [
        Heading("T"),
        table((("a", "1.0", LONG), ("b", "20.0", LONG))),
        Bullets((LONG,)),
        Facts((("k", LONG),)),
    ]
    lines = render(blocks, width=width).splitlines()
    assert max(map(len, lines)) <= min(width, 120)
    assert not any(line.endswith(" ") for line in lines)


def test_figures_are_right_aligned_under_their_unit():
    lines = render([table((("a", "1.0", ""), ("b", "20.0", "")))]).splitlines()
    ends = [
        line.rstrip().index(mark) + len(mark)
        for line, mark in zip(lines[2:], ("kg·m²", "─", "1.0", "20.0"), strict=False)
    ]
    assert ends[0] == ends[2] == ends[3]


def test_a_heading_too_long_for_its_column_is_folded_and_never_cut():
    columns = tuple(Column(f"heading number {i}", "% of everything") for i in range(9))
    text = render([Table("", columns, (tuple("123" for _ in columns),))])
    assert max(map(len, text.splitlines())) <= 80
    assert text.count("123") == 9
    assert "".join(text.split()).count("g") >= 18  # all of heading and everything is there


def test_markup_and_emoji_in_names_are_plain_text():
    assert "[bold]x[/bold] :smile:" in render(
        [Sentence("[bold]x[/bold] :smile:"), table((("[red]", "1", ":x:"),))]
    )


def test_symbols_go_with_tones_and_colours_only_where_wanted():
    blocks = [Sentence("ok", "good"), Sentence("hm", "careful"), Sentence("no", "bad")]
    plain = render(blocks)
    assert [line[0] for line in plain.splitlines()] == ["✓", "▲", "✗"]
    assert "\x1b[" not in plain
    assert "\x1b[" in render(blocks, colour=True)


def test_a_poor_encoding_gets_words_instead():
    assert plainer("± 5 mm² ✓ é 漢", "ascii") == "+/- 5 mm^2 OK: \\xe9 \\u6f22"
    assert plainer("± é ✓", "latin-1") == "± é OK:"
    assert plainer("± ✓", "utf-8") == "± ✓"
    assert plainer("±", None) == "+/-"
    assert plainer("±", "no-such-codec") == "+/-"


def test_unit_labels():
    assert unit_label("kg m^2") == "kg·m²"
    assert unit_label("± Hz") == "± Hz"
    assert unit_label("% of mass") == "% of mass"
