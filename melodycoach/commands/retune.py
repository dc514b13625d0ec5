"""`melodycoach retune`: twelve offsets that put a keyboard's keys on a mode; sent, saved, written out."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

from melodycoach.commands.exit_codes import DONE
from melodycoach.commands.options import add_json, add_pack, load_named_pack, new_command
from melodycoach.commands.printing import columns, print_result
from melodycoach.errors import UsageError

if TYPE_CHECKING:
    import argparse
    from collections.abc import Sequence

    from melodycoach.core.mode import ModePack
    from melodycoach.core.retuning import Retuning
    from melodycoach.sources.keyboard_profile import KeyboardProfile

FORMS = ("2-byte", "1-byte", "channel")
"""The values of `melodycoach.sources.tuning_messages.TuningForm`, which is loaded for sending only."""

_CHANNELS = 16


def add_retune(commands: Any) -> None:
    """Add the command."""
    says = "put the keys of a keyboard on the degrees of a mode: table, message, profile"
    command = new_command(commands, "retune", _run, says, "retune segah --send synth --save home")
    command.add_argument("mode", nargs="?", metavar="MODE", help="the mode, in any spelling")
    add_pack(command)
    command.add_argument("--final", metavar="PITCH", help="where it stands (default: its written final)")
    command.add_argument(
        "--as",
        dest="intonation",
        choices=("played", "written"),
        default="played",
        help="as usually played, or as the book writes it (default: played)",
    )
    command.add_argument("--plain", action="store_true", help="no MODE: put every key back in its place")
    add_json(command)
    sent = command.add_argument_group("to an instrument")
    sent.add_argument("--send", metavar="PORT", help="MIDI output; a part of its name will do")
    sent.add_argument(
        "--message",
        choices=FORMS,
        default=FORMS[0],
        help="scale/octave tuning of 2 or 1 bytes a key, or fine tuning, a channel a key (default: 2-byte)",
    )
    sent.add_argument(
        "--channels", type=_channels, metavar="N,N,…", help="tune only these, 1 to 16 (default: all)"
    )
    kept = command.add_argument_group("to keep")
    kept.add_argument("--save", metavar="PROFILE", help="save a keyboard profile, for listen --keys")
    kept.add_argument("--scl", metavar="FILE", help="write the scale of the mode as a Scala file")


def _channels(text: str) -> tuple[int, ...]:
    from argparse import ArgumentTypeError

    found = [int(word) if word.strip().isdecimal() else 0 for word in text.split(",")]
    if not all(1 <= channel <= _CHANNELS for channel in found):
        raise ArgumentTypeError(f"{text!r} are not channels from 1 to {_CHANNELS}, with commas between them")
    return tuple(sorted(set(found)))


def _run(options: argparse.Namespace) -> int:
    from melodycoach.report.retuning import plain_json, retuning_json, retuning_text

    _refuse_what_does_not_go_together(options)
    if options.plain:
        retuning, data = None, plain_json()
        offsets: Sequence[float] = [0.0] * len(data["keys"])
    else:
        pack = load_named_pack(options.pack)
        retuning = _retuning(options, pack)
        data, offsets = retuning_json(pack, retuning), retuning.offsets
    profile = _profile_to_save(options, retuning, offsets)
    scale = None if retuning is None else _scale_to_write(options, pack, retuning)
    done: list[str] = []
    data["sent"] = _send(options, offsets, done)
    data["saved"] = _save(options, profile, done)
    data["scl"] = _write_scale(options, scale, done)
    print_result(options.json, data, lambda: retuning_text(data, columns(), done))
    return DONE


def _refuse_what_does_not_go_together(options: argparse.Namespace) -> None:
    wrong = (
        (
            options.plain and options.mode,
            "--plain and MODE: back in their places or on a mode; leave one out",
        ),
        (not options.plain and not options.mode, "no MODE; name one, or put every key back with --plain"),
        (options.plain and options.scl, "--plain and --scl: the scale of a mode is written; name a MODE"),
        (options.plain and options.final, "--plain and --final: without a MODE there is no final"),
        (options.channels and not options.send, "--channels goes with --send"),
        (options.message != FORMS[0] and not options.send, "--message goes with --send"),
        (
            options.message == "channel" and options.channels and len(options.channels) < 12,
            "--message channel needs a channel for each of twelve keys: name more of them",
        ),
    )
    for is_so, sentence in wrong:
        if is_so:
            raise UsageError(sentence)


def _retuning(options: argparse.Namespace, pack: ModePack) -> Retuning:
    from melodycoach.core.event import PitchReading
    from melodycoach.core.retuning import Intonation, retune
    from melodycoach.line_text import read_final

    final_cents: float | None = None
    if options.final is not None:
        reading, final_cents = read_final(options.final, pack.names)
        if reading is PitchReading.ANY:
            raise UsageError("--final any: keys are tuned for one final; name it, or leave --final out")
    return retune(pack.find(options.mode), pack.system, Intonation(options.intonation), final_cents)


# --- to an instrument


def _send(options: argparse.Namespace, offsets: Sequence[float], done: list[str]) -> dict[str, Any] | None:
    if options.send is None:
        return None
    from melodycoach.report.retuning import sent_sentences
    from melodycoach.sending import send_to
    from melodycoach.sources.tuning_messages import TuningForm, channel_of_key, tuning_messages

    form = TuningForm(options.message)
    chosen = None if options.channels is None else [channel - 1 for channel in options.channels]
    messages = tuning_messages(offsets, form, chosen)
    if form is TuningForm.CHANNELS:
        told: Sequence[int] = channel_of_key(chosen)
    else:
        told = range(_CHANNELS) if chosen is None else chosen
    sent = {
        "port": send_to(options.send, messages),
        "message": form.value,
        "channels": [channel + 1 for channel in told],
        "bytes": [message.hex(" ").upper() for message in messages],
    }
    done += sent_sentences(sent)
    return sent


# --- to keep


def _profile_to_save(
    options: argparse.Namespace, retuning: Retuning | None, offsets: Sequence[float]
) -> tuple[Path, KeyboardProfile, bool] | None:
    """Make the profile, and find out what is in its place already: that keeps all but its tuning."""
    if options.save is None:
        return None
    from dataclasses import replace

    from melodycoach.core.retuning import manner_words
    from melodycoach.folders import user_keyboard_dir
    from melodycoach.sources.keyboard_profile import KeyboardProfile, keyboard_path, read_keyboard

    path = keyboard_path(options.save, user_keyboard_dir())
    if not path.stem.strip() or not path.stem.isprintable():
        raise UsageError(
            f"--save {options.save!r}: not a name for a keyboard profile, expected one such as home"
        )
    is_new = not path.exists()
    before = KeyboardProfile(path.stem) if is_new else read_keyboard(path)
    tuned = tuple(round(cents, 2) for cents in offsets)
    what = "" if retuning is None else f"{retuning.mode.name}, {manner_words(retuning.intonation)}"
    return path, replace(before, cents_by_class=tuned, tuning=what), is_new


def _save(
    options: argparse.Namespace, saved: tuple[Path, KeyboardProfile, bool] | None, done: list[str]
) -> str | None:
    if saved is None:
        return None
    from melodycoach.report.retuning import saved_sentence
    from melodycoach.sources.keyboard_profile import write_keyboard
    from melodycoach.storing import write_whole

    path, profile, is_new = saved
    write_whole(path, [write_keyboard(profile)])
    done.append(saved_sentence(options.save, str(path), is_new))
    return str(path)


def _scale_to_write(options: argparse.Namespace, pack: ModePack, retuning: Retuning) -> str | None:
    """Write the scale as text, unless there is another kind of file in its place."""
    if options.scl is None:
        return None
    from melodycoach.core.retuning import manner_words, octave_scale
    from melodycoach.sources.scala import write_scala

    _refuse_other_kinds(Path(options.scl))
    final, unit = retuning.final_cents, pack.system.unit_cents
    scale = octave_scale(retuning.mode, pack.system, retuning.intonation)
    notes = [(cents, pack.names.name(final + degree * unit)) for degree, cents in scale]
    manner = manner_words(retuning.intonation)
    description = f"{retuning.mode.name} on {pack.names.name(final)}, {manner}"
    return write_scala(Path(options.scl).name, description, notes)


def _refuse_other_kinds(path: Path) -> None:
    from melodycoach.errors import StorageError
    from melodycoach.sources.scala import looks_like_scala

    try:
        with path.open("rb") as file:
            start = file.read(64)
    except OSError:
        return  # it is not there yet, or writing it will say what is wrong
    if not looks_like_scala(start):
        raise StorageError(f"{path}: there is a file there that is no Scala scale; choose another name")


def _write_scale(options: argparse.Namespace, scale: str | None, done: list[str]) -> str | None:
    if scale is None:
        return None
    from melodycoach.storing import write_whole

    write_whole(Path(options.scl), [scale])
    done.append(f"The scale is in {options.scl}.")
    return str(options.scl)
