"""The coach: what is played, typed and asked for becomes one session, one log and one view."""

from datetime import datetime
from pathlib import Path

import mido
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from melodycoach.coach import REFUSALS_KEPT, Coach
from melodycoach.core.event import Event, NoteOff, NoteOn, PitchReading
from melodycoach.core.note import InputKind, Note
from melodycoach.core.session import SessionState, begin
from melodycoach.core.sheet import SheetKind
from melodycoach.errors import UnknownNameError
from melodycoach.line_text import Page, entry_items, read_final
from melodycoach.screen.command import (
    Fresh,
    Open,
    Quit,
    Redo,
    ReplaceText,
    Save,
    SetFinal,
    SetOnly,
    SetPort,
    SetTarget,
    Undo,
)
from melodycoach.screen.view import ViewState
from melodycoach.sources.event_json import LogHeader
from melodycoach.sources.event_log import EventLog
from melodycoach.sources.note_text import Headers, item_token
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
ONLY = ("makam/huseyni", "makam/rast", "makam/hicaz")


class StillClock:
    def __init__(self) -> None:
        self.now_s = 0.0

    def __call__(self) -> float:
        return self.now_s


class Hands:
    """A player whose notes the test decides."""

    def __init__(self) -> None:
        self.events: list[Event] = []
        self.chosen: list[str] = []
        self.asks = False
        self.closed = False

    def poll(self, now_s: float) -> list[Event]:
        due = [event for event in self.events if event.at_s <= now_s]
        self.events = [event for event in self.events if event.at_s > now_s]
        return due

    def input_line(self, now_s: float) -> str:
        return "listening to two hands"

    def tuning_line(self) -> str:
        return "plain keys"

    def inputs(self) -> tuple[str, ...]:
        return ()

    def asks_input(self) -> bool:
        return self.asks

    def choose(self, name: str) -> None:
        self.chosen.append(name)

    def is_over(self, now_s: float) -> bool:
        return not self.events

    def close(self) -> None:
        self.closed = True


@pytest.fixture
def clock() -> StillClock:
    return StillClock()


@pytest.fixture
def hands() -> Hands:
    return Hands()


@pytest.fixture
def coach(clock: StillClock, hands: Hands) -> Coach:
    return Coach(begin(PACK, ONLY), hands, clock)


def asked(coach: Coach, *commands: object) -> ViewState:
    for command in commands:
        coach.send(command)  # type: ignore[arg-type]
    coach.turn()
    return coach.view


def test_played_notes_appear_in_the_view_as_tokens(coach: Coach, hands: Hands, clock: StillClock) -> None:
    hands.events = [
        NoteOn(0.1, 69, 6900.0, InputKind.KEYS),
        NoteOff(0.9, 69),
        NoteOn(1.0, 71, 7100.0, InputKind.KEYS),
    ]
    clock.now_s = 1.1
    assert coach.turn()
    assert coach.view.tokens[0].startswith("A4~")
    assert [note.number for note in coach.view.line] == [1, 2]


@pytest.mark.parametrize(
    ("home", "shown"), [("", str(Path("~") / "sessions" / "may.jsonl")), ("elsewhere", "")]
)
def test_where_the_log_goes_is_said_from_the_player_s_own_folder_on(
    hands: Hands, clock: StillClock, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, home: str, shown: str
) -> None:
    for variable in ("HOME", "USERPROFILE"):  # the second one on Windows
        monkeypatch.setenv(variable, str(tmp_path / home))
    path = tmp_path / "sessions" / "may.jsonl"
    header = LogHeader("0.1.0", datetime(2026, 5, 1, 18, 4, 9), "makam")
    coach = Coach(begin(PACK, ONLY), hands, clock, EventLog(path, header))
    assert coach.view.status.log_line == f"log: {shown or path}"
    coach.close()


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="this system has no /dev/full")
def test_a_log_that_fails_is_warned_of_and_playing_goes_on(
    hands: Hands, clock: StillClock, tmp_path: Path
) -> None:
    header = LogHeader("0.1.0", datetime(2026, 5, 1, 18, 4, 9), "makam")
    log = EventLog(tmp_path / "may.jsonl", header)
    coach = Coach(begin(PACK, ONLY), hands, clock, log)
    assert log._file is not None
    log._file.close()
    with Path("/dev/full").open("ab", buffering=0) as full:
        log._file = full  # the disk fills up while one plays
        hands.events = [NoteOn(0.1 * n, 60 + n, 6000.0 + 100 * n, InputKind.KEYS) for n in range(1, 4)]
        clock.now_s = 1.0
        coach.turn()
        assert "no space left on device; playing goes on" in coach.view.status.warning
        assert len(coach.view.line) == 3
        assert asked(coach, Undo()).status.warning == ""  # said once
        coach.close()


