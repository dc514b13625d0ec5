"""Scores in MusicXML: what is taken of them, where it stands, and what is said of the rest.

The meaning of the elements is that of the W3C's MusicXML 4.0 documentation; the scores are our own.
"""

import pytest
from small_scores import attributes, grace, measures, mxl, note, notes, parts, score

from melodycoach.core.note import InputKind, Mark, Note, Silence
from melodycoach.core.pitch import COMMAS_53, SEMITONES_12, PitchNames
from melodycoach.core.sheet import Place, Sheet, SheetKind
from melodycoach.errors import MusicFileError
from melodycoach.sources.accidental_table import Notation
from melodycoach.sources.music_xml import read_music_xml
from melodycoach.sources.note_token import item_token
from melodycoach.sources.xml_elements import MAX_PARTS

NAMES = PitchNames(COMMAS_53)


def read(data: bytes, **options: object) -> Sheet:
    return read_music_xml(data, "draft.musicxml", NAMES, **options)  # type: ignore[arg-type]


def line(sheet: Sheet) -> str:
    """Write the line of a sheet as note text."""
    return " ".join(item_token(item, NAMES) for item in sheet.items)


def places(sheet: Sheet) -> list[tuple[str, float]]:
    return [(place.bar, place.beat) for place in sheet.places]


def said(sheet: Sheet) -> list[str]:
    """Give what is said of a sheet, without the sentence on its accidentals."""
    return [sentence for sentence in sheet.says if "sharp" not in sentence and "accidentals" not in sentence]


def barline(inside: str, location: str = "right") -> str:
    return f'<barline location="{location}">{inside}</barline>'


# --- the line ----------------------------------------------------------------------------------


def test_a_score_is_a_line_with_its_title_and_the_places_of_its_notes() -> None:
    sheet = read(score(notes("A4 B4 C5 D5"), notes("E5", duration=16), title="Sabah\n şarkısı"))
    assert (sheet.kind, sheet.title, sheet.tempo) == (SheetKind.MUSIC_XML, "Sabah şarkısı", None)
    assert line(sheet) == "A4 B4 C5 D5 | E5:4 ."
    assert places(sheet) == [("1", 1), ("1", 2), ("1", 3), ("1", 4), ("2", 1)]
    assert (sheet.mode, sheet.final_cents, said(sheet), sheet.lost) == ("", None, [], ())


def test_notes_lie_one_after_another_at_72_beats_a_minute_or_at_the_tempo_of_the_score() -> None:
    plain = read(score(notes("A4 B4")))
    onsets = [item.onset_s for item in plain.items if isinstance(item, Note)]
    assert onsets == pytest.approx([0, 60 / 72])
    quick = read(score('<sound tempo="120"/>' + notes("A4 B4")))
    assert quick.items[1] == Note(quick.items[1].pitch_cents, 0.5, 0.5, InputKind.TYPED, 1.0)  # type: ignore[union-attr]
    assert quick.tempo == 120


@pytest.mark.parametrize(
    ("direction", "tempo"),
    [
        ("<metronome><beat-unit>half</beat-unit><per-minute>60</per-minute></metronome>", 120),
        (
            (
                "<metronome><beat-unit>quarter</beat-unit><beat-unit-dot/>"
                "<per-minute>c. 40</per-minute></metronome>"
            ),
            60,
        ),
        ("<metronome><beat-unit>quarter</beat-unit><per-minute>fast</per-minute></metronome>", None),
        ("<metronome><beat-unit>quarter</beat-unit><beat-unit>half</beat-unit></metronome>", None),
        ('<sound tempo="0"/>', None),
        ('<sound tempo="1e9"/>', None),
        ('<sound tempo="x"/>', None),
        (
            '<metronome><beat-unit>half</beat-unit><per-minute>9</per-minute></metronome><sound tempo="80"/>',
            80,
        ),
    ],
)
def test_the_tempo_is_what_sounds_else_what_is_printed(direction: str, tempo: float | None) -> None:
    assert read(score(f"<direction>{direction}</direction>" + notes("A4 B4"))).tempo == tempo


