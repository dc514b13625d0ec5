"""Which part, voice and staff of a score are read, and that it is said why."""

import pytest
from small_scores import attributes, grace, measures, note, notes, parts, score

from melodycoach.core.pitch import COMMAS_53, PitchNames
from melodycoach.core.sheet import Sheet
from melodycoach.errors import MusicFileError
from melodycoach.sources.music_xml import read_music_xml
from melodycoach.sources.note_token import item_token

NAMES = PitchNames(COMMAS_53)


def read(data: bytes, **options: str) -> Sheet:
    return read_music_xml(data, "draft.musicxml", NAMES, **options)  # type: ignore[arg-type]


def line(sheet: Sheet) -> str:
    """Write the line of a sheet as note text."""
    return " ".join(item_token(item, NAMES) for item in sheet.items)


def said(sheet: Sheet) -> list[str]:
    """Give what is said of the choice."""
    return [sentence for sentence in sheet.says if "is read" in sentence]


# --- parts -------------------------------------------------------------------------------------

DRUM = "<note><unpitched><display-step>C</display-step></unpitched><duration>4</duration></note>"
ENSEMBLE = parts(
    {
        "Bendir": measures(attributes() + DRUM),
        "Def": measures(attributes("<clef><sign>percussion</sign></clef>") + note("C4")),
        "Ney": measures(attributes() + notes("A4 B4")),
        "Kanun": measures(attributes() + note("C5")),
        "Kanun 2": measures(attributes() + note("D5")),
        "Tacet": measures(attributes() + note("-", 16)),
    }
)


def test_the_first_part_with_a_melody_is_read_and_it_is_said_which_of_how_many() -> None:
    sheet = read(ENSEMBLE)
    assert line(sheet) == "A4 B4 ."
    assert said(sheet) == [
        "part 3 of 6, 'Ney', is read: the first with a melody; --part chooses another",
    ]


@pytest.mark.parametrize(
    ("wanted", "number"),
    [("4", 4), ("P4", 4), ("kanun", 4), ("Kanun 2", 5), ("nun 2", 5), (" 3 ", 3), ("NEY", 3)],
)
def test_a_part_is_chosen_by_number_id_or_a_piece_of_its_name(wanted: str, number: int) -> None:
    assert said(read(ENSEMBLE, part=wanted))[0].startswith(f"part {number} of 6")
    assert said(read(ENSEMBLE, part=wanted))[0].endswith("is read: as chosen")


@pytest.mark.parametrize(
    ("wanted", "text"),
    [
        (
            "kan",
            (
                "several parts are called 'kan'; choose one with --part: "
                "1 'Bendir', 2 'Def', 3 'Ney', 4 'Kanun', 5 'Kanun 2', 6 'Tacet'"
            ),
        ),
        (
            "7",
            (
                "no part is called '7'; choose one with --part: "
                "1 'Bendir', 2 'Def', 3 'Ney', 4 'Kanun', 5 'Kanun 2', 6 'Tacet'"
            ),
        ),
        (
            "Tacet",
            (
                "part 'Tacet' has no notes with a pitch, expected a melody; choose another with --part: "
                "1 'Bendir', 2 'Def', 3 'Ney', 4 'Kanun', 5 'Kanun 2', 6 'Tacet'"
            ),
        ),
    ],
)
def test_a_part_that_is_not_there_or_silent_is_refused_with_a_list_of_all(wanted: str, text: str) -> None:
    with pytest.raises(MusicFileError) as error:
        read(ENSEMBLE, part=wanted)
    assert str(error.value) == f"draft.musicxml: {text}"


def test_percussion_on_channel_10_is_no_melody_but_can_be_asked_for() -> None:
    head = (
        '<part-list><score-part id="P1"><part-name/><score-instrument><instrument-name>Def</instrument-name>'
    )
    head += (
        "</score-instrument><midi-instrument><midi-channel>10</midi-channel></midi-instrument></score-part>"
    )
    drums = f"<part id='P1'>{measures(note('C4'))}</part>"
    data = f"<score-partwise>{head}</part-list>{drums}</score-partwise>".encode()
    with pytest.raises(MusicFileError) as error:
        read(data)
    assert str(error.value) == (
        "draft.musicxml: only percussion in it, expected a melody; open a score that has one"
    )
    assert line(read(data, part="def")) == "C4:2 ."


@pytest.mark.parametrize(
    ("bar", "found"), [(note("-", 16), "no notes"), (DRUM, "only percussion"), ("", "no notes")]
)
def test_a_score_without_a_melody_is_refused_with_what_was_found(bar: str, found: str) -> None:
    with pytest.raises(MusicFileError) as error:
        read(score(bar))
    assert str(error.value) == f"draft.musicxml: {found} in it, expected a melody; open a score that has one"


# --- voices ------------------------------------------------------------------------------------

TWO_VOICES = score(
    note("C5", 16) + "<backup><duration>16</duration></backup>" + notes("A4 G4 A4 G4", voice="2"),
    note("D5", 16) + "<backup><duration>16</duration></backup>" + notes("F4 G4", voice="2"),
)