def test_what_the_player_is_told_at_the_start_stands_until_something_is_asked(
    hands: Hands, clock: StillClock
) -> None:
    coach = Coach(begin(PACK, ONLY), hands, clock, notice="the session of May goes on")
    assert coach.view.status.notice == "the session of May goes on"
    assert asked(coach, Undo()).status.notice == ""


def test_the_view_says_when_the_player_has_to_choose_an_input(coach: Coach, hands: Hands) -> None:
    coach.turn()
    assert not coach.view.status.asks_input
    hands.asks = True
    assert coach.turn()
    assert coach.view.status.asks_input


def test_a_turn_with_nothing_new_publishes_nothing(coach: Coach) -> None:
    coach.turn()
    view = coach.view
    assert not coach.turn()
    assert coach.view is view


def test_typed_text_becomes_notes(coach: Coach) -> None:
    view = asked(coach, ReplaceText(0, 0, "E5 dügâh B4-1:2 .", 1))
    assert view.tokens == ("E5", "A4", "B4-1:2", ".")
    assert view.handled == 1
    assert view.refusals == ()


def test_a_word_that_cannot_be_read_is_refused_with_its_place_and_takes_nothing(coach: Coach) -> None:
    view = asked(coach, ReplaceText(0, 0, "E5 H5 D5", 7))
    assert view.tokens == ()
    assert view.handled == 7
    assert [refusal.number for refusal in view.refusals] == [7]
    assert view.refusals[0].words == ("H5",)
    assert "H5" in view.status.warning


def test_the_newest_refusals_are_kept(coach: Coach) -> None:
    view = asked(coach, *(SetTarget("nothing such", number) for number in range(1, 20)))
    assert [refusal.number for refusal in view.refusals] == list(range(20 - REFUSALS_KEPT, 20))


def test_undo_redo_and_fresh_start_work_through_commands(coach: Coach) -> None:
    asked(coach, ReplaceText(0, 0, "E5 D5"))
    assert asked(coach, ReplaceText(2, 2, "C5")).tokens == ("E5", "D5", "C5")
    assert asked(coach, Undo()).tokens == ("E5", "D5")
    assert asked(coach, Redo()).tokens == ("E5", "D5", "C5")
    assert asked(coach, Fresh()).tokens == ()


def test_a_target_is_found_in_any_spelling_and_shown(coach: Coach) -> None:
    view = asked(coach, SetTarget("HÜSEYNÎ"))
    assert (view.in_view, view.is_target) == ("Hüseynî", True)
    assert not asked(coach, SetTarget(None)).is_target


def test_final_and_competing_modes_can_be_set(coach: Coach) -> None:
    view = asked(coach, SetFinal("nevâ"), SetOnly("rast, mahur"))
    assert view.reading == "final given: nevâ"
    assert view.restricted == "only Rast, Mahur"
    assert asked(coach, SetOnly("")).restricted.startswith("all ")


@pytest.mark.parametrize(
    ("text", "reading"), [("any", PitchReading.ANY), (" Written ", PitchReading.WRITTEN)]
)
def test_the_final_can_be_left_open(text: str, reading: PitchReading) -> None:
    assert read_final(text, PACK.names) == (reading, None)


@pytest.mark.parametrize("text", ["", "A4 B4", "-", "nowhere"])
def test_a_final_that_is_no_single_pitch_is_refused(text: str) -> None:
    with pytest.raises(UnknownNameError) as error:
        read_final(text, PACK.names)
    assert str(error.value) == (
        f"final: found {text!r}, expected one pitch such as A4 or dügâh, or 'written' or 'any'"
    )


def test_a_saved_line_opens_again_as_it_was(coach: Coach, tmp_path: Path) -> None:
    path = tmp_path / "new" / "line.txt"
    asked(coach, SetTarget("rast"), ReplaceText(0, 0, "G4 A4 B4-1:2 , C5 ."))
    assert asked(coach, Save(str(path))).status.notice == f"saved as {path}"
    asked(coach, Fresh(), SetTarget(None))
    view = asked(coach, Open(str(path)))
    assert view.tokens == ("G4", "A4", "B4-1:2", ",", "C5", ".")
    assert view.in_view == "Rast"


