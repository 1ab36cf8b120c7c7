"""protlint: reviews the protective current limiters on a board from its EDIF netlist.

``read_netlist`` and ``review`` are loaded on first use, so that importing protlint stays light.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

__version__ = "0.1.0"
__all__ = ["ProtlintError", "read_netlist", "review"]

if TYPE_CHECKING:
    from protlint.netlist import read_netlist
    from protlint.pipeline import review
    from protlint.sources import ProtlintError


def __getattr__(name: str) -> Any:
    import importlib

    homes = {
        "read_netlist": "protlint.netlist",
        "review": "protlint.pipeline",
        "ProtlintError": "protlint.sources",
    }
    if name not in homes:
        raise AttributeError(f"module 'protlint' has no attribute {name!r}")
    return getattr(importlib.import_module(homes[name]), name)
