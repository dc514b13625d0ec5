"""Find mode packs and read them: TOML to frozen values, or every fault at once.

Packs are TOML files; ``docs/pack-format.md`` describes them. Those that come with the program lie
in ``mode_packs/``; a player's own lie in a folder that the caller names, or anywhere.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from melodycoach.core.mode import (
    CharacteristicStep,
    Confidence,
    Course,
    Genus,
    Mode,
    ModePack,
    Need,
    Neighbour,
    Repertoire,
    Source,
    StepKind,
)
from melodycoach.core.pitch import TONE_SYSTEMS, NamedPitch, PitchNames, Spelling, ToneSystem, fold_name
from melodycoach.errors import PackError, StorageError, UnknownNameError, nearest_names, system_reason
from melodycoach.sources.pack_checks import read_spelling
from melodycoach.sources.pack_rules import faults_in

if TYPE_CHECKING:
    from collections.abc import Mapping

SHIPPED = Path(__file__).resolve().parent.parent / "mode_packs"
"""Where the packs that come with the program lie."""

SUFFIX = ".toml"


@dataclass(frozen=True, slots=True)
class PackEntry:
    """One pack as a list shows it.

    Parameters
    ----------
    name
        What ``--pack`` takes: the file's name without its suffix.
    path
        The file.
    shadows
        It is a player's own and stands in for one that comes with the program.
    pack
        The pack, or None if it cannot be used.
    faults
        Why it cannot be used.
    """

    name: str
    path: Path
    shadows: bool
    pack: ModePack | None
    faults: tuple[str, ...] = ()


def find_packs(user_dir: Path | None = None) -> dict[str, Path]:
    """Give the file of every pack by its name, without reading any.

    Parameters
    ----------
    user_dir
        The player's own folder of packs; it need not exist. A pack there takes the place of one of
        the same name that comes with the program; `shadowed_packs` says which do.

    Raises
    ------
    StorageError
        The folder is there and cannot be read.
    """
    return {**_packs_in(SHIPPED), **(_packs_in(user_dir) if user_dir else {})}


def shadowed_packs(user_dir: Path | None = None) -> dict[str, Path]:
    """Give the player's own packs that stand in for one of the program's, by name."""
    shipped = _packs_in(SHIPPED)
    own = _packs_in(user_dir) if user_dir else {}
    return {name: path for name, path in own.items() if name in shipped}


def list_packs(user_dir: Path | None = None) -> tuple[PackEntry, ...]:
    """Read every pack that can be found; a damaged one is listed with its faults, not raised."""
    shadowing = shadowed_packs(user_dir)
    return tuple(_entry(name, path, name in shadowing) for name, path in sorted(find_packs(user_dir).items()))


def is_pack_file(name_or_path: str) -> bool:
    r"""Tell the path of a pack file from the name of a pack.

    >>> is_pack_file("makam"), is_pack_file("mine.toml"), is_pack_file("../mine"), is_pack_file(r"C:\mine")
    (False, True, True, True)
    """
    return name_or_path.endswith(SUFFIX) or bool({"/", "\\"} & set(name_or_path))


def load_pack(name_or_path: str | Path, user_dir: Path | None = None) -> ModePack:
    """Read a pack by its name, or from a file.

    Parameters
    ----------
    name_or_path
        The name of a pack that `find_packs` finds, in any spelling, or the path of a file. A text
        that ends in ``.toml`` or holds a slash is a path.
    user_dir
        The player's own folder of packs.

    Raises
    ------
    UnknownNameError
        No pack has that name.
    StorageError
        The file is missing or cannot be read.
    PackError
        It can be read and not used; `faults` says why.
    """
    if isinstance(name_or_path, Path) or is_pack_file(name_or_path):
        return read_pack(Path(name_or_path))
    packs = find_packs(user_dir)
    folded = {fold_name(name): path for name, path in packs.items()}
    path = packs.get(name_or_path) or folded.get(fold_name(name_or_path))
    if path is None:
        raise UnknownNameError(
            f"no mode pack {name_or_path!r}; {nearest_names(name_or_path, packs)}"
            + (f" (looked in {user_dir} too)" if user_dir else "")
        )
    return read_pack(path)


def read_pack(path: Path) -> ModePack:
    """Read one pack file.

    Returns
    -------
    A pack whose values are frozen and hold to the rules of `melodycoach.sources.pack_rules`.

    Raises
    ------
    StorageError
        The file is missing or cannot be read.
    PackError
        It is not TOML, or breaks a rule; `faults` has a line for every fault.
    """
    data = _parse(path)
    faults = faults_in(data, path.name)
    if faults:
        count = "1 fault" if len(faults) == 1 else f"{len(faults)} faults"
        raise PackError(f"{path}: {count} in this mode pack, expected none; mend what follows", faults)
    return _pack(data)


# --- files


def _packs_in(folder: Path) -> dict[str, Path]:
    try:
        paths = sorted(path for path in folder.iterdir() if path.suffix == SUFFIX and path.is_file())
    except FileNotFoundError:
        return {}
    except OSError as error:
        raise StorageError(
            f"{folder}: the folder of your mode packs cannot be read ({system_reason(error)}); "
            "mend or remove it"
        ) from error
    return {path.stem: path for path in paths}


def _entry(name: str, path: Path, shadows: bool) -> PackEntry:
    try:
        return PackEntry(name, path, shadows, read_pack(path))
    except PackError as error:
        return PackEntry(name, path, shadows, None, error.faults)
    except StorageError as error:
        return PackEntry(name, path, shadows, None, (str(error),))


def _parse(path: Path) -> dict[str, Any]:
    try:
        with path.open("rb") as file:
            return tomllib.load(file)
    except FileNotFoundError as error:
        raise StorageError(f"{path}: no such file; {_files_like(path)}") from error
    except OSError as error:
        raise StorageError(f"{path}: cannot be read ({system_reason(error)}); choose another file") from error
    except UnicodeDecodeError as error:
        text = f"{path.name}: byte {error.start} is not UTF-8 text; save the file as UTF-8"
        raise PackError(f"{path}: not a mode pack, expected a TOML file", (text,)) from error
    except (ValueError, RecursionError) as error:  # tomllib lets more through than its own TOMLDecodeError
        said = "nested too deeply" if isinstance(error, RecursionError) else str(error)
        text = f"{path.name}: {said[:1].lower()}{said[1:]}"
        raise PackError(f"{path}: not a mode pack, expected a TOML file", (text,)) from error


def _files_like(path: Path) -> str:
    try:
        names = [one.name for one in path.parent.iterdir() if one.suffix == SUFFIX]
    except OSError:
        return f"there is no folder {str(path.parent)!r} either"
    return nearest_names(path.name, names) if names else f"no mode packs in {str(path.parent)!r}"


# --- values; everything below trusts that the data passed the gates


def _pack(data: Mapping[str, Any]) -> ModePack:
    head = data["pack"]
    system = TONE_SYSTEMS[head["tone_system"]]
    families = {family["id"]: family["name"] for family in data.get("family", ())}
    return ModePack(
        id=head["id"],
        name=head["name"],
        system=system,
        names=PitchNames(
            system,
            tuple(_perde(one, system) for one in data.get("perde", ())),
            tuple(data.get("words", {}).items()),
        ),
        theory=head["theory"],
        caution=head["caution"],
        modes=tuple(_mode(one, head["id"], system, families) for one in data["mode"]),
        sources=tuple(Source(one["id"], one["kind"], one["title"]) for one in data.get("source", ())),
    )


def _perde(item: Mapping[str, Any], system: ToneSystem) -> NamedPitch:
    spelling = _spelling(item["note"], octave=True)
    return NamedPitch(item["name"], int(system.spelling_units(spelling)), spelling)


def _mode(item: Mapping[str, Any], pack_id: str, system: ToneSystem, families: Mapping[str, str]) -> Mode:
    played = {int(degree): float(value) for degree, value in item.get("played", {}).items()}
    sources = {fact: tuple(ids) for fact, ids in item.get("sources", {}).items()}
    low, high = item["opening"]
    return Mode(
        id=f"{pack_id}/{item['id']}",
        name=item["name"],
        final_units=int(system.spelling_units(_spelling(item["final"], octave=True))),
        rising=tuple(item["rising"]),
        falling=tuple(item.get("falling", item["rising"])),
        below=tuple(sorted(item.get("below", ()))),
        above=tuple(sorted(item.get("above", ()))),
        passing=tuple(sorted(item.get("passing", ()))),
        played=MappingProxyType(played),
        genera=tuple(Genus(one["name"], one["at"], one.get("when", "")) for one in item.get("genera", ())),
        dominants=tuple(item["dominants"]),
        leading=tuple(item.get("leading", ())),
        suspended=tuple(item.get("suspended", ())),
        course=Course(item["course"]),
        opening=(low, high),
        steps=tuple(_step(one, f"{item['id']}-{number}") for number, one in enumerate(item["step"], 1)),
        neighbours=tuple(
            Neighbour(f"{pack_id}/{one['mode']}", one["difference"]) for one in item.get("neighbour", ())
        ),
        signature=tuple(_spelling(one, octave=False) for one in item.get("signature", ())),
        also=tuple(item.get("also", ())),
        family=families.get(item.get("family", ""), ""),
        sources=MappingProxyType(sources),
        confidence=Confidence(item.get("confidence", Confidence.MEDIUM)),
        repertoire=Repertoire(item.get("repertoire", Repertoire.COMMON)),
    )


def _step(item: Mapping[str, Any], step_id: str) -> CharacteristicStep:
    kind, need = StepKind(item["kind"]), Need(item["need"])
    return CharacteristicStep(step_id, kind, need, tuple(item["degrees"]), item.get("note", ""))


def _spelling(text: str, *, octave: bool) -> Spelling:
    spelling = read_spelling(text, octave=octave)
    assert spelling is not None, text
    return spelling
