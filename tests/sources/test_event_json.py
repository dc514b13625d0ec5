"""Events as lines of JSON: round trips, and the exact text of every fault."""

from __future__ import annotations

import json
from datetime import UTC, datetime

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.event import (
    Event,
    FreshStart,
    LineEdited,
    ModesRestricted,
    NoteOff,
    NoteOn,
    PitchMoved,
    PitchReading,
    ReadingChosen,
    Redone,
    TargetChosen,
    TimePassed,
    Undone,
)
from melodycoach.core.note import InputKind, Mark, Note, Silence
from melodycoach.errors import EventLogError
from melodycoach.sources.event_json import (
    LogHeader,
    event_from_json,
    event_to_json,
    header_from_json,
    header_to_json,
)

numbers = st.floats(allow_nan=False, allow_infinity=False)
kinds = st.sampled_from(InputKind)
beats = st.none() | numbers
items = st.one_of(
    st.builds(Note, numbers, numbers, numbers, kinds, beats),
    st.builds(Silence, numbers, beats),
    st.sampled_from(Mark),
)
EVERY_KIND: dict[type, st.SearchStrategy[Event]] = {
    NoteOn: st.builds(NoteOn, numbers, st.integers(), numbers, kinds),
    NoteOff: st.builds(NoteOff, numbers, st.integers()),
    PitchMoved: st.builds(PitchMoved, numbers, st.integers(), numbers, kinds),
    LineEdited: st.builds(
        LineEdited, numbers, st.integers(), st.integers(), st.lists(items, max_size=5).map(tuple)
    ),
    Undone: st.builds(Undone, numbers),
    Redone: st.builds(Redone, numbers),
    FreshStart: st.builds(FreshStart, numbers),
    TargetChosen: st.builds(TargetChosen, numbers, st.none() | st.text()),
    ReadingChosen: st.builds(
        ReadingChosen, numbers, st.sampled_from([PitchReading.WRITTEN, PitchReading.ANY])
    )
    | st.builds(ReadingChosen, numbers, st.just(PitchReading.FINAL), numbers),
    ModesRestricted: st.builds(ModesRestricted, numbers, st.lists(st.text(), max_size=4).map(tuple)),
    TimePassed: st.builds(TimePassed, numbers),
}
events = st.one_of(*EVERY_KIND.values())


def test_every_kind_of_event_is_tried() -> None:
    assert set(EVERY_KIND) == set(Event.__args__)  # type: ignore[attr-defined]


@given(events)
def test_an_event_written_and_read_is_the_same(event: Event) -> None:
    line = event_to_json(event)
    assert "\n" not in line
    assert event_from_json(line) == event
    assert type(event_from_json(line)) is type(event)


@given(st.dictionaries(st.text(), st.none() | st.booleans() | numbers | st.text()), st.datetimes())
def test_a_header_written_and_read_is_the_same(settings: dict[str, object], started: datetime) -> None:
    header = LogHeader("0.1.0", started, "makam", settings)
    assert header_from_json(header_to_json(header)) == header


def test_a_header_keeps_the_zone_of_its_start() -> None:
    header = LogHeader("0.1.0", datetime(2026, 5, 1, 18, 4, 9, tzinfo=UTC), "makam")
    assert header_from_json(header_to_json(header)).started.utcoffset() == header.started.utcoffset()


def test_a_line_reads_well_for_people() -> None:
    note = Note(6882.5, 0.0, 0.35, InputKind.TYPED, beats=1.0)
    assert event_to_json(LineEdited(2.0, 0, 0, (note, Silence(0.35, 1.0), Mark.PHRASE_END))) == (
        '{"event": "line-edited", "at_s": 2.0, "start": 0, "stop": 0, "items": ['
        '{"item": "note", "pitch_cents": 6882.5, "onset_s": 0.0, "duration_s": 0.35, "kind": "typed", '
        '"beats": 1.0}, {"item": "silence", "duration_s": 0.35, "beats": 1.0}, '
        '{"item": "mark", "sign": "."}]}'
    )


@pytest.mark.parametrize("number", [float("nan"), float("inf")])
def test_a_number_that_json_has_not_is_refused(number: float) -> None:
    with pytest.raises(ValueError, match="JSON compliant"):
        event_to_json(NoteOn(0.0, 1, number, InputKind.KEYS))


