"""melodycoach: which mode does a phrase imply, what does it still owe, and why."""

__version__ = "0.1.0"
