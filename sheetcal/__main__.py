"""`python -m sheetcal` runs the command line."""

import sys

from sheetcal.cli import main

sys.exit(main())
