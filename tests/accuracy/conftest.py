"""Lets the accuracy programmes, which also run as scripts, be imported by the tests beside them."""

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))
