"""Edge out, on paper: results become text and JSON."""
