"""A keyboard that is not there: a process of its own that offers one MIDI output over JACK.

Run as ``python keyboard.py NAME``. It writes ``ready`` when the port exists, then obeys lines from
standard input: a message in hex is sent; ``wait SECONDS`` waits; ``sync`` answers ``done``. When
standard input ends, or the process is ended, the port is gone: the keyboard was unplugged.
"""

import sys
import time


def say(word: str) -> None:
    sys.stdout.write(f"{word}\n")
    sys.stdout.flush()


def main() -> None:
    import rtmidi  # not at the top: pytest looks for doctests here, also where there is none

    out = rtmidi.MidiOut(rtmidi.API_UNIX_JACK, name=sys.argv[1])
    out.open_virtual_port("out")
    say("ready")
    for line in sys.stdin:
        word, _, rest = line.strip().partition(" ")
        if word == "sync":
            say("done")
        elif word == "wait":
            time.sleep(float(rest))
        elif word:
            out.send_message(list(bytes.fromhex(line)))
    out.close_port()
    out.delete()


if __name__ == "__main__":
    main()