def test_only_the_first_tempo_counts_and_it_is_said() -> None:
    sheet = read(
        score('<sound tempo="80"/>' + notes("A4"), '<sound tempo="80.1"/><sound tempo="60"/>' + notes("B4"))
    )
    assert sheet.tempo == 80
    assert said(sheet) == ["the tempo changes on the way: the first is taken for the whole line"]


def test_a_score_in_eighths_is_counted_in_eighths_and_so_is_its_tempo() -> None:
    sheet = read(score('<sound tempo="60"/>' + notes("A4 B4 C5 D5", duration=2) + note("E5", 8)))
    assert line(sheet) == "A4 B4 C5 D5 E5:4 ."
    assert sheet.tempo == 120
    assert said(sheet) == ["one beat is an eighth, the usual note of the line"]
    assert places(sheet)[1] == ("1", 1.5)  # the place counts in beats of the time signature


def test_rests_and_gaps_are_silences_which_end_at_the_bar_line() -> None:
    sheet = read(score(note("A4") + note("-") + note("-", 8), note("-") + notes("B4 C5 B4")))
    assert line(sheet) == "A4 -:3 | - B4 C5 B4 ."
    gap = read(score(note("A4") + "<forward><duration>4</duration></forward>" + note("B4", 8)))
    assert line(gap) == "A4 - B4:2 ."


def test_tied_notes_are_one_note_even_over_bar_lines() -> None:
    start, stop = '<tie type="start"/>', '<tie type="stop"/>'
    sheet = read(
        score(
            note("A4", 8) + note("B4", 8, start),
            note("B4", 16, stop + start),
            note("B4", 4, stop) + note("C5"),
        )
    )
    assert line(sheet) == "A4 B4:3.5 | | C5:0.5 ."
    assert places(sheet) == [("1", 1), ("1", 3), ("3", 2)]


def test_a_tie_may_be_written_as_a_slur_between_notations_alone() -> None:
    first, second = (
        '<notations><tied type="start"/></notations>',
        '<notations><tied type="stop"/></notations>',
    )
    assert line(read(score(note("A4", 4, first) + note("A4", 4, second)))) == "A4 ."


def test_a_tie_to_another_pitch_or_over_a_rest_joins_nothing() -> None:
    start = '<tie type="start"/>'
    assert line(read(score(note("A4", 4, start) + note("B4", 4)))) == "A4 B4 ."
    assert line(read(score(note("A4", 4, start) + note("-") + note("A4")))) == "A4 - A4 ."


def test_a_tied_note_keeps_its_accidental_over_the_bar_line() -> None:
    flat = '<accidental>quarter-flat</accidental><tie type="start"/>'
    sheet = read(
        score(note("A4", 12) + note("B4", 4, flat), note("B4", 4, '<tie type="stop"/>') + note("B4", 12))
    )
    assert line(sheet) == "A4:1.5 B4-1 | B4:1.5 ."


def test_grace_notes_are_short_typed_notes_that_take_nothing_from_the_others() -> None:
    sheet = read(score(grace("B4") + note("A4") + grace("C5") + grace("B4") + note("A4")))
    assert line(sheet) == "B4:0.25 A4 C5:0.25 B4:0.25 A4 ."
    assert places(sheet) == [("1", 1), ("1", 1), ("1", 2), ("1", 2), ("1", 2)]
    assert said(sheet) == ["3 grace notes read as short notes that take no time from the others"]


def test_of_a_chord_the_highest_note_is_taken_also_of_a_chord_of_grace_notes() -> None:
    chord = note("A4") + note("E5", chord=True) + note("C5", chord=True)
    graces = grace("A4") + grace("C5").replace("<grace/>", "<grace/><chord/>")
    sheet = read(score(chord + note("D5") + graces + note("B4", 8)))
    assert line(sheet) == "E5 D5 C5:0.25 B4:2 ."
    assert "where notes sound together, the highest is taken" in said(sheet)


