"""The shared modules of these tests run on MicroPython too, so they import each other by plain names."""

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))
