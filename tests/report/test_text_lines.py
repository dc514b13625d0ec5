"""Lines of a report: where they break, how wide they are, what cannot get into them."""

from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.cells import width
from melodycoach.report.text_lines import Line, Row, clean, heading, painted, table, tied, wrapped


def texts(lines: list[Line]) -> list[str]:
    return [line.text for line in lines]


def test_a_text_breaks_between_words_and_the_later_lines_are_indented() -> None:
    assert texts(wrapped("one two three four", 9, "- ", "  ")) == ["- one two", "  three", "  four"]


def test_a_word_that_is_wider_than_the_line_stands_alone() -> None:
    assert texts(wrapped("a hüseynîaşîran b", 6)) == ["a", "hüseynîaşîran", "b"]


def test_tied_words_and_a_number_with_its_percent_sign_stay_together() -> None:
    assert texts(wrapped(f"it is at {tied('bar 9, beat 1')}", 16)) == ["it is at", "bar 9, beat 1"]
    assert texts(wrapped("leaning to it, 89 %", 18)) == ["leaning to it,", "89 %"]


def test_lines_break_by_cells_not_by_letters() -> None:
    # East Asian Width of U+97F3 is W: Unicode Standard Annex 11
    assert texts(wrapped("音音 音音 音音", 9)) == ["音音 音音", "音音"]


def test_nothing_makes_no_line_but_a_label_alone_does() -> None:
    assert wrapped(" \n ", 40, "  ") == []
    assert texts(wrapped("", 40, "- label")) == ["- label"]


def test_a_text_is_tidied_and_its_tied_words_stay_tied() -> None:
    assert clean(f"{tied('bar 9')}\x1b[2J\n") == f"{tied('bar 9')}?[2J "


@given(st.text(), st.integers(8, 60))
def test_no_line_holds_a_control_character_or_breaks_the_width_where_it_could_wrap(
    text: str, columns: int
) -> None:
    for line in texts(wrapped(text, columns, "  ")):
        assert line.isprintable()
        assert line == line.rstrip()
        assert width(line) <= columns or len(line.split()) == 1 or tied("x x")[1] in text


def test_labels_stand_beside_their_texts_where_there_is_room() -> None:
    rows = [Row("a", "one two"), Row("long label", "three")]
    assert texts(table(rows, 80)) == ["  a           one two", "  long label  three"]


def test_labels_stand_above_their_texts_where_there_is_not() -> None:
    rows = [Row("note 12, line 3, column 7", "not in the mode", "off")]
    assert table(rows, 40) == [Line("  note 12, line 3, column 7", "off"), Line("    not in the mode")]
    assert table([], 40) == []


def test_a_heading_has_a_rule_of_its_width() -> None:
    assert texts(heading("At dusk", 40, "=")) == ["At dusk", "======="]
    assert texts(heading("one two three", 9)) == ["one two", "three", "-------"]


def test_colour_is_wrapped_round_lines_that_have_a_style_and_changes_no_word() -> None:
    lines = [Line("one", "off"), Line("two"), Line("", "strong")]
    assert painted(lines, colour=False) == "one\ntwo\n"
    assert painted(lines, colour=True) == "\x1b[31mone\x1b[0m\ntwo\n"
