"""Edge out, live: core values become characters on a terminal."""