def test_where_notes_of_one_voice_overlap_the_later_begins_on_time() -> None:
    back = "<backup><duration>8</duration></backup>"
    assert line(read(score(note("A4", 16) + back + note("C5", 8)))) == "A4 C5 ."
    level = "<backup><duration>4</duration></backup>"
    assert line(read(score(note("A4") + level + note("C5") + note("B4")))) == "C5 B4 ."


def test_cue_notes_and_notes_without_pitch_are_left_out_and_counted() -> None:
    cue = note("A4").replace("<note>", "<note><cue/>")
    drum = "<note><unpitched/><duration>4</duration></note>"
    sheet = read(score(note("B4") + cue + drum + note("B4")))
    assert line(sheet) == "B4 -:2 B4 ."
    assert said(sheet) == ["1 cue note left out", "1 note without a pitch left out"]


def test_hidden_notes_are_read_and_ornament_signs_are_not_played_out() -> None:
    hidden = note("A4").replace("<note>", '<note print-object="no">')
    trill = "<notations><ornaments><trill-mark/><tremolo>3</tremolo></ornaments></notations>"
    sheet = read(score(hidden + note("B4", 4, trill)))
    assert line(sheet) == "A4 B4 ."
    assert said(sheet) == ["ornament signs (tremolo, trill) are not played out: the written notes count"]


# --- marks -------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("sign", "mark"),
    [
        ("<articulations><breath-mark/></articulations>", Mark.BREATH),
        ("<articulations><caesura/></articulations>", Mark.PHRASE_END),
        ("<fermata/>", Mark.BREATH),
        ("<fermata/><articulations><caesura/></articulations>", Mark.PHRASE_END),
        ("<articulations><caesura/><breath-mark/></articulations>", Mark.PHRASE_END),
    ],
)
def test_breath_caesura_and_fermata_stand_behind_their_note(sign: str, mark: Mark) -> None:
    sheet = read(score(note("A4", 4, f"<notations>{sign}</notations>") + note("B4")))
    assert sheet.items[1] is mark
    assert [type(item) for item in sheet.items] == [Note, Mark, Note, Mark]


@pytest.mark.parametrize("style", ["light-light", "light-heavy", "heavy-light", "heavy-heavy"])
def test_a_double_line_ends_a_phrase_wherever_it_is_written(style: str) -> None:
    double = f"<bar-style>{style}</bar-style>"
    assert line(read(score(note("A4", 16) + barline(double), note("B4", 16)))) == "A4:2 . | B4:2 ."
    assert line(read(score(note("A4", 16), barline(double, "left") + note("B4", 16)))) == "A4:2 . | B4:2 ."
    middle = note("A4", 8) + barline(double, "middle") + note("B4", 8)
    assert line(read(score(middle))) == "A4 . B4 ."


def test_a_plain_line_ends_nothing_and_a_fermata_on_a_line_is_a_breath() -> None:
    assert line(read(score(note("A4", 16) + barline("<bar-style>regular</bar-style>"), note("B4", 16)))) == (
        "A4:2 | B4:2 ."
    )
    assert line(read(score(note("A4", 16) + barline("<fermata/>"), note("B4", 16)))) == "A4:2 , | B4:2 ."


def test_the_line_ends_once_whatever_ends_it() -> None:
    final = barline("<bar-style>light-heavy</bar-style>")
    fermata = "<notations><fermata/></notations>"
    assert line(read(score(note("A4", 16, fermata) + final))) == "A4:2 ."
    assert (
        line(read(score(barline("<bar-style>heavy-light</bar-style>", "left") + note("A4", 16)))) == "A4:2 ."
    )


# --- bars --------------------------------------------------------------------------------------


