"""Keyboard profiles: what a player says of a keyboard that the keyboard does not say itself.

A profile is a TOML file, written by hand or by ``melodycoach retune --save``; ``docs/midi.md`` says what
may stand in it. Reading it gives a frozen value, or every fault at once.

Conventions
-----------
In a file channels count from 1 and ranges are in semitones, as keyboards show them. In a
`KeyboardProfile` channels count from 0 and everything is in cents, as in the tracker.
"""

from __future__ import annotations

import json
import tomllib
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from melodycoach.core.pitch import COMMA_CENTS, KEY_NAMES
from melodycoach.errors import (
    ProfileError,
    StorageError,
    UnknownNameError,
    nearest_names,
    system_reason,
)
from melodycoach.sources.keyboard_rules import faults_in, key_number, zone_of
from melodycoach.sources.midi_pitch import DRUM_CHANNEL, PitchTracker
from melodycoach.sources.midi_tuning import ALL_CHANNELS, CLASSES, PLAIN_CENTS, StatedTuning

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping
    from pathlib import Path

    from melodycoach.sources.midi_mpe import MpeZone

SUFFIX = ".toml"


@dataclass(frozen=True, slots=True)
class KeyboardProfile:
    """What a player says of a keyboard.

    Parameters
    ----------
    name
        For people.
    cents_by_class
        How far each key is off its place, C to B, in every octave.
    channel
        The only channel that is heard, from 0; None: all but the drums'.
    semitones
        What a key sounds above its number.
    split_key
        Keys under this one are accompaniment; None: none are.
    zones
        MPE zones of a surface that does not announce them.
    tuning
        What the keys are tuned to, in a few words.
    note
        What the player wants to remember of it.
    """

    name: str
    cents_by_class: tuple[float, ...] = (0.0,) * CLASSES
    channel: int | None = None
    semitones: int = 0
    split_key: int | None = None
    zones: tuple[MpeZone, ...] = ()
    tuning: str = ""
    note: str = ""

    @property
    def stated(self) -> StatedTuning:
        """What the tracker begins with."""
        return StatedTuning(self.cents_by_class, self.semitones)

    @property
    def is_tuned(self) -> bool:
        """Whether any key is off its place."""
        return any(abs(cents) >= PLAIN_CENTS for cents in self.cents_by_class)

    @property
    def split_sounds(self) -> int | None:
        """The number of the lowest key of the melody after transposition; None: there is no split."""
        return None if self.split_key is None else self.split_key + self.semitones

    def tracker(self, port_number: int = 0) -> PitchTracker:
        """Make a tracker that reads the keyboard as the profile says."""
        return PitchTracker(port_number, self.ignored_channels, self.zones, self.stated)

    @property
    def ignored_channels(self) -> frozenset[int]:
        """The channels whose notes are not heard."""
        if self.channel is None:
            return frozenset({DRUM_CHANNEL})
        return frozenset(ALL_CHANNELS) - {self.channel}


def find_keyboards(folder: Path) -> dict[str, Path]:
    """Give the file of every profile in a folder by its name, without reading any.

    Raises
    ------
    StorageError
        The folder is there and cannot be read.
    """
    try:
        paths = sorted(path for path in folder.iterdir() if path.suffix == SUFFIX and path.is_file())
    except FileNotFoundError:
        return {}
    except OSError as error:
        raise StorageError(
            f"{folder}: the folder of your keyboard profiles cannot be read ({system_reason(error)}); "
            "mend or remove it"
        ) from error
    return {path.stem: path for path in paths}


def list_keyboards(folder: Path) -> tuple[tuple[str, Path, str], ...]:
    """Read every profile of a folder; give its name, its file, and why it cannot be used, or nothing."""
    found = []
    for name, path in find_keyboards(folder).items():
        try:
            read_keyboard(path)
        except (ProfileError, StorageError) as error:
            found.append((name, path, str(error)))
        else:
            found.append((name, path, ""))
    return tuple(found)


def keyboard_path(name_or_path: str, folder: Path) -> Path:
    r"""Give the file that a name of a profile, or a path, stands for; it need not exist.

    >>> from pathlib import Path
    >>> keyboard_path("oud", Path("keyboards")).as_posix(), keyboard_path("a/oud.toml", Path("x")).as_posix()
    ('keyboards/oud.toml', 'a/oud.toml')
    """
    if name_or_path.endswith(SUFFIX) or {"/", "\\"} & set(name_or_path):
        return type(folder)(name_or_path)
    return folder / f"{name_or_path}{SUFFIX}"


