"""The pure part: values in, values out; no clock, file, thread, screen or chance."""
