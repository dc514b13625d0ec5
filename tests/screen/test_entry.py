"""The entry: typing, played notes that arrive meanwhile, edits under way, refused words."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from hypothesis import given
from hypothesis import strategies as st

from melodycoach.screen import entry as typing
from melodycoach.screen import entry_edit, entry_merge
from melodycoach.screen.entry import Edit, Entry, entry_of
from melodycoach.screen.view import Refusal

if TYPE_CHECKING:
    pass

SENTENCE = "entry: no such note"


def readable(word: str) -> bool:
    """Stand for the reader of note text: whatever holds an x is no note."""
    return "x" not in word


def canonical(word: str) -> str:
    """Stand for the writer of note text: it may write a note otherwise than it was typed."""
    return word.replace("dügâh", "A4")


@dataclass
class Line:
    """The other end: a line that takes numbered edits, and played notes."""

    tokens: tuple[str, ...] = ()
    edits: list[tuple[Edit | None, int]] = field(default_factory=list)
    past: list[tuple[str, ...]] = field(default_factory=list)
    handled: int = 0
    refusals: tuple[Refusal, ...] = ()
    number: int = 0

    def send(self, entry: Entry) -> Entry:
        edit = typing.due(entry)
        if edit is None:
            return entry
        self.number += 1
        self.edits.append((edit, self.number))
        return typing.handed_over(entry, edit, self.number)

    def carry_out(self) -> None:
        if not self.edits:
            return
        edit, self.handled = self.edits.pop(0)
        if edit is None:
            self.tokens = self.past.pop() if self.past else self.tokens
            return
        wrong = tuple(word for word in edit.words if not readable(word))
        if wrong:
            self.refusals = (*self.refusals, Refusal(self.handled, SENTENCE, wrong))
        else:
            self.past.append(self.tokens)
            taken = tuple(map(canonical, edit.words))
            self.tokens = self.tokens[: edit.start] + taken + self.tokens[edit.stop :]

    def play(self, token: str) -> None:
        self.past.append(self.tokens)
        self.tokens += (token,)

    def undo(self, entry: Entry) -> Entry:
        self.number += 1
        self.edits.append((None, self.number))
        return typing.awaiting(entry, self.number)

    def answer(self, entry: Entry) -> Entry:
        return self.send(entry_merge.arrived(entry, self.tokens, self.handled, self.refusals))

    def settle(self, entry: Entry) -> Entry:
        for _ in range(100):
            entry = self.answer(entry)
            if not self.edits:
                return entry
            self.carry_out()
        raise AssertionError("the entry sends edits for ever")


def type_keys(line: Line, entry: Entry, keys: str) -> Entry:
    """Press keys one by one: ``<`` is backspace, ``[`` and ``]`` are left and right, ``$`` is Enter."""
    moves = {
        "<": entry_edit.erased_before,
        "[": entry_edit.moved_left,
        "]": entry_edit.moved_right,
        "$": entry_edit.confirmed,
    }
    for key in keys:
        entry = moves[key](entry) if key in moves else entry_edit.inserted(entry, key)
        entry = line.send(entry)
    return entry


def sent(line: Line) -> list[tuple[str, ...]]:
    """Give the words of the edits that are not carried out yet."""
    return [edit.words for edit, _ in line.edits if edit is not None]


def check(entry: Entry) -> None:
    """Assert what holds of every entry at every moment."""
    words = entry.text.split()
    assert len(entry.items) == len(words)
    taken = [item for item in entry.items if item is not None]
    assert taken == sorted(set(taken))
    for word, item in zip(words, entry.items, strict=True):
        assert item is None or word == entry.base[item]
    assert 0 <= entry.cursor <= len(entry.text)


# ------------------------------------------------------------------------------ worked cases


def test_a_space_hands_the_word_over() -> None:
    line = Line()
    entry = type_keys(line, entry_of(()), "A4")
    assert line.edits == []
    entry = type_keys(line, entry, " ")
    assert line.edits == [(Edit(0, 0, ("A4",), (), first=0), 1)]
    entry = line.settle(entry)
    assert (entry.text, entry.items, line.tokens) == ("A4 ", (0,), ("A4",))


def test_enter_hands_over_the_word_under_the_cursor_and_adds_a_space() -> None:
    line = Line()
    entry = line.settle(type_keys(line, entry_of(()), "A4$"))
    assert (line.tokens, entry.text, entry.cursor) == (("A4",), "A4 ", 3)


def test_words_typed_while_an_edit_is_under_way_wait_for_its_answer() -> None:
    line = Line()
    entry = type_keys(line, entry_of(()), "A4 B4 C5 ")
    assert sent(line) == [("A4",)]
    line.carry_out()
    entry = line.answer(entry)
    assert sent(line) == [("B4", "C5")]
    assert line.settle(entry).items == (0, 1, 2)


def test_a_typed_name_becomes_the_note_as_it_is_written() -> None:
    line = Line()
    entry = line.settle(type_keys(line, entry_of(()), "dügâh "))
    assert (entry.text, entry.cursor) == ("A4 ", 3)


def test_a_played_note_comes_before_the_word_being_typed() -> None:
    line = Line(("A4",))
    entry = type_keys(line, entry_of(line.tokens), "C")
    line.play("B4")
    entry = line.answer(entry)
    assert (entry.text, entry.items, entry.cursor) == ("A4 B4 C", (0, 1, None), 7)
    entry = line.settle(type_keys(line, entry, "5 "))
    assert line.tokens == ("A4", "B4", "C5")


def test_the_cursor_at_the_end_stays_behind_played_notes() -> None:
    line = Line()
    entry = entry_of(())
    for token in ("A4", "B4", "C5"):
        line.play(token)
        entry = line.answer(entry)
    assert (entry.text, entry.cursor) == ("A4 B4 C5 ", 9)


def test_the_cursor_in_the_middle_stays_where_it_is_while_notes_are_played() -> None:
    line = Line(("A4", "B4", "C5"))
    entry = entry_edit.moved_to(entry_of(line.tokens), 4)
    line.play("D5")
    entry = line.answer(entry)
    assert (entry.text, entry.cursor) == ("A4 B4 C5 D5 ", 4)


def test_retyping_a_word_in_the_middle_replaces_its_item_when_the_cursor_leaves_it() -> None:
    line = Line(("A4", "B4", "C5"))
    entry = entry_edit.moved_to(entry_of(line.tokens), 5)
    entry = type_keys(line, entry, "-1")
    assert line.edits == []
    entry = line.settle(type_keys(line, entry, "]"))
    assert line.tokens == ("A4", "B4-1", "C5")
    assert entry.text == "A4 B4-1 C5 "


def test_deleting_a_word_takes_its_item_away_at_once() -> None:
    line = Line(("A4", "B4", "C5"))
    entry = line.settle(type_keys(line, entry_of(line.tokens), "<<<"))
    assert line.tokens == ("A4", "B4")
    assert entry.text == "A4 B4 "


def test_a_deleted_word_can_be_typed_anew_in_its_place() -> None:
    line = Line(("A4", "B4", "C5"))
    entry = entry_edit.moved_to(entry_of(line.tokens), 5)
    entry = line.settle(type_keys(line, entry, "<<"))
    assert (line.tokens, entry.text) == (("A4", "C5"), "A4  C5 ")
    entry = line.settle(type_keys(line, entry, "G4 "))
    assert line.tokens == ("A4", "G4", "C5")


def test_a_word_typed_back_to_what_it_was_changes_nothing() -> None:
    line = Line(("A4", "B4-1"))
    entry = entry_edit.moved_to(entry_of(line.tokens), 7)
    entry = type_keys(line, entry, "<<-1 ")
    assert line.edits == []
    assert not typing.has_pending(entry)


def test_one_word_split_in_two_becomes_two_items() -> None:
    line = Line(("A4B4",))
    entry = entry_edit.moved_to(entry_of(line.tokens), 2)
    entry = line.settle(type_keys(line, entry, " $"))
    assert (line.tokens, entry.items) == (("A4", "B4"), (0, 1))


def test_two_words_joined_stand_for_both_items_until_they_are_parted() -> None:
    line = Line(("A4", "B4"))
    entry = type_keys(line, entry_edit.moved_to(entry_of(line.tokens), 3), "<")
    assert (entry.text, entry.items, line.edits) == ("A4B4 ", (None,), [])
    entry = type_keys(line, entry, " ")
    assert (entry.items, line.edits) == ((0, 1), [])


def test_a_refused_word_stays_is_marked_and_is_not_sent_again() -> None:
    line = Line(("A4",))
    entry = line.settle(type_keys(line, entry_of(line.tokens), "x5 "))
    assert (entry.text, entry.items, line.tokens) == ("A4 x5 ", (0, None), ("A4",))
    assert [span.state for span in typing.spans(entry)] == ["taken", "unreadable"]
    assert typing.complaint(entry) == SENTENCE
    assert typing.due(entry) is None


def test_notes_behind_a_refused_word_are_taken_all_the_same() -> None:
    line = Line()
    entry = line.settle(type_keys(line, entry_of(()), "A4 x5 B4 C5 "))
    assert line.tokens == ("A4", "B4", "C5")
    assert (entry.text, entry.items) == ("A4 x5 B4 C5 ", (0, None, 1, 2))


def test_a_refused_word_that_is_mended_lands_in_its_place() -> None:
    line = Line()
    entry = line.settle(type_keys(line, entry_of(()), "A4 x5 B4 "))
    entry = entry_edit.moved_to(entry, 4)
    entry = line.settle(type_keys(line, entry, "<G]$"))
    assert (line.tokens, entry.items) == (("A4", "G5", "B4"), (0, 1, 2))
    assert typing.complaint(entry) == ""


def test_enter_tries_a_refused_word_once_more() -> None:
    line = Line()
    entry = line.settle(type_keys(line, entry_of(()), "x5 "))
    entry = type_keys(line, entry, "$")
    assert sent(line) == [("x5",)]
    entry = line.settle(entry)
    assert typing.complaint(entry) == SENTENCE
    assert typing.due(entry) is None


def test_a_refused_word_in_place_of_an_item_leaves_the_line_as_it_was() -> None:
    line = Line(("A4", "B4", "C5"))
    entry = entry_edit.moved_to(entry_of(line.tokens), 4)
    entry = line.settle(type_keys(line, entry, "x$"))
    assert line.tokens == ("A4", "B4", "C5")
    assert (entry.text, entry.items) == ("A4 Bx4 C5 ", (0, None, 2))
    line.play("D5")
    assert line.answer(entry).text == "A4 Bx4 C5 D5 "


def test_a_refusal_without_words_marks_the_whole_edit() -> None:
    entry = entry_edit.inserted(entry_of(()), "A4 B4 ")
    edit = typing.due(entry)
    assert edit is not None
    entry = entry_merge.arrived(typing.handed_over(entry, edit, 1), (), 1, (Refusal(1, "why"),))
    assert [span.state for span in typing.spans(entry)] == ["unreadable", "unreadable"]


def test_a_refused_deletion_shows_the_tokens_again() -> None:
    entry = entry_edit.erased_before(
        entry_edit.erased_before(entry_edit.erased_before(entry_of(("A4", "B4"))))
    )
    edit = typing.due(entry)
    assert edit == Edit(1, 2, (), ("B4",), 1)
    entry = entry_merge.arrived(typing.handed_over(entry, edit, 1), ("A4", "B4"), 1, (Refusal(1, "no"),))
    assert entry.text.split() == ["A4", "B4"]
    assert typing.due(entry) is None


def test_a_played_note_that_grows_is_rewritten_in_place() -> None:
    line = Line(("A4", "B4"))
    entry = type_keys(line, entry_of(line.tokens), "C5")
    line.tokens = ("A4", "B4:2")
    entry = line.answer(entry)
    assert (entry.text, entry.cursor) == ("A4 B4:2 C5", 10)


def test_undo_elsewhere_takes_words_away_but_not_what_is_being_typed() -> None:
    line = Line(("A4", "B4", "C5"))
    entry = type_keys(line, entry_of(line.tokens), "D")
    line.tokens = ("A4",)
    entry = line.answer(entry)
    assert (entry.text, entry.items, entry.cursor) == ("A4 D", (0, None), 4)


def test_nothing_is_handed_over_before_undo_is_answered() -> None:
    line = Line(("A4", "B4"))
    entry = typing.awaiting(entry_of(line.tokens), 7)
    entry = type_keys(line, entry, "C5 ")
    assert line.edits == []
    line.tokens, line.handled = ("A4",), 7
    entry = line.settle(entry)
    assert line.tokens == ("A4", "C5")
    assert entry.text == "A4 C5 "


def test_a_refusal_is_seen_although_undo_was_pressed_before_it_came() -> None:
    line = Line(("A4",))
    entry = line.undo(type_keys(line, entry_of(line.tokens), "x5 "))
    assert line.settle(entry).text == "A4 x5 "


def test_pending_words_can_be_taken_back_and_brought_again() -> None:
    entry = entry_edit.inserted(entry_of(("A4",)), "B4")
    plain = typing.taken_back(entry)
    assert (plain.text, typing.has_pending(plain)) == ("A4 ", False)
    assert typing.brought_again(plain) == entry
    other = entry_merge.arrived(plain, ("A4", "C5"), 0)
    assert typing.brought_again(other) is None
    assert typing.brought_again(entry) is None


def test_the_item_under_the_cursor_is_known() -> None:
    entry = entry_of(("A4", "B4"))
    assert [typing.item_at(entry_edit.moved_to(entry, place)) for place in range(7)] == [
        0,
        0,
        0,
        1,
        1,
        1,
        None,
    ]


def test_the_whole_line_can_be_exchanged_under_the_entry() -> None:
    entry = entry_merge.arrived(entry_of(("A4", "B4", "C5")), ("G4", "F4", "E4"), 0)
    assert (entry.text, entry.items) == ("G4 F4 E4 ", (0, 1, 2))
    assert entry_merge.arrived(entry, (), 0).text.strip() == ""


# -------------------------------------------------------------------------------------- laws

KEYS = st.sampled_from(["A4", "B", "4", "-", "1", " ", "<", "[", "]", "$", "x", "C5 ", "dügâh "])
ACTIONS = st.one_of(
    KEYS.map(lambda keys: ("type", keys)),
    st.sampled_from(["D5", "E5", "D5:2"]).map(lambda token: ("play", token)),
    st.just(("carry out", "")),
    st.just(("answer", "")),
    st.just(("undo", "")),
    st.integers(0, 40).map(lambda place: ("move", str(place))),
)


def act(line: Line, entry: Entry, action: tuple[str, str]) -> Entry:
    """Do one thing, at either end."""
    match action:
        case ("type", keys):
            return type_keys(line, entry, keys)
        case ("play", token):
            line.play(token)
        case ("carry out", _):
            line.carry_out()
        case ("answer", _):
            return line.answer(entry)
        case ("undo", _):
            return line.undo(entry)
        case ("move", place):
            return line.send(entry_edit.moved_to(entry, int(place)))
    return entry


@given(st.lists(st.sampled_from(["A4", "B4-1", "C5"]), max_size=5), st.lists(ACTIONS, max_size=40))
def test_text_and_line_agree_once_everything_is_answered(
    start: list[str], actions: list[tuple[str, str]]
) -> None:
    line = Line(tuple(start))
    entry = entry_of(line.tokens)
    for action in actions:
        entry = act(line, entry, action)
        check(entry)
    entry = line.settle(line.send(entry_edit.confirmed(line.settle(entry))))
    check(entry)
    assert entry.base == line.tokens
    assert all(span.state != "pending" for span in typing.spans(entry))
    words = [word for word in entry.text.split() if readable(word)]
    if len(words) == len(entry.text.split()):
        assert tuple(words) == line.tokens


WORDS = st.sampled_from(["A4", "B4-1", "C5", "x", ",", "."])


@given(
    st.lists(st.one_of(WORDS, st.sampled_from(["play D5", "play E5", "carry out", "answer"])), max_size=40)
)
def test_nothing_typed_or_played_is_lost_and_each_keeps_its_order(moments: list[str]) -> None:
    line = Line()
    entry = entry_of(())
    typed: list[str] = []
    played: list[str] = []
    for moment in moments:
        if moment.startswith("play "):
            played.append(moment[5:])
            line.play(moment[5:])
        elif moment == "carry out":
            line.carry_out()
        elif moment == "answer":
            entry = line.answer(entry)
        else:
            typed.append(moment)
            entry = type_keys(line, entry_edit.moved_to_end(entry), moment + " ")
        check(entry)
    entry = line.settle(entry)
    words = entry.text.split()
    assert [word for word in words if word in {"D5", "E5"}] == played
    assert [word for word in words if word not in {"D5", "E5"}] == typed
    assert [word for word in line.tokens if word not in {"D5", "E5"}] == [w for w in typed if readable(w)]


@given(
    st.lists(
        st.sampled_from(["A4", "x1", "x2", "play", "undo", "carry out", "answer"]), min_size=1, max_size=40
    )
)
def test_words_that_cannot_be_read_stay_whatever_happens_to_the_line(moments: list[str]) -> None:
    line = Line()
    entry = entry_of(())
    for moment in moments:
        match moment:
            case "play":
                line.play("D5")
            case "undo":
                entry = line.undo(entry)
            case "carry out":
                line.carry_out()
            case "answer":
                entry = line.answer(entry)
            case _:
                entry = type_keys(line, entry_edit.moved_to_end(entry), moment + " ")
        check(entry)
    entry = line.settle(entry)
    wrong = [word for word in entry.text.split() if not readable(word)]
    assert wrong == [moment for moment in moments if moment in {"x1", "x2"}]
    assert tuple(word for word in entry.text.split() if readable(word)) == line.tokens


@given(
    st.lists(st.sampled_from(["A4", "B4", "C5"]), min_size=1, max_size=6),
    st.data(),
    st.lists(st.sampled_from(["D5", "E5"]), max_size=4),
)
def test_an_edit_inside_the_line_and_played_notes_commute(
    start: list[str], data: st.DataObject, played: list[str]
) -> None:
    word = data.draw(st.integers(0, len(start) - 1))
    keys = data.draw(st.sampled_from(["-1 ", "<<", "<<G4 ", " F5 "]))

    def edit(line: Line, entry: Entry) -> Entry:
        end = [span.hi for span in typing.spans(entry)][word]
        return line.settle(type_keys(line, entry_edit.moved_to(entry, end), keys))

    def play(line: Line, entry: Entry) -> Entry:
        for token in played:
            line.play(token)
        return line.settle(entry)

    outcomes = []
    for order in ((edit, play), (play, edit)):
        line = Line(tuple(start))
        entry = entry_of(line.tokens)
        for step in order:
            entry = step(line, entry)
        outcomes.append((line.tokens, entry.text.split()))
    assert outcomes[0] == outcomes[1]