def test_a_voice_with_few_notes_is_no_melody_however_high_it_is() -> None:
    sheet = read(TWO_VOICES)
    assert line(sheet) == "A4 G4 A4 G4 | F4 G4 -:2 ."
    assert said(sheet) == [
        (
            "voice 2 is read: the only one with many notes; --voice chooses another; "
            "the part has voices 1 (2 notes), 2 (6 notes), a chord counted as one note"
        )
    ]


def test_a_voice_is_chosen_by_its_name() -> None:
    sheet = read(TWO_VOICES, voice="1")
    assert line(sheet) == "C5:2 | D5:2 ."
    assert said(sheet)[0].startswith("voice 1 is read: as chosen; the part has voices")


BACK = "<backup><duration>16</duration></backup>"


def chords(pitches: str, above: str, **options: object) -> str:
    """Write chords of two notes."""
    return "".join(
        note(low, **options) + note(high, chord=True, **options)  # type: ignore[arg-type]
        for low, high in zip(pitches.split(), above.split(), strict=True)
    )


def test_of_the_voices_with_many_notes_the_highest_is_read_and_it_is_said() -> None:
    """The right hand of piano music: the left has more notes, and comes first here."""
    left = notes("D4 C4 D4 C4", voice="5")
    sheet = read(score(left + BACK + note("A4", 8) + note("B4", 8)))
    assert line(sheet) == "A4 B4 ."
    assert said(sheet) == [
        (
            "voice 1 is read: the highest of those with many notes; --voice chooses another; "
            "the part has voices 5 (4 notes), 1 (2 notes), a chord counted as one note"
        )
    ]


def test_a_chord_counts_once_and_by_its_highest_note() -> None:
    melody = notes("A4 B4", duration=8)
    assert line(read(score(chords("C3 D3 C3", "E4 F4 E4", voice="5") + BACK + melody))) == "A4 B4 ."
    high_tops = chords("C3 D3", "E5 F5", duration=8, voice="5")
    assert line(read(score(melody + BACK + high_tops))) == "E5 F5 ."


def test_of_voices_that_are_equally_high_the_first_is_read() -> None:
    assert line(read(score(notes("A4 B4") + BACK + notes("B4 A4", voice="2")))) == "A4 B4 ."


def test_a_voice_that_is_not_there_is_refused_with_those_that_are() -> None:
    with pytest.raises(MusicFileError) as error:
        read(TWO_VOICES, voice="3")
    assert str(error.value) == "draft.musicxml: no voice '3' in the part; choose one with --voice: 1, 2"


# --- staves ------------------------------------------------------------------------------------


def on_staff(number: int) -> str:
    return f"<staff>{number}</staff>"


def test_of_a_voice_on_two_staves_at_once_one_staff_is_read() -> None:
    lower = "<backup><duration>16</duration></backup>" + notes("A3 A3", duration=8, inside=on_staff(2))
    sheet = read(score(notes("A4 B4 C5 D5", inside=on_staff(1)) + lower))
    assert line(sheet) == "A4 B4 C5 D5 ."
    assert said(sheet) == [
        "the voice stands on several staves at once: staff 1 is read, the highest of those with many notes"
    ]


def test_a_staff_of_chords_or_another_voice_does_not_count_for_more_than_single_notes() -> None:
    """Piano music in one voice: the left hand has more notes, and fewer moments."""
    lower = BACK + chords("A3 A3 A3", "C4 C4 C4", inside=on_staff(2))
    sheet = read(score(notes("A4 B4 C5 D5", inside=on_staff(1)) + lower))
    assert line(sheet) == "A4 B4 C5 D5 ."
    inner = BACK + notes("F5 F5 F5 F5 F5 F5 F5 F5", duration=2, voice="2", inside=on_staff(1))
    assert line(read(score(notes("A4 B4 C5 D5", inside=on_staff(1)) + lower + inner), voice="1")) == (
        "A4 B4 C5 D5 ."
    )
    few_above = note("E5", 8, on_staff(1)) + BACK + notes("A4 B4 C5 D5", inside=on_staff(2))
    assert said(read(score(few_above)))[0].endswith("staff 2 is read, the only one with many notes")


def test_a_voice_that_goes_from_staff_to_staff_is_read_on_both() -> None:
    crossing = notes("A4 B4", inside=on_staff(1)) + notes("G3 A3", inside=on_staff(2))
    over_both = note("A4", 16, on_staff(1)) + note("C4", 16, on_staff(2), chord=True)
    sheet = read(score(crossing, over_both + grace("B4", on_staff(2))))
    assert line(sheet) == "A4 B4 G3 A3 | A4:4 B4:0.25 ."
    assert said(sheet) == []


# --- no melody ---------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "without", ["<notations><technical><fret>3</fret></technical></notations>", "<pitch/>"]
)
def test_notes_without_a_pitch_as_in_tablature_are_refused_as_such(without: str) -> None:
    with pytest.raises(MusicFileError) as error:
        read(score(f"<note>{without}<duration>4</duration></note>"))
    assert str(error.value) == (
        "draft.musicxml: its notes have no pitch that can be read, as in tablature, expected a melody; "
        "export it again as notes on a staff"
    )
