"""Scala scales.

Outside sources: the Scala file format page (comments, description, count, values with a period in cents,
the period of the scale last); music21's reader of such files reads every mode of the pack back.
"""

from __future__ import annotations

import pytest
from music21.scale.scala import ScalaData

from melodycoach.core.retuning import Intonation, octave_scale
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.scala import looks_like_scala, write_scala

PACK = load_pack("makam")


@pytest.mark.parametrize("mode", PACK.modes, ids=lambda mode: mode.slug)
def test_music21_reads_the_scale_of_every_mode_back(mode: object) -> None:
    for intonation in Intonation:
        scale = octave_scale(mode, PACK.system, intonation)  # type: ignore[arg-type]
        names = [PACK.names.name_at(mode.final_units + degree) for degree, _ in scale]  # type: ignore[attr-defined]
        notes = [(cents, name) for (_, cents), name in zip(scale, names, strict=True)]
        text = write_scala("a.scl", mode.name, notes)  # type: ignore[attr-defined]
        text.encode("latin-1")
        read = ScalaData(text)
        read.parse()
        assert read.fileName == "a.scl"
        assert read.description
        assert read.pitchCount == len(read.pitchValues) == len(scale) + 1
        cents = read.getCentsAboveTonic()
        assert cents[:-1] == pytest.approx([one for _, one in scale], abs=1e-5)
        assert cents[-1] == 1200.0
        assert cents == sorted(cents)


def test_letters_that_the_format_has_not_are_written_plainly() -> None:
    text = write_scala("şarkı.scl", "!Hüseynî – açık\nline", [(100.0, "ğ"), (300.5, "音")])
    assert text.splitlines() == [
        "! sarki.scl",
        "!",
        "Huseyni - acik line",
        " 3",
        "!",
        " 100.00000 g",
        " 300.50000",
        " 1200.00000",
    ]


def test_a_scale_is_told_from_another_file_by_its_first_letter() -> None:
    assert looks_like_scala(b"! a.scl\n")
    assert looks_like_scala(b"\n! a.scl\n")
    assert looks_like_scala(b"")
    assert not looks_like_scala(b"# a draft of mine\n")