def test_bars_are_called_as_they_are_printed_or_counted() -> None:
    bars = (
        f'<measure number="12">{attributes()}{note("A4", 16)}</measure>'
        f'<measure number="X1" implicit="yes">{note("B4", 4)}</measure>'
        f"<measure>{note('C5', 16)}</measure>"
    )
    assert places(read(parts({"Ney": bars}))) == [("12", 1), ("X1", 1), ("3", 1)]


def test_a_pickup_counts_from_the_end_of_its_bar() -> None:
    assert places(read(score(note("A4"), notes("B4 C5 D5 E5"))))[:2] == [("1", 4), ("2", 1)]
    only = read(score(note("A4")))
    assert places(only) == [("1", 1)]


@pytest.mark.parametrize(
    ("time", "second"),
    [("9/8", 3.0), ("2+2+2+3/8", 3.0), ("3/4", 2.0), ("2/2", 1.5), ("x/4", 2.0), ("4/0", 2.0)],
)
def test_beats_are_those_of_the_time_signature(time: str, second: float) -> None:
    bar = notes("A4 B4") + note("-", 2 if "8" in time else 4)
    assert places(read(score(bar, bar, first=attributes(time=time))))[3] == ("2", second)


def test_a_time_signature_of_several_pairs_fills_a_bar_with_all_of_them() -> None:
    time = "<time><beats>2</beats><beat-type>4</beat-type><beats>3</beats><beat-type>8</beat-type></time>"
    first = f"<attributes><divisions>4</divisions>{time}</attributes>"
    # a bar has 2 + 3/2 quarter notes, so a pickup of one begins 2.5 beats in
    assert places(read(score(note("A4"), note("B4", 14), first=first))) == [("1", 3.5), ("2", 1)]


def test_divisions_may_change_within_a_bar() -> None:
    change = "<attributes><divisions>8</divisions></attributes>"
    sheet = read(score(note("A4") + change + note("B4", 8) + note("C5", 16)))
    assert line(sheet) == "A4 B4 C5:2 ."
    assert places(sheet) == [("1", 1), ("1", 2), ("1", 3)]


@pytest.mark.parametrize(
    ("bars", "sentence"),
    [
        (
            [note("A4"), note("B4") + barline('<repeat direction="backward"/>')],
            "bars 1–2 are repeated: read once",
        ),
        ([note("A4") + barline('<repeat direction="backward"/>')], "bar 1 is repeated: read once"),
        (
            [
                note("A4") + barline('<repeat direction="backward"/>'),
                note("B4"),
                barline('<repeat direction="forward"/>', "left") + note("C5"),
                note("D5") + barline('<repeat direction="backward"/>'),
            ],
            "bars 1, 3–4 are repeated: read once",
        ),
        (
            [note("A4") + barline('<ending number="1" type="start"/>', "left")],
            "first and later endings are read one after the other, as they are written",
        ),
        (
            [note("A4"), note("B4") + '<direction><sound dacapo="yes"/></direction>'],
            "jumps (da capo, dal segno, coda) are not followed: the bars are read once, in their order",
        ),
    ],
)
def test_repeats_endings_and_jumps_are_read_once_and_said_once(bars: list[str], sentence: str) -> None:
    sheet = read(score(*bars))
    assert len(sheet.places) == len(bars)
    assert said(sheet) == [sentence]


def test_many_repeats_are_counted_not_listed() -> None:
    again = note("A4") + barline('<repeat direction="backward"/>')
    assert said(read(score(*[again] * 9))) == ["bars 1, 2, 3, 4, 5, 6, and 3 more are repeated: read once"]


# --- pitch -------------------------------------------------------------------------------------

SIGNED = note("B4", 4, "<accidental>quarter-flat</accidental>")


def test_an_accidental_may_be_given_by_its_smufl_name() -> None:
    """SMuFL 1.4: accidentalBakiyeFlat is the flat of four commas."""
    sign = '<accidental smufl="accidentalBakiyeFlat">other</accidental>'
    assert line(read(score(note("B4", 4, sign)))) == "Bb4+1 ."