def load_keyboard(name_or_path: str, folder: Path) -> KeyboardProfile:
    """Read a profile by its name, in any letter case, or from a file.

    Raises
    ------
    UnknownNameError
        No profile has that name.
    StorageError
        The file is missing or cannot be read.
    ProfileError
        It can be read and not used; `faults` says why.
    """
    path = keyboard_path(name_or_path, folder)
    if path.parent != folder:
        return read_keyboard(path)
    known = find_keyboards(folder)
    found = known.get(path.stem) or {name.casefold(): at for name, at in known.items()}.get(
        path.stem.casefold()
    )
    if found is None:
        hint = nearest_names(path.stem, known) if known else "there is none yet; docs/midi.md shows one"
        raise UnknownNameError(f"no keyboard profile {name_or_path!r} in {folder}; {hint}")
    return read_keyboard(found)


def read_keyboard(path: Path) -> KeyboardProfile:
    """Read one profile.

    Raises
    ------
    StorageError
        The file is missing or cannot be read.
    ProfileError
        It is not TOML, or says what cannot be; `faults` has a line for every fault.
    """
    try:
        data = path.read_bytes()
    except OSError as error:
        raise StorageError(f"{path}: cannot be read ({system_reason(error)}); choose another file") from error
    try:
        table = tomllib.loads(data.decode("utf-8"))
    except UnicodeDecodeError as error:
        text = f"{path.name}: byte {error.start} is not UTF-8 text; save the file as UTF-8"
        raise ProfileError(f"{path}: not a keyboard profile, expected a TOML file", (text,)) from error
    except (ValueError, RecursionError) as error:  # tomllib lets more through than its own TOMLDecodeError
        said = "nested too deeply" if isinstance(error, RecursionError) else str(error)
        text = f"{path.name}: {said[:1].lower()}{said[1:]}"
        raise ProfileError(f"{path}: not a keyboard profile, expected a TOML file", (text,)) from error
    faults = [f"{path.name}: {fault}" for fault in faults_in(table)]
    if faults:
        count = "1 fault" if len(faults) == 1 else f"{len(faults)} faults"
        raise ProfileError(
            f"{path}: {count} in this keyboard profile, expected none; mend what follows", faults
        )
    return _profile(table["keyboard"])


def write_keyboard(profile: KeyboardProfile) -> str:
    """Write a profile as the text of a file; `read_keyboard` gives it back, to a hundredth of a cent."""
    offsets = [_number(cents) for cents in profile.cents_by_class]
    sizes = [max(len(name), len(offset)) for name, offset in zip(KEY_NAMES, offsets, strict=True)]
    lines = [
        "# A keyboard profile of melodycoach; docs/midi.md says what may stand in it.",
        "[keyboard]",
        f"name = {_text(profile.name)}",
        *([f"note = {_text(profile.note)}"] if profile.note else []),
        *([f"tuning = {_text(profile.tuning)}"] if profile.tuning else []),
        f"#        {_spread(KEY_NAMES, sizes, '  ')}",
        f"cents = [{_spread(offsets, sizes, ', ')}]",
    ]
    if profile.channel is not None:
        lines.append(f"channel = {profile.channel + 1}")
    if profile.semitones:
        lines.append(f"transposition = {profile.semitones}")
    if profile.split_key is not None:
        octave, place = divmod(profile.split_key, CLASSES)
        lines.append(f"split = {_text(f'{KEY_NAMES[place]}{octave - 1}')}")
    for zone in profile.zones:
        lines += [
            "",
            "[[keyboard.mpe]]",
            f"manager = {zone.manager + 1}",
            f"members = {zone.n_members}",
            f"range = {_number(zone.member_range_cents / 100)}",
        ]
    return "\n".join([*lines, ""])


def _spread(words: Iterable[str], sizes: Iterable[int], between: str) -> str:
    return between.join(f"{word:>{size}}" for word, size in zip(words, sizes, strict=True))


def _number(value: float) -> str:
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def _text(text: str) -> str:
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


# --- values; everything below trusts that there are no faults


def _profile(table: Mapping[str, Any]) -> KeyboardProfile:
    commas = [COMMA_CENTS * number for number in table.get("commas", ())]
    channel = table.get("channel")
    return KeyboardProfile(
        name=table["name"],
        cents_by_class=tuple(float(cents) for cents in table.get("cents", commas or [0] * CLASSES)),
        channel=None if channel is None else channel - 1,
        semitones=table.get("transposition", 0),
        split_key=key_number(table.get("split", "")),
        zones=tuple(zone_of(zone) for zone in table.get("mpe", ())),
        tuning=table.get("tuning", ""),
        note=table.get("note", ""),
    )
