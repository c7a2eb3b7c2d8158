"""`python -m ringwright` is the command line."""

import sys

from ringwright.cli import main

sys.exit(main())
