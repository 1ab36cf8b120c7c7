"""Quantities at the doors: what people write, what schematics write, and the preferred values.

:mod:`~protlint.quantities.units` reads and prints quantities with units, :mod:`~protlint.quantities.valuetext` reads the
value texts of a schematic, :mod:`~protlint.quantities.series` holds IEC 60063. Everything here is an SI float
(temperatures in degC).
"""

from protlint.quantities.series import preferred, within
from protlint.quantities.units import (
    DIMENSIONS,
    format_pair,
    format_quantity,
    format_ratio,
    read_any,
    read_quantity,
    read_range,
)
from protlint.quantities.valuetext import Comma, ValueText, read_beside, read_value

__all__ = [
    "DIMENSIONS",
    "Comma",
    "ValueText",
    "format_pair",
    "format_quantity",
    "format_ratio",
    "preferred",
    "read_any",
    "read_beside",
    "read_quantity",
    "read_range",
    "read_value",
    "within",
]
