"""Edge in: files, ports and text become core values."""
