"""melodycoach: which mode does a phrase imply, what does it still owe, and why."""

__version__ = "0.1.0"

DEFAULT_PACK = "makam"
"""The mode pack that is used where none is named."""
