"""What every test shares: the root on the path, the places of fixtures and siblings, and the habits of hypothesis."""

from __future__ import annotations

import os
import sys
from pathlib import Path

from hypothesis import settings

ROOT = Path(__file__).parent.parent
sys.path.insert(0, str(ROOT))

# A busy machine is no failure, and in CI the same commit has to give the same answer.
settings.register_profile("protlint", deadline=None, derandomize="CI" in os.environ)
settings.load_profile("protlint")