def test_accidentals_hold_to_the_bars_end_for_every_voice_of_their_staff() -> None:
    back = "<backup><duration>16</duration></backup>"
    low = note("-", 8, voice="2") + note("B4", 8, "<accidental>quarter-flat</accidental>", voice="2")
    high = notes("A4 B4 A4 B4")
    sheet = read(score(high + back + low, high))
    assert line(sheet) == "A4 B4 A4 B4-1 | A4 B4 A4 B4 ."


def test_another_staff_keeps_its_own_accidentals_and_key() -> None:
    key = '<staves>2</staves><key number="2"><fifths>-1</fifths></key>'
    back = "<backup><duration>8</duration></backup>"
    flat = note("B4", 4, "<staff>2</staff>", voice="5").replace("<octave>", "<alter>-1</alter><octave>")
    bar = note("B4", 4) + note("B4", 4) + back + flat * 2
    data = score(bar, first=attributes(key))
    assert line(read(data)) == "B4 B4 ."
    assert line(read(data, voice="5")) == "Bb4 Bb4 ."


def test_a_key_signature_holds_from_where_it_stands() -> None:
    flat = "<attributes><key><key-step>B</key-step><key-alter>-0.5</key-alter>"
    flat += "<key-accidental>quarter-flat</key-accidental></key></attributes>"
    none = "<attributes><key/></attributes>"
    sheet = read(score(note("B4") + flat + note("B4") + note("B5"), note("B4"), none + note("B4")))
    assert line(sheet) == "B4 B4-1 B5-1 | B4-1 | B4 ."


def test_a_key_change_behind_the_last_note_of_a_bar_holds_in_the_next() -> None:
    change = "<attributes><key><fifths>-1</fifths></key></attributes>"
    flat = note("B4").replace("<octave>", "<alter>-1</alter><octave>")
    sharp = note("F4", 4, "<accidental>sharp</accidental>")
    assert line(read(score(note("B4") + sharp + change, flat))) == "B4 F#4 | Bb4 ."


def test_signs_of_a_key_may_have_an_octave_and_a_glyph_name() -> None:
    key = (
        "<key><key-step>B</key-step><key-alter>-1</key-alter>"
        '<key-accidental smufl="accidentalKomaFlat">other</key-accidental>'
        '<key-octave number="1">4</key-octave><key-octave number="7">4</key-octave></key>'
    )
    assert line(read(score(note("B4"), first=attributes(key)))) == "B4-1 ."


def test_the_notation_is_guessed_and_said_or_taken_as_chosen() -> None:
    data = score(SIGNED + note("B4", 4, "<accidental>double-slash-flat</accidental>"))
    assert any("AEU" in sentence for sentence in read(data).says)
    chosen = read(data, notation=Notation.ARABIC)
    assert "accidentals are read as Arabic, as chosen" in chosen.says


def test_in_literal_notation_whole_semitones_are_keys_of_a_piano() -> None:
    alter = "<pitch><step>B</step><alter>-0.3</alter><octave>4</octave></pitch>"
    quarter = f"<note>{alter}<duration>4</duration></note>"
    sheet = read(score(note("B4") + quarter), notation=Notation.LITERAL)
    kinds = [(item.pitch_cents, item.kind) for item in sheet.items if isinstance(item, Note)]
    assert kinds == [(7100, InputKind.KEYS), (pytest.approx(7070), InputKind.TUNED)]


def test_a_conflict_of_sign_and_alter_is_said_once_for_each_kind() -> None:
    odd = (
        "<note><pitch><step>B</step><alter>-0.5</alter><octave>4</octave></pitch><duration>4</duration>"
        "<accidental>slash-flat</accidental></note>"
    )
    sheet = read(score(odd * 3), notation=Notation.AEU)
    assert len([sentence for sentence in sheet.says if "slash-flat" in sentence]) == 1


