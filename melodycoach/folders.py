"""Where the program keeps what is the player's: own packs, keyboards, event logs, messages of drivers."""

from __future__ import annotations

from pathlib import Path

from platformdirs import user_config_path, user_data_path


def user_pack_dir() -> Path:
    """Where the player's own mode packs are looked for."""
    return Path(user_config_path("melodycoach")) / "packs"


def user_keyboard_dir() -> Path:
    """Where the player's keyboard profiles are looked for."""
    return Path(user_config_path("melodycoach")) / "keyboards"


def session_log_dir() -> Path:
    """Where event logs are kept."""
    return Path(user_data_path("melodycoach")) / "sessions"


def driver_log_path() -> Path:
    """Where the messages of MIDI drivers go while the full screen is up."""
    return Path(user_data_path("melodycoach")) / "drivers.log"
