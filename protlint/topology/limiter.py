"""What the matcher hands on: a limiter, or a fault, as a group of parts with roles and named nets."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

ROLES = (
    "pass", "driver", "sense", "shunt", "base_stop", "preset", "steering", "compensation", "drive", "others",
)  # fmt: skip
"""The roles of a limiter, as every report names them."""

NETS = ("drive", "feed", "sense", "far", "output")
"""The nets of a limiter: the shunt's collector side, where the drive comes from, both ends of the sense resistance, the
output."""


@dataclass(frozen=True, slots=True)
class Limiter:
    """A found group around one shunt.

    ``id`` is the output pass device's part id (in parallel, the sensed one; a second shunt at one pass device is named with
    it, ``Q10 (Q12)``). ``elements`` maps a role of the rule, in its
    full form (``preset.upper``, ``compensation``), to board element indices; ``roles`` maps the ten report roles to part
    ids; ``nets`` maps the five report nets to board net indices, ``bound`` every net name of the rule.
    """

    id: str
    topology: str
    polarity: str
    """``n`` where the shunt or pass device is NPN or N-channel, ``p`` for the mirror."""
    elements: Mapping[str, tuple[int, ...]]
    roles: Mapping[str, tuple[str, ...]]
    nets: Mapping[str, int | None]
    bound: Mapping[str, int] = field(default_factory=dict)
    grounded: tuple[str, ...] = ()
    """The names among ``bound`` whose load lies between them and ground."""
    also_matched: tuple[str, ...] = ()
    """Other topologies that fit the same shunt and gave way, for the survey."""
    places: Mapping[str, str] = field(default_factory=dict)
    """Where a part stands, by part id: every compensation (``base to emitter of the shunt``) and most of the others."""


@dataclass(frozen=True, slots=True)
class FaultMatch:
    """A fault rule that fitted: the fault's name, the sound topology it spoils, and the same bindings as a limiter.

    ``says`` is the rule's sentence with names filled in. The cure is one of: ``exchange`` the connections of each pair,
    (part id, pin role) each; ``moves`` connections to board nets; ``replaces`` parts by ones of another kind; ``parts_ends``
    the ends of parts that are on one net and have to be on two, where ``links`` names the links that short them.
    """

    fault: str
    spoils: str
    group: Limiter
    says: str
    exchange: tuple[tuple[tuple[str, str], tuple[str, str]], ...]
    moves: tuple[tuple[tuple[str, str], int], ...] = ()
    replaces: tuple[tuple[str, str], ...] = ()
    parts_ends: tuple[str, ...] = ()
    links: tuple[str, ...] = ()
    turned: str | None = None
    """The transistor that stands turned round, where that is all that is wrong."""
    beside: bool = False
    """Whether the rest is a sound limiter, which only lacks that transistor."""


@dataclass(frozen=True, slots=True)
class Found:
    """All that matching found on a board, in board order, and what it wants to tell the survey."""

    limiters: tuple[Limiter, ...]
    faults: tuple[FaultMatch, ...] = ()
    remarks: tuple[str, ...] = ()
    pairs: tuple[tuple[str, str], ...] = ()
    """Complementary halves on one output, by limiter id: the N half, the P half."""
    sets: tuple[tuple[str, ...], ...] = ()
    """Like channels, by limiter id."""
    unsearched: Mapping[int, tuple[str, ...]] = field(default_factory=dict)
    """Transistors that may be drawn wrong and around which not all was looked at, by the most crowded net there."""