@pytest.mark.parametrize(
    ("transpose", "sounds", "sentence"),
    [
        # a whole tone is 9 commas: A4 written, G4 sounding
        ("<diatonic>-1</diatonic><chromatic>-2</chromatic>", "G4 A4", "9 commas lower"),
        ("<chromatic>-2</chromatic>", "G4 A4", "9 commas lower"),
        # a major sixth down is 4 * 9 + 4 = 40 commas: C4
        ("<diatonic>-5</diatonic><chromatic>-9</chromatic>", "C4 D4", "40 commas lower"),
        # a minor third up is 9 + 4 = 13 commas
        ("<chromatic>3</chromatic>", "C5 D5", "13 commas higher"),
        ("<chromatic>0</chromatic><octave-change>-1</octave-change>", "A3 B3", "53 commas lower"),
        ("<chromatic>-14</chromatic>", "G3 A3", "62 commas lower"),
        # an augmented fourth is three whole tones, 27 commas: Eb5 is 31 - 5 = 26 above A4
        ("<diatonic>3</diatonic><chromatic>6</chromatic>", "Eb5+1 F5+1", "27 commas higher"),
        # a quarter tone is 50 / 22.64 = 2.21 commas, and Bb4 is 4 above A4
        ("<chromatic>0.5</chromatic>", "Bb4-1.79 C5-1.79", "2.21 commas higher"),
    ],
)
def test_a_transposing_part_is_read_as_it_sounds_and_keeps_to_the_commas(
    transpose: str, sounds: str, sentence: str
) -> None:
    first = attributes(f"<transpose>{transpose}</transpose>")
    sheet = read(score(notes("A4 B4"), first=first))
    assert line(sheet) == f"{sounds} ."
    assert said(sheet) == [f"a transposing part: it is read as it sounds, {sentence} than it is written"]


def test_a_transposing_part_of_piano_keys_moves_by_semitones() -> None:
    first = attributes("<transpose><chromatic>-2</chromatic></transpose>")
    sheet = read(score(note("A4"), first=first), notation=Notation.LITERAL)
    assert sheet.items[0] == Note(6700, 0.0, 60 / 72, InputKind.KEYS, 1.0)
    assert said(sheet) == [
        "a transposing part: it is read as it sounds, 2 semitones lower than it is written"
    ]
    first = attributes("<transpose><chromatic>0.5</chromatic></transpose>")
    tuned = read(score(note("A4"), first=first), notation=Notation.LITERAL).items[0]
    assert isinstance(tuned, Note)
    assert (tuned.pitch_cents, tuned.kind) == (6950, InputKind.TUNED)


def test_a_transposition_may_be_for_one_staff_and_may_end() -> None:
    first = attributes('<transpose number="2"><chromatic>-2</chromatic></transpose>')
    second = note("A4", 4, "<staff>2</staff>")
    assert line(read(score(note("A4") + second, first=first))) == "A4 G4 ."
    ends = "<attributes><transpose><chromatic>0</chromatic></transpose></attributes>"
    begins = attributes("<transpose><chromatic>-2</chromatic></transpose>")
    assert line(read(score(note("A4") + ends + note("A4"), first=begins))) == "G4 A4 ."


def test_a_pack_of_semitones_reads_a_plain_score_on_piano_keys_too() -> None:
    sheet = read_music_xml(
        score(notes("A4 C5")), "a.xml", PitchNames(SEMITONES_12), notation=Notation.LITERAL
    )
    assert [item.pitch_cents for item in sheet.items if isinstance(item, Note)] == [6900, 7200]


# --- the file ----------------------------------------------------------------------------------


def test_a_score_by_bars_is_the_same_score_by_parts() -> None:
    first, second = attributes() + notes("A4 B4 C5 D5"), note("E5", 16)
    timewise = (
        "<score-timewise><part-list><score-part id='P1'><part-name>Ney</part-name></score-part></part-list>"
        f"<measure number='1'><part id='P1'>{first}</part><part id='P2'>{note('C4', 16)}</part></measure>"
        f"<measure number='2'><part id='P1'>{second}</part><part id='P2'>{note('D4', 16)}</part></measure>"
        "</score-timewise>"
    )
    partwise = parts({"Ney": measures(first, second)})
    assert read(timewise.encode()).items == read(partwise).items
    assert read(timewise.encode()).places == read(partwise).places
    assert line(read(timewise.encode(), part="P2")) == "C4:8 | D4:8 ."  # it has no divisions of its own