def test_what_is_let_go_of_a_long_line_is_said(
    coach: Coach, hands: Hands, clock: StillClock, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("melodycoach.core.session.LONGEST_LINE", 8)
    monkeypatch.setattr("melodycoach.core.session.SHORTEST_LIMIT", 8)
    monkeypatch.setattr("melodycoach.core.session.KEPT_OF_LINE", 3)
    for number in range(9):
        hands.events = [NoteOn(number / 4, 69 + number % 3, 6900.0 + 100 * (number % 3), InputKind.KEYS)]
        clock.now_s = number / 4
        coach.turn()
    assert len(coach.view.tokens) == 4
    assert coach.view.status.notice == (
        "the line had grown long: its first 5 notes and marks are in the log now, and undo brings them back"
    )
    assert len(asked(coach, Undo()).tokens) == 8


def test_the_place_to_save_is_that_of_the_line_until_another_is_begun(coach: Coach, tmp_path: Path) -> None:
    path = tmp_path / "line.txt"
    assert coach.save_path().name.startswith("line-20")
    asked(coach, ReplaceText(0, 0, "G4 A4"), Save(str(path)))
    assert coach.save_path() == path
    asked(coach, Fresh())
    assert coach.save_path() != path
    asked(coach, Open(str(path)))
    assert coach.save_path() == path


def test_a_line_that_cannot_be_saved_is_kept_and_that_is_said(coach: Coach, tmp_path: Path) -> None:
    (tmp_path / "file").write_text("in the way")
    path = tmp_path / "file" / "line.txt"
    asked(coach, ReplaceText(0, 0, "G4"))
    view = asked(coach, Save(str(path), 5))
    assert "the line is still here" in view.status.warning
    assert view.refusals[-1].number == 5
    assert view.tokens == ("G4",)


@pytest.mark.parametrize(
    ("content", "said"),
    [
        (None, "no such file or directory; name a file of note text"),
        (b"\xff\xfe\x00", "byte 2 is not UTF-16 text"),
    ],
)
def test_a_file_that_cannot_be_opened_is_refused(
    coach: Coach, tmp_path: Path, content: bytes | None, said: str
) -> None:
    path = tmp_path / "line.txt"
    if content is not None:
        path.write_bytes(content)
    asked(coach, ReplaceText(0, 0, "G4"))
    view = asked(coach, Open(str(path)))
    assert said in view.status.warning
    assert view.tokens == ("G4",)


MIDI_KEYS = (69, 76, 74, 69)


@pytest.fixture
def midi(tmp_path: Path) -> Path:
    """Let mido, which is not us, write a line of plain keys."""
    file, track = mido.MidiFile(), mido.MidiTrack()
    file.tracks.append(track)
    for key in MIDI_KEYS:
        track += [mido.Message("note_on", note=key), mido.Message("note_off", note=key, time=480)]
    file.save(tmp_path / "draft.mid")
    return tmp_path / "draft.mid"


def test_a_midi_file_opens_in_the_entry_and_what_was_read_is_said(
    coach: Coach, clock: StillClock, midi: Path
) -> None:
    clock.now_s = 1.0
    view = asked(coach, Open(str(midi)))
    pitches = [token.partition(":")[0] for token in view.tokens]
    assert pitches[: len(MIDI_KEYS)] == ["A4~", "E5~", "D5~", "A4~"]
    assert "took track 1" in view.status.notice
    assert view.status.notice.endswith("; save the line as draft.txt")
    assert view.status.warning == ""
    last = coach.session.line.last_note
    assert last is not None
    assert last.onset_s + last.duration_s == pytest.approx(1.0)  # what is played next comes after it


def test_the_line_of_a_midi_file_is_saved_as_note_text_and_never_over_it(
    coach: Coach, midi: Path, tmp_path: Path
) -> None:
    before = midi.read_bytes()
    asked(coach, Open(str(midi)))
    for _ in range(3):  # however often it is asked for
        view = asked(coach, Save(str(midi)))
        assert view.status.warning
    assert midi.read_bytes() == before
    assert f"save it as {tmp_path / 'draft.txt'}" in view.status.warning
    asked(coach, Save(str(tmp_path / "draft.txt")))
    tokens = coach.view.tokens
    assert asked(coach, Open(str(tmp_path / "draft.txt"))).tokens[0] == tokens[0]


def score(tmp_path: Path) -> Path:
    path = tmp_path / "draft.musicxml"
    path.write_text(
        '<score-partwise version="4.0"><part-list><score-part id="P1"><part-name>Ney</part-name>'
        '</score-part></part-list><part id="P1"><measure number="1"><attributes><divisions>1</divisions>'
        "</attributes><note><pitch><step>A</step><octave>4</octave></pitch><duration>1</duration></note>"
        "</measure></part></score-partwise>",
        encoding="utf-8",
    )
    return path


def test_a_score_opens_in_the_entry_as_typed_notes(coach: Coach, tmp_path: Path) -> None:
    view = asked(coach, Open(str(score(tmp_path))))
    assert view.tokens[0] == "A4"
    assert view.status.notice.endswith("; save the line as draft.txt")


def test_a_mode_that_a_score_names_and_the_pack_does_not_have_is_passed_over(
    coach: Coach, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    page = Page(Headers(mode="major"), kind=SheetKind.MUSIC_XML, says=("took part 1",), lost=("bar 3",))
    items = (Note(6900.0, 0.0, 1.0, beats=1.0),)
    monkeypatch.setattr("melodycoach.coach.open_line", lambda *_: (page, items))
    view = asked(coach, Open(str(tmp_path / "draft.xml")))
    assert view.status.notice == "took part 1; save the line as draft.txt"
    assert view.status.warning == (
        "bar 3; the file names the mode 'major', which pack 'makam' does not have: it is passed over"
    )
    asked(coach, Save(str(tmp_path / "draft.txt")))
    assert "mode" not in (tmp_path / "draft.txt").read_text(encoding="utf-8")


def test_a_port_is_chosen_by_the_player(coach: Coach, hands: Hands) -> None:
    asked(coach, SetPort("USB"))
    assert hands.chosen == ["USB"]


def test_quit_asks_the_screen_to_leave(coach: Coach) -> None:
    asked(coach, Quit())
    assert coach.wants_to_quit


def test_each_note_that_ends_is_told_with_what_was_known_then(hands: Hands, clock: StillClock) -> None:
    told: list[ViewState] = []
    coach = Coach(begin(PACK, ONLY), hands, clock, on_note=told.append)
    hands.events = [
        NoteOn(0.1, 69, 6900.0, InputKind.KEYS),
        NoteOn(0.5, 71, 7100.0, InputKind.KEYS),
        NoteOff(0.6, 69),
        NoteOff(0.9, 71),
    ]
    clock.now_s = 5.0
    coach.turn()
    assert [view.n_notes for view in told] == [1, 2]


def test_a_chord_is_told_once_and_a_grace_note_beside_its_main_note(hands: Hands, clock: StillClock) -> None:
    told: list[str] = []
    coach = Coach(begin(PACK, ONLY), hands, clock, on_note=lambda view: told.append(view.tokens[-1]))
    keys = InputKind.KEYS
    chord = NoteOn(0.0, 60, 6000.0, keys), NoteOn(0.01, 72, 7200.0, keys), NoteOff(0.5, 60), NoteOff(0.5, 72)
    grace = NoteOn(1.0, 71, 7100.0, keys), NoteOn(1.02, 69, 6900.0, keys), NoteOff(1.06, 71)
    hands.events = [*chord, *grace, NoteOn(1.5, 71, 7100.0, keys), NoteOff(1.9, 71)]
    clock.now_s = 2.0
    coach.turn()
    assert [token[:3] for token in told] == ["C5~", "B4~", "A4~", "B4~"]


def test_text_put_behind_the_line_is_told_note_by_note_with_its_marks(
    hands: Hands, clock: StillClock
) -> None:
    told: list[ViewState] = []
    coach = Coach(begin(PACK, ONLY), hands, clock, on_note=told.append)
    coach.append_text("E5 D5 , A4 .")
    assert [view.tokens for view in told] == [("E5",), ("E5", "D5", ","), ("E5", "D5", ",", "A4", ".")]


def test_a_word_that_cannot_be_read_is_left_out_of_what_is_put_behind_the_line(coach: Coach) -> None:
    coach.append_text("E5 X9 D5 .")
    coach.turn()
    assert coach.view.tokens == ("E5", "D5", ".")
    assert coach.view.status.warning.startswith("'X9' is neither a note nor a pitch name")


def test_a_sounding_note_grows_in_the_view_while_the_clock_runs(
    coach: Coach, hands: Hands, clock: StillClock
) -> None:
    hands.events = [NoteOn(0.0, 69, 6900.0, InputKind.KEYS)]
    coach.turn()
    clock.now_s = 0.6
    assert coach.turn()
    assert coach.view.line[0].rests
    assert coach.view.line[0].length_s == pytest.approx(0.6)


def test_closing_closes_the_player(coach: Coach, hands: Hands) -> None:
    coach.close()
    assert hands.closed


def test_a_long_line_is_shown_from_its_newest_notes(clock: StillClock, hands: Hands) -> None:
    session: SessionState = begin(PACK, ONLY)
    coach = Coach(session, hands, clock)
    view = asked(coach, ReplaceText(0, 0, "A4 " * 400))
    assert len(view.tokens) == 400
    assert view.line[-1].number == 400
    assert len(view.line) < 400
    assert all(isinstance(item, Note) for item in coach.session.line.items)


def test_the_entry_writes_a_played_note_as_what_was_heard_in_it(
    coach: Coach, hands: Hands, clock: StillClock
) -> None:
    for number in range(5):
        hands.events += [NoteOn(float(number), 69, 6900.0, InputKind.KEYS), NoteOff(number + 0.9, 69)]
    hands.events += [NoteOn(5.0, 71, 7100.0, InputKind.KEYS), NoteOff(7.0, 71)]
    hands.events += [NoteOn(7.1, 72, 7200.0, InputKind.KEYS), NoteOff(7.9, 72)]
    clock.now_s = 12.0
    coach.turn()
    assert coach.view.tokens == ("A4~:2", "A4~", "A4~", "A4~", "A4~", "B4~:2", "C5~", ".")


def test_a_played_line_is_saved_at_its_own_pace(
    coach: Coach, hands: Hands, clock: StillClock, tmp_path: Path
) -> None:
    for number in range(6):
        hands.events += [NoteOn(number * 0.5, 69, 6900.0, InputKind.KEYS), NoteOff(number * 0.5 + 0.5, 69)]
    clock.now_s = 9.0
    coach.turn()
    path = tmp_path / "line.txt"
    asked(coach, Save(str(path)))
    assert path.read_text(encoding="utf-8") == "tempo: 120\n\nA4~ A4~ A4~ A4~ A4~ A4~ .\n"


def test_a_comment_typed_into_the_live_line_is_refused_and_not_swallowed(coach: Coach) -> None:
    view = asked(coach, ReplaceText(0, 0, "E5 #5 D5", 3))
    assert view.tokens == ()
    assert view.refusals[0].words == ("#5",)
    assert "a sharp stands behind its letter: F#5" in view.status.warning


def test_comments_and_headers_of_a_file_survive_editing_and_saving(coach: Coach, tmp_path: Path) -> None:
    path = tmp_path / "line.txt"
    path.write_text(
        "title: Sketch\ntempo: 60\n\n# first\nG4 A4 # here\nB4-1 , C5 .\n# last\n", encoding="utf-8"
    )
    asked(coach, Open(str(path)))
    asked(coach, ReplaceText(1, 1, "F#4"), Save(str(path)))
    assert path.read_text(encoding="utf-8") == (
        "title: Sketch\ntempo: 60\n\n# first\nG4 F#4 A4 # here\nB4-1 , C5 .\n# last\n"
    )


def test_another_file_is_replaced_only_when_asked_for_twice(coach: Coach, tmp_path: Path) -> None:
    path = tmp_path / "other.txt"
    path.write_text("G4\n", encoding="utf-8")
    asked(coach, ReplaceText(0, 0, "A4"))
    view = asked(coach, Save(str(path), 2))
    assert view.status.warning == f"{path} is there already; save again to replace it, or choose another name"
    assert path.read_text(encoding="utf-8") == "G4\n"
    assert asked(coach, Save(str(path), 3)).status.notice == f"saved as {path}"
    assert path.read_text(encoding="utf-8") == "A4\n"


def test_a_header_with_an_unknown_mode_leaves_the_line_as_it_was(coach: Coach, tmp_path: Path) -> None:
    path = tmp_path / "line.txt"
    path.write_text("mode: rasst\nG4\n", encoding="utf-8")
    asked(coach, ReplaceText(0, 0, "A4"))
    view = asked(coach, Open(str(path)))
    assert "did you mean 'rast'" in view.status.warning
    assert view.tokens == ("A4",)


STEPS = st.lists(
    st.one_of(
        st.tuples(st.just("key"), st.integers(60, 72), st.sampled_from([0.2, 0.3, 1.2, 3.0])),
        st.tuples(st.just("text"), st.integers(0, 6), st.sampled_from(["A4", "B4-1 ,", "C5:2 .", ""])),
        st.tuples(st.just("undo"), st.just(0), st.just("")),
        st.tuples(st.just("redo"), st.just(0), st.just("")),
    ),
    max_size=14,
)


@settings(max_examples=40, deadline=None)
@given(STEPS)
def test_the_tokens_kept_from_view_to_view_are_those_of_the_line(
    steps: list[tuple[str, int, object]],
) -> None:
    clock, hands = StillClock(), Hands()
    coach = Coach(begin(PACK, ("makam/rast",)), hands, clock)
    for what, number, more in steps:
        clock.now_s += 0.05
        if what == "key":
            hands.events = [NoteOn(clock.now_s, number, 100.0 * number, InputKind.KEYS)]
            coach.turn()
            clock.now_s += float(more)  # type: ignore[arg-type]
            hands.events = [NoteOff(clock.now_s - 0.1, number)]
            coach.turn()
        elif what == "text":
            asked(coach, ReplaceText(number, number + 1, str(more)))
        else:
            asked(coach, Undo() if what == "undo" else Redo())
        coach.turn()
        line = coach.session.line
        assert coach.view.tokens == tuple(item_token(item, PACK.names) for item in entry_items(line))


def test_a_final_in_the_header_is_taken_as_given_and_saved_again(coach: Coach, tmp_path: Path) -> None:
    path = tmp_path / "line.txt"
    path.write_text("final: D5\n\nG5 F5 E5-1 D5 .\n", encoding="utf-8")
    assert asked(coach, Open(str(path))).reading == "final given: nevâ"
    asked(coach, Save(str(path)))
    assert path.read_text(encoding="utf-8").startswith("final: D5\n")


@pytest.mark.parametrize(("word", "aim", "mend"), [("B4", "rast", "segâh"), ("Bb4+1", "nihavend", "kürdî")])
def test_a_typed_note_a_comma_off_is_another_perde_and_is_marked(
    coach: Coach, word: str, aim: str, mend: str
) -> None:
    # bûselik lies a comma over Rast's segâh, dik kürdî a comma over Nihavend's kürdî: common practice
    view = asked(coach, SetTarget(aim), ReplaceText(0, 0, f"G4 A4 {word} A4"))
    assert [(note.number, note.mend) for note in view.line if note.off_mode] == [(3, mend)]


def test_leanings_and_ladder_agree_on_the_octave_of_a_low_line(coach: Coach) -> None:
    low = "G3:2 A3 B3-1 C4 D4:2 , D4 E4 D4 C4 B3-1:2 , C4 B3-1 A3 G3:2 F#3 G3:3 ."
    view = asked(coach, SetFinal("any"), SetOnly("rast, hicaz"), ReplaceText(0, 0, low))
    [karar] = [rung.name for rung in view.ladder if rung.role == "final"]
    assert (view.leanings[0].name, view.leanings[0].final, karar) == ("Rast", "kaba rast", "kaba rast")


def test_an_opening_is_not_what_to_play_next_once_a_phrase_has_ended(coach: Coach) -> None:
    phrase = "D5 Eb5+1 D5:2 , D5 Eb5+1 D5 C5 B4-1:2 Bb4 B4-1:3"
    view = asked(coach, SetOnly(""), SetTarget("huzzam"), ReplaceText(0, 0, f"{phrase} ."))
    owed = [row for row in view.owed if row.heard_at is None and row.need != "colour"]
    openings = [place for place, row in enumerate(owed) if row.kind.startswith("opening")]
    assert openings == list(range(len(owed) - len(openings), len(owed)))


def test_a_change_of_mode_does_not_reach_back_over_the_end_of_a_phrase(coach: Coach) -> None:
    huseyni = "D5 E5 D5 E5 F#5 E5:2 , F#5 G5 F#5 E5:2 , G5 F5 E5 D5 C5:2 , D5 C5 B4-1 A4 G4 A4:3 ."
    karcigar = "D5 Eb5+1 F#5 G5 F#5 Eb5+1 D5:2 , D5 Eb5+1 F#5 G5 F#5 Eb5+1 D5:2"
    asked(coach, SetOnly(""), ReplaceText(0, 0, f"{huseyni} {karcigar}"))
    change = coach.session.line.states[-1].change
    assert change.seam_at is not None
    assert change.seam_at >= 22  # the first phrase has 21 notes
