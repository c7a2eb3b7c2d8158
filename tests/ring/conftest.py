"""Lets the tests of rings import the exact blurred ring beside them."""

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))
