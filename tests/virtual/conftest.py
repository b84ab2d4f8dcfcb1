"""The helpers of these tests are imported by plain names."""

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))
