"""The MIDI ports of this machine on paper, and what to do when there are none."""

from __future__ import annotations

from typing import Any


def ports_text(ports: dict[str, Any]) -> str:
    """List the ports for people.

    Parameters
    ----------
    ports
        ``inputs`` and ``outputs``, each a list of ``name`` and ``system``; ``problem``, why there
        can be none, or empty; ``keyboards``, the player's keyboard profiles, a list of ``name``, ``path``
        and ``fault``, which is empty where the profile can be used.
    """
    lines = []
    for title, kind in (("MIDI inputs", "inputs"), ("MIDI outputs", "outputs")):
        lines.append(f"{title}:")
        lines += [f"  {port['name']}  ({port['system']})" for port in ports[kind]] or ["  none"]
    if ports["problem"]:
        lines.append(ports["problem"])
    elif not ports["inputs"]:
        lines += [
            "",
            "No keyboard was found. Plug one in and switch it on: it is taken as soon as it appears.",
            "On Linux the MIDI sequencer of ALSA or a JACK server has to run. You can always type notes.",
        ]
    else:
        lines += ["", "melodycoach listen --port NAME listens to one of them; a part of its name will do."]
    return "\n".join([*lines, *_keyboard_lines(ports["keyboards"])])


def _keyboard_lines(keyboards: list[dict[str, Any]]) -> list[str]:
    if not keyboards:
        return []
    shown = [f"  {one['name']}" + (f"  {one['fault']}" if one["fault"] else "") for one in keyboards]
    return ["", "Your keyboard profiles, for melodycoach listen --keys NAME:", *shown]
