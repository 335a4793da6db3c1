"""``python -m rfstage`` is the terminal program."""

import sys

from rfstage.cli import main

sys.exit(main())
