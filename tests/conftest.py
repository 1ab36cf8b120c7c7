"""What every test shares: the repository's root on the path, and the places of fixtures and siblings."""

from __future__ import annotations

import sys
from pathlib import Path

ROOT = Path(__file__).parent.parent
sys.path.insert(0, str(ROOT))
