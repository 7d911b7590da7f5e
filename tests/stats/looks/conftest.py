"""Lets the tests of looks use the slow, literal forms beside them."""

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))
