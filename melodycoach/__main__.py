"""Run `python -m melodycoach`."""

import sys

from melodycoach.cli import main

sys.exit(main())
