"""Imports point one way: every file of the package is walked and held against one table."""

import ast
from pathlib import Path

import pytest

PACKAGE = Path(__file__).resolve().parent.parent / "melodycoach"

OURS_BY_LAYER = {
    "errors": set(),
    "core": {"errors", "core"},
    "sources": {"errors", "core", "sources"},
    "screen": {"errors", "core", "screen"},
    "report": {"errors", "core", "report"},
}
THIRD_PARTY_BY_LAYER = {
    "errors": set(),
    "core": {"numpy"},
    "sources": {"numpy", "mido", "rtmidi"},
    "screen": set(),
    "report": {"numpy"},
}
ALLOWED_ANYWHERE_ELSE = {"numpy", "platformdirs"}
EXTRA_BY_FILE = {"screen/terminal.py": {"prompt_toolkit"}}
THIRD_PARTY = {"numpy", "mido", "rtmidi", "prompt_toolkit", "platformdirs"}
IMPURE = {
    "threading",
    "time",
    "random",
    "os",
    "pathlib",
    "io",
    "socket",
    "subprocess",
    "datetime",
    "tempfile",
}

FILES = sorted(PACKAGE.rglob("*.py"))


def imported(path: Path) -> set[str]:
    names: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: a relative import hides where it points"
            names |= {f"{node.module}.{alias.name}" for alias in node.names}
    return names


def test_the_walk_found_the_package() -> None:
    assert len(FILES) > 20


@pytest.mark.parametrize("path", FILES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_imports_point_one_way(path: Path) -> None:
    place = path.relative_to(PACKAGE)
    layer = place.parts[0].removesuffix(".py")
    names = imported(path)
    ours = {name.split(".")[1] for name in names if name.startswith("melodycoach.")}
    third = {name.split(".")[0] for name in names} & THIRD_PARTY
    if layer in OURS_BY_LAYER:
        assert ours <= OURS_BY_LAYER[layer] | {"__version__"}
        assert third <= THIRD_PARTY_BY_LAYER[layer] | EXTRA_BY_FILE.get(place.as_posix(), set())
    else:
        assert third <= ALLOWED_ANYWHERE_ELSE


@pytest.mark.parametrize("path", sorted((PACKAGE / "core").glob("*.py")), ids=lambda path: path.name)
def test_core_touches_no_clock_file_thread_or_chance(path: Path) -> None:
    assert not {name.split(".")[0] for name in imported(path)} & IMPURE
