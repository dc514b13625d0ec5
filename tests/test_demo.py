"""The demo plays real MIDI bytes, and its line does what it says."""

import mido
import pytest

from melodycoach.app import HURRIED
from melodycoach.coach import Coach
from melodycoach.core.event import NoteOn
from melodycoach.core.session import begin
from melodycoach.demo import HAND_OVER, PACK, STAGES, DemoPlayer, note_messages
from melodycoach.screen.view import ViewState
from melodycoach.sources.midi_pitch import PitchTracker
from melodycoach.sources.note_text import read_tokens
from melodycoach.sources.pack_file import load_pack

MAKAM = load_pack(PACK)


class Playing:
    """The demo's bytes through the tracker, as a player of the coach."""

    def __init__(self) -> None:
        self.demo = DemoPlayer(MAKAM.names)
        self.tracker = PitchTracker()

    def poll(self, now_s: float) -> list[object]:
        return [
            event for message, at_s in self.demo.poll(now_s) for event in self.tracker.decode(message, at_s)
        ]

    def input_line(self, now_s: float) -> str:
        return self.demo.says(now_s)

    def tuning_line(self) -> str:
        return ""

    def inputs(self) -> tuple[str, ...]:
        return ()

    def asks_input(self) -> bool:
        return False

    def choose(self, name: str) -> None:
        raise AssertionError(name)

    def is_over(self, now_s: float) -> bool:
        return self.demo.is_over(now_s)

    def close(self) -> None:
        pass


@pytest.fixture(scope="module")
def views() -> list[ViewState]:
    """Play the demo and give the view after each note."""
    told: list[ViewState] = []
    playing = Playing()
    coach = Coach(begin(MAKAM), playing, lambda: playing.demo.ends_s, on_note=told.append)  # type: ignore[arg-type]
    coach.turn()
    return told


def stage_views(views: list[ViewState], stage: int) -> list[ViewState]:
    return [view for view in views if view.status.input_line == STAGES[stage].says]


def test_every_message_is_a_whole_midi_message() -> None:
    player = DemoPlayer(MAKAM.names)
    messages = player.poll(player.ends_s)
    assert len(messages) > 100
    for message, _ in messages:
        mido.Message.from_bytes(message)  # mido is an independent reader: it raises on anything else


def test_the_notes_played_are_the_notes_written() -> None:
    player, tracker = DemoPlayer(MAKAM.names), PitchTracker()
    played = [
        event.pitch_cents
        for message, at_s in player.poll(player.ends_s)
        for event in tracker.decode(message, at_s)
        if isinstance(event, NoteOn)
    ]
    written = [
        item.pitch_cents
        for stage in STAGES
        for item in read_tokens(stage.line, MAKAM.names, 0.0, 60)
        if hasattr(item, "pitch_cents")
    ]
    assert played == pytest.approx(written, abs=200 / 8192)  # one step of the bend


def test_the_demo_takes_about_a_minute() -> None:
    assert 40 <= DemoPlayer(MAKAM.names).ends_s <= 80
    assert DemoPlayer(MAKAM.names).ends_s / HURRIED < 1


def test_messages_are_given_once_and_in_order() -> None:
    player = DemoPlayer(MAKAM.names)
    first, second = player.poll(10.0), player.poll(20.0)
    times = [at_s for _, at_s in (*first, *second)]
    assert times == sorted(times)
    assert first
    assert second
    assert player.poll(20.0) == []


def test_a_quarter_tone_down_is_the_bend_of_the_midi_standard() -> None:
    # half a semitone of a range of two: 8192 - 2048 = 6144 = 0x30 * 128 (MIDI 1.0, pitch bend)
    [(bend, _), (on, _), (off, ends_s)] = note_messages(7050.0, 1.0, 0.5)
    assert bend == bytes((0xE0, 0x00, 0x30))
    assert (on[:2], off[:2], ends_s) == (bytes((0x90, 71)), bytes((0x80, 71)), 1.5)


def test_a_leaning_forms_in_the_first_half(views: list[ViewState]) -> None:
    first = stage_views(views, 0)[0]
    assert not first.decided
    assert any(view.decided and view.leanings[0].name == "Hüseynî" for view in stage_views(views, 1))


def test_steps_move_from_owed_to_heard(views: list[ViewState]) -> None:
    last = stage_views(views, 1)[-1]
    assert sum(row.heard_at is not None for row in last.owed) >= 3
    assert any(row.heard_at is None for row in last.owed)


def test_a_note_breaks_the_mode_and_its_mend_is_named(views: list[ViewState]) -> None:
    before = stage_views(views, 1)[-1]
    assert not any(note.off_mode for note in before.line)
    off = [note for note in stage_views(views, 2)[-1].line if note.off_mode]
    assert [note.name for note in off] == ["kürdî"]
    assert off[0].mend == "segâh"


def test_the_turn_to_another_makam_is_noticed(views: list[ViewState]) -> None:
    turned = stage_views(views, 3)
    assert any("Hicaz" in view.now for view in turned)


def test_it_ends_by_handing_over() -> None:
    player = DemoPlayer(MAKAM.names)
    assert not player.is_over(player.ends_s + 1)
    player.poll(player.ends_s)
    assert player.is_over(player.ends_s)
    assert player.says(player.ends_s) == HAND_OVER
