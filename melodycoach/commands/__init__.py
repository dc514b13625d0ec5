"""The commands: each module adds one to the command line and runs it. They print; so does `cli.py`."""