DAMAGED = [
    ("", "found '', expected a JSON object"),
    ("[1]", "found '[1]', expected a JSON object"),
    ('{"event": "note-on", "at_s":', 'found \'{"event": "note-on", "at_s":\', expected a JSON object'),
    (b"\xff\xfe\x00", None),
    ('{"at_s": 0}', "found '{\"at_s\": 0}', expected an object with 'event'"),
    ('{"event": "note_on", "at_s": 0}', "no event 'note_on'; did you mean 'note-on' or 'note-off'?"),
    ('{"event": ["note-on"]}', None),
    ('{"event": "note-off", "at_s": 0}', "note-off without 'voice'"),
    ('{"event": "undone"}', "undone without 'at_s'"),
    ('{"event": "undone", "at_s": 0, "as": 1}', "undone has no field 'as'; did you mean 'at_s'?"),
    ('{"event": "undone", "at_s": "0"}', "undone, 'at_s': found '0', expected a number"),
    ('{"event": "undone", "at_s": true}', "undone, 'at_s': found True, expected a number"),
    ('{"event": "undone", "at_s": NaN}', None),
    ('{"event": "undone", "at_s": 1e999}', "undone, 'at_s': found inf, expected a number"),
    ('{"event": "undone", "at_s": 1' + "0" * 400 + "}", None),
    ('{"event": "note-off", "at_s": 0, "voice": 1.5}',
     "note-off, 'voice': found 1.5, expected a whole number"),
    ('{"event": "target-chosen", "at_s": 0, "mode_id": 7}',
     "target-chosen, 'mode_id': found 7, expected text"),
    ('{"event": "modes-restricted", "at_s": 0, "mode_ids": "rast"}',
     "modes-restricted, 'mode_ids': found 'rast', expected a list"),
    ('{"event": "reading-chosen", "at_s": 0, "reading": "sung", "final_cents": null}',
     "reading-chosen, 'reading': found 'sung', expected one of written, final, any"),
    ('{"event": "line-edited", "at_s": 0, "start": 0, "stop": 0, "items": [7]}',
     "line-edited, 'items': found 7, expected an object"),
    ('{"event": "line-edited", "at_s": 0, "start": 0, "stop": 0, "items": [{"item": "rest"}]}',
     "line-edited, 'items': no item 'rest'; known: mark, note, silence"),
    ('{"event": "line-edited", "at_s": 0, "start": 0, "stop": 0, "items": [{"item": "mark", "sign": "!"}]}',
     "line-edited, 'items': mark, 'sign': found '!', expected one of ,, ., |"),
    ("[" * 100_000, None),
]  # fmt: skip


@pytest.mark.parametrize(("line", "text"), DAMAGED)
def test_a_damaged_line_says_what_was_found_and_what_was_expected(
    line: str | bytes, text: str | None
) -> None:
    with pytest.raises(EventLogError) as error:
        event_from_json(line)
    if text is not None:
        assert str(error.value) == text


@given(st.binary(max_size=60))
def test_any_bytes_give_an_event_or_a_fault(line: bytes) -> None:
    try:
        event_from_json(line)
    except EventLogError as fault:
        assert str(fault)  # noqa: PT017


HEADER = {
    "format": "melodycoach event log",
    "version": 1,
    "program": "0.1.0",
    "started": "2026-05-01T18:04:09",
    "pack": "makam",
    "settings": {},
}


@pytest.mark.parametrize(
    ("change", "text"),
    [
        ({"version": 2}, "found format version 2, expected 1; read it with the program that wrote it"),
        ({"started": "yesterday"}, "header, 'started': found 'yesterday', expected a date and time"),
        ({"settings": []}, "header, 'settings': found [], expected an object"),
        ({"tempo": 90}, "header has no field 'tempo'; known: pack, program, settings, started"),
    ],
)
def test_a_damaged_header_says_so(change: dict[str, object], text: str) -> None:
    with pytest.raises(EventLogError) as error:
        header_from_json(json.dumps(HEADER | change))
    assert str(error.value) == text


def test_another_file_is_no_log() -> None:
    with pytest.raises(EventLogError) as error:
        header_from_json('{"name": "a", "modes": [1, 2, 3], "more": 12345}')
    assert str(error.value) == (
        'found \'{"name": "a", "modes": [1, 2, 3], "more…\', expected the header of an event log'
    )


def test_a_final_that_does_not_go_with_the_reading_is_damage() -> None:
    with pytest.raises(EventLogError) as error:
        event_from_json('{"event": "reading-chosen", "at_s": 1.0, "reading": "final", "final_cents": null}')
    assert str(error.value) == "reading-chosen: final_cents None does not go with reading 'final'"