def test_a_compressed_score_reads_as_the_plain_one() -> None:
    plain = score(notes("A4 B4"))
    assert read(mxl(plain)) == read(plain)


def test_a_movement_has_a_title_where_the_work_has_none() -> None:
    data = score(note("A4"), title="", head="<movement-title>Saz semâîsi</movement-title>")
    assert read(data).title == "Saz semâîsi"


@pytest.mark.parametrize(
    ("root", "text"),
    [
        ("opus", "this is a list of scores (an opus), expected a score; open one of its scores"),
        (
            "museum",
            (
                "this is XML of another kind, with 'museum' as its root, expected a MusicXML score; "
                "export the score as MusicXML"
            ),
        ),
    ],
)
def test_xml_of_another_kind_is_refused_by_its_name(root: str, text: str) -> None:
    with pytest.raises(MusicFileError) as error:
        read(f"<{root}/>".encode())
    assert str(error.value) == f"draft.musicxml: {text}"


def test_a_part_that_is_not_in_the_list_is_read_under_its_id() -> None:
    data = (
        b"<score-partwise>"
        + "".join(f"<part id='{id}'>{measures(note('A4'))}</part>" for id in ("X", "Y")).encode()
        + b"</score-partwise>"
    )
    assert said(read(data))[0] == "part 1 of 2, 'X', is read: the first with a melody; --part chooses another"


def test_more_parts_than_a_score_has_are_refused() -> None:
    listed = "".join(f'<score-part id="P{n}"/>' for n in range(MAX_PARTS + 1))
    with pytest.raises(MusicFileError) as error:
        read(f"<score-partwise><part-list>{listed}</part-list></score-partwise>".encode())
    assert str(error.value) == (
        f"draft.musicxml: more than {MAX_PARTS} parts, which is the most that is read of a score; "
        "export the part with the melody alone"
    )


# --- damage ------------------------------------------------------------------------------------

TYPED = "<type>half</type><dot/>"
TRIPLET = "<type>eighth</type><time-modification><actual-notes>3</actual-notes><normal-notes>2</normal-notes>"
TRIPLET += "</time-modification>"


@pytest.mark.parametrize("duration", ["", "0", "-4", "x", "nan", "inf", "1e300", "1e-300"])
@pytest.mark.parametrize(
    ("printed", "beats"), [(TYPED, ":3"), (TRIPLET, ":1/3"), ("", ""), ("<type>x</type>", "")]
)
def test_a_note_with_a_wrong_duration_is_as_long_as_it_is_printed(
    duration: str, printed: str, beats: str
) -> None:
    sheet = read(score(note("A4", duration, printed) + notes("B4 B4 B4")))
    assert line(sheet) == f"A4{beats} B4 B4 B4 ."
    assert sheet.lost == ("bar 1: a note or rest without a usable duration, read as long as it is printed",)


def test_a_rest_with_a_wrong_duration_fills_its_bar() -> None:
    sheet = read(score(note("A4", 16), note("-", "x"), note("-", ""), note("A4", 16)))
    assert line(sheet) == "A4:2 | -:2 | -:2 | A4:2 ."
    assert sheet.lost == (
        "bars 2, 3: a note or rest without a usable duration, read as long as it is printed",
    )


@pytest.mark.parametrize("divisions", ["0", "-1", "x", ""])
def test_divisions_that_are_no_number_above_0_change_nothing(divisions: str) -> None:
    wrong = f"<attributes><divisions>{divisions}</divisions></attributes>"
    sheet = read(score(note("A4") + wrong + note("B4")))
    assert line(sheet) == "A4 B4 ."
    assert sheet.lost == ("bar 1: divisions that are no number above 0, left out",)


