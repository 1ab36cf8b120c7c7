"""Where things are."""

from __future__ import annotations

from pathlib import Path

ROOT = Path(__file__).parent.parent.parent
FIXTURES = ROOT / "fixtures"
SHARED = ROOT.parent / "shared"
"""A folder of outside material that may stand beside the checkout; tests that use it skip loudly where it is absent."""
