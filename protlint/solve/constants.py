"""Physical constants and the temperature that model parameters are stated at."""

from __future__ import annotations

from typing import Final

BOLTZMANN_V_PER_K: Final = 8.617333262e-5
"""k / q, from the exact SI values of 2019."""

T0_K: Final = 300.15
"""27 degC."""

KELVIN: Final = 273.15
"""0 degC."""
