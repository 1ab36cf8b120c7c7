"""The devices of a bench: board elements with model parameters, spreads and temperature rises."""

from __future__ import annotations

from typing import TYPE_CHECKING

from protlint.board.graph import Element
from protlint.solve.boundary import Missing, Notes, Place, toml_key
from protlint.solve.circuit import Device

if TYPE_CHECKING:
    from collections.abc import Mapping