def test_notes_that_cannot_be_read_or_played_are_left_out_with_their_bar() -> None:
    bad = note("H4") + note("A44") + note("Ax")
    high = note("B9")
    sheet = read(score(note("A4") + bad, high + note("B4")))
    assert line(sheet) == "A4 -:3 | - B4 ."
    assert sheet.lost == (
        "bar 1: a note without a readable pitch, left out",
        "bar 2: a note out of the reach of MIDI, left out",
    )
    with pytest.raises(MusicFileError) as error:
        read(score(high))
    assert (
        str(error.value)
        == "draft.musicxml: no note in it can be played, expected a melody; look into the score"
    )


def test_an_alter_that_is_no_number_is_left_out() -> None:
    odd = note("A4").replace("<octave>", "<alter>half</alter><octave>")
    sheet = read(score(odd))
    assert (line(sheet), sheet.lost) == ("A4 .", ("bar 1: an alter that is no number, left out",))


def test_a_step_back_too_far_or_without_a_length_is_mended() -> None:
    far = "<backup><duration>99</duration></backup>"
    odd = "<forward><duration>x</duration></forward>"
    sheet = read(score(note("A4") + odd + note("B4") + far + note("C5", 4, voice="2")), voice="1")
    assert line(sheet) == "A4 B4 ."
    assert sheet.lost == (
        "bar 1: a step on or back without a usable duration, left out",
        "bar 1: a step back to before the bar, read from its start",
    )


def test_a_part_without_name_or_number_of_its_bars_is_read() -> None:
    """A clef that comes second says nothing of percussion, nor does a wrong time or transposition."""
    odd = attributes("<clef><sign>G</sign></clef><clef><sign>percussion</sign></clef>")
    data = f"<score-partwise><part><measure>{odd}{note('A4')}</measure></part></score-partwise>".encode()
    assert places(read(data)) == [("1", 1)]


def test_a_time_signature_within_a_bar_counts_from_the_next() -> None:
    change = "<attributes><time><beats>6</beats><beat-type>8</beat-type></time></attributes>"
    sheet = read(score(notes("A4 B4") + change + notes("A4 B4"), notes("A4 B4 C5")))
    assert places(sheet) == [("1", 1), ("1", 2), ("1", 3), ("1", 4), ("2", 1), ("2", 3), ("2", 5)]


def test_a_breath_on_a_middle_line_before_a_caesura_is_one_end() -> None:
    ends = barline("<fermata/>", "middle") + barline("<bar-style>light-light</bar-style>", "middle")
    assert line(read(score(note("A4", 8) + ends + note("B4", 8)))) == "A4 . B4 ."


def test_elements_outside_a_bar_are_passed_over() -> None:
    stray = (
        note("C4") + "<backup/><forward/><attributes><divisions>0</divisions><key/><time/><transpose/><clef/>"
        "</attributes><barline/><sound fine='yes' dacapo='yes'/><trill-mark/><key-octave>4</key-octave>"
        "<key-alter>1</key-alter><key-accidental smufl='x'>flat</key-accidental>"
    )
    data = parts({"Ney": stray + measures(attributes() + note("A4")) + stray})
    sheet = read(data)
    assert (line(sheet), said(sheet), sheet.lost) == ("A4 .", [], ())


def test_control_characters_of_a_file_reach_no_sentence() -> None:
    data = parts({"Ney\x9b31m": measures(note("A4")), "Ud": measures(note("B4"))}, title="a\x9bb")
    sheet = read(data)
    assert sheet.title == "a b"
    assert all(sentence.isprintable() for sentence in sheet.says)


def test_a_silence_is_never_longer_than_a_line_can_hold() -> None:
    far = "<forward><duration>999999999</duration></forward>"
    sheet = read(score(note("A4", 1) + far + note("B4", 1)))
    silences = [item.beats for item in sheet.items if isinstance(item, Silence)]
    assert silences == [10_000.0]
    assert sheet.places[1] == Place("1", 10_001.0)
