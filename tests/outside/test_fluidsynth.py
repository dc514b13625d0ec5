"""The synthesiser FluidSynth (Debian's libfluidsynth3) reads what `retune --send` writes.

It is asked for its own tuning after each message, so two programs that know nothing of each other have to
agree on every cent. Without the library these tests are skipped; with MELODYCOACH_REQUIRE_FLUIDSYNTH=1 they
fail.
"""

from __future__ import annotations

import ctypes
import ctypes.util
import os
from typing import TYPE_CHECKING, Any

import pytest

from melodycoach.core.retuning import Intonation, retune
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.tuning_messages import TuningForm, channel_of_key, tuning_messages

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

PACK = load_pack("makam")
QUARTER_AND_COMMA = (0.0, 12.5, -50.0, 0.0, -22.6415, 50.0, 1.0, 0.0, -0.3, 0.0, 33.25, -41.5)
FINE_TUNING_GENERATOR = 52  # SoundFont 2.04, generator 52: fineTune, in cents


class Synth:
    """A FluidSynth that makes no sound: it has no audio driver and no soundfont."""

    def __init__(self, library: Any) -> None:
        self._library = library
        for name in ("new_fluid_settings", "new_fluid_synth"):
            getattr(library, name).restype = ctypes.c_void_p
        library.fluid_synth_get_gen.restype = ctypes.c_float
        self._settings = ctypes.c_void_p(library.new_fluid_settings())
        self._synth = ctypes.c_void_p(library.new_fluid_synth(self._settings))

    def close(self) -> None:
        self._library.delete_fluid_synth(self._synth)
        self._library.delete_fluid_settings(self._settings)

    def read(self, message: bytes) -> bool:
        """Hand a message over; say whether it was understood."""
        if message[0] == 0xF0:
            handled = ctypes.c_int(0)
            body = message[1:-1]
            none = ctypes.c_void_p(None)
            size = ctypes.c_int(len(body))
            failed = self._library.fluid_synth_sysex(
                self._synth, body, size, none, none, ctypes.byref(handled), 0
            )
            return failed == 0 and bool(handled.value)
        channel, control, value = message[0] & 0x0F, message[1], message[2]
        return bool(self._library.fluid_synth_cc(self._synth, channel, control, value) == 0)

    def offsets(self) -> list[list[float]]:
        """How far each of the 128 keys of the tuning that octave messages set is off its place, by octave."""
        pitches = (ctypes.c_double * 128)()
        name = ctypes.create_string_buffer(64)
        failed = self._library.fluid_synth_tuning_dump(self._synth, 0, 0, name, 64, pitches)
        assert failed == 0, "FluidSynth keeps no tuning"
        cents = [pitches[key] - 100.0 * key for key in range(128)]
        return [cents[first : first + 12] for first in range(0, 120, 12)]

    def fine_tuning(self, channel: int) -> float:
        return float(self._library.fluid_synth_get_gen(self._synth, channel, FINE_TUNING_GENERATOR))


@pytest.fixture
def synth() -> Iterator[Synth]:
    try:
        library = ctypes.CDLL("libfluidsynth.so.3")
    except OSError:
        if os.environ.get("MELODYCOACH_REQUIRE_FLUIDSYNTH") == "1":
            pytest.fail("libfluidsynth.so.3 is not installed")
        pytest.skip("libfluidsynth.so.3 is not installed")
    made = Synth(library)
    yield made
    made.close()


@pytest.mark.parametrize(
    ("form", "error_cents"), [(TuningForm.TWO_BYTES, 0.0062), (TuningForm.ONE_BYTE, 0.5)]
)
@pytest.mark.parametrize(
    "offsets",
    [QUARTER_AND_COMMA, *(retune(PACK.find(name), PACK.system).offsets for name in ("segah", "saba"))],
)
def test_fluidsynth_tunes_every_octave_as_we_mean_it(
    synth: Synth, form: TuningForm, error_cents: float, offsets: Sequence[float]
) -> None:
    [message] = tuning_messages(offsets, form)
    assert synth.read(message)
    for octave in synth.offsets():
        assert octave == pytest.approx(list(offsets), abs=error_cents + 1e-9)


def test_fluidsynth_tunes_a_channel_for_each_key(synth: Synth) -> None:
    offsets = retune(PACK.find("segah"), PACK.system, Intonation.WRITTEN).offsets
    assert all(synth.read(message) for message in tuning_messages(offsets, TuningForm.CHANNELS))
    found = [synth.fine_tuning(channel) for channel in channel_of_key()]
    assert found == pytest.approx(list(offsets), abs=0.0062)


def test_fluidsynth_does_not_understand_a_message_that_is_cut_off(synth: Synth) -> None:
    [message] = tuning_messages(QUARTER_AND_COMMA, TuningForm.TWO_BYTES)
    assert not synth.read(message[:-3] + b"\xf7")
