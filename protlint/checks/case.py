"""What a check is given: one limiter, its circuit and solution, and what the board needs of it."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any, TypeVar

from protlint.board.graph import Board, BoardPart
from protlint.board.parts_list import Difference
from protlint.checks.catalogue import CheckRow
from protlint.checks.derating import derated, share_of
from protlint.findings import Finding, Fit, Level, NotChecked, WorkingLine
from protlint.limits import UNSTATED, CheckSetting, LimiterLimits, Limits, Range
from protlint.partdata.book import Figure
from protlint.solve.bench import Bench
from protlint.solve.circuit import FEED, Circuit, Device
from protlint.solve.conditions import Condition, Known, solve_under
from protlint.solve.memo import Memo
from protlint.solve.solution import Currents, Point, Solution
from protlint.toml.text import toml_key
from protlint.topology.limiter import Limiter

T = TypeVar("T")

UNBOUNDED_A = 1e3
"""No limiter of a board holds as much: where a solved current does, the drive is stated too stiff."""

ALL_ASSUMPTIONS = ("drive", "short", "supply", "model", "tolerance", "circuit", "ambient_degC", "vbe_spread_V")
"""Everything a number can rest on that nobody stated: subjects of the bench, and fields of the limits file."""

DRAWN = ("drive", "short", "supply", "model", "circuit", "ambient_degC")
"""What a figure rests on that is solved as drawn, without tolerances."""

VOLTAGES = ("drive", "short", "supply", "circuit")
"""What the voltages rest on that a junction has to block: the ambient and the models hardly move them."""


@dataclass(frozen=True, slots=True)
class Case:
    """One limiter before the checks.

    ``rows`` is the catalogue, ``differences`` what a parts list says otherwise than the netlist, by part id.
    ``assumptions`` collects what a check had to assume besides.
    """

    board: Board
    limiter: Limiter
    bench: Bench
    solution: Solution
    needs: LimiterLimits
    limits: Limits
    rows: Mapping[str, CheckRow]
    differences: Mapping[str, tuple[Difference, ...]] = field(default_factory=dict)
    assumptions: list[str] = field(default_factory=list)
    known: Known = field(default_factory=Known)
    solved: Memo = field(default_factory=Memo)
    """What was solved for this review, equal circuits once: points under stated conditions, and whole solutions."""
    advised: bool = True
    """Whether checks may work out how to calm a loop, which takes long."""
    worked_out: dict[str, Any] = field(init=False, default_factory=dict, repr=False, compare=False)
    """What several checks ask of this very case; a changed one begins anew."""

    @property
    def circuit(self) -> Circuit:
        """The circuit; only for checks that are asked where it could be solved."""
        assert self.bench.circuit is not None
        return self.bench.circuit

    def threshold(self, check: str, name: str) -> float:
        """Return a check's threshold: the limiter's own, else the limits file's, else the catalogue's."""
        for settings in (self.needs.checks, self.limits.checks):
            setting: CheckSetting | None = settings.get(check)
            if setting is not None and name in setting.thresholds:
                return setting.thresholds[name]
        return self.rows[check].thresholds[name].value

    def assumes(self, *subjects: str) -> bool:
        """Tell whether any of these subjects was assumed for this limiter (see :data:`ALL_ASSUMPTIONS`)."""
        of_bench = {subject for subject, _ in self.bench.assumed}
        return any(one in of_bench or (one in UNSTATED and self.limits.assumes(one)) for one in subjects)

    def parts(self, *roles: str) -> tuple[str, ...]:
        """Return the part ids that stand in the given roles, in the order given."""
        return tuple(part for role in roles for part in self.limiter.roles.get(role, ()))

    def part(self, part_id: str) -> BoardPart:
        """Return a part of the board by id."""
        return self.board.part_of[part_id]

    def changed(self, circuit: Circuit, solution: Solution) -> Case:
        """Return the case of the same limiter with another circuit, and what that comes to."""
        return replace(self, bench=replace(self.bench, circuit=circuit), solution=solution)

    def once(self, what: str, work: Callable[[], T]) -> T:
        """Return what ``work`` gives, worked out when it is first asked for."""
        if what not in self.worked_out:
            self.worked_out[what] = work()
        found: T = self.worked_out[what]
        return found

    def under(self, conditions: Sequence[Condition]) -> tuple[Point | None, ...]:
        """Return the circuit's operating points under conditions.

        Raises
        ------
        CircuitError : the circuit cannot be solved so at all.
        """
        return solve_under(self.circuit, conditions, self.known)

    def at_ambients(self, points: Sequence[T]) -> list[tuple[Currents, T]]:
        """Return points of all ambients with the row of currents of each; empty where one could not be solved."""
        rows = self.solution.currents
        return list(zip(rows, points, strict=True)) if len(rows) == len(points) else []

    @property
    def unbounded(self) -> bool:
        """Tell whether nothing bounds a current of the held short, so that its figures mean nothing: a stiff drive straight
        onto junctions."""
        held = self.solution.high_short
        currents_A = (state.current_A for point in held for state in point.states.values())
        return any(abs(current_A) > UNBOUNDED_A for current_A in (*currents_A, *(point.drive_A for point in held)))

    @property
    def drive_bound(self) -> str:
        """What would bound the drive: the limits-file key of its current; of a supply that feeds it, a resistance."""
        node = self.circuit.drive.node
        fed_by = node.removesuffix(FEED)
        return f"{self.circuit.drive.key} current" if fed_by == node else f"a resistance between {fed_by} and the shunt"

    @property
    def drive_ends_V(self) -> tuple[Range, Range]:
        """Return the drive's off and on ends."""
        drive = self.circuit.drive
        ends = (drive.low_V, drive.high_V)
        return ends if self.solution.on_end == "high" else ends[::-1]

    @property
    def lasts_s(self) -> float:
        """How long a short lasts: as the limits file says, else for ever."""
        return self.needs.short_s if self.needs.short_s is not None else math.inf

    def device_parts(self, *roles: str) -> Iterator[tuple[str, tuple[str, ...]]]:
        """Yield (part id, names of its devices in the circuit) of the parts in the given roles that have any."""
        for part_id in self.parts(*roles):
            names = self.devices_of(part_id)
            if names:
                yield part_id, names

    def devices_of(self, part_id: str) -> tuple[str, ...]:
        """Return the names of the circuit's devices that stand for a part."""
        index = self.part(part_id).index
        elements = self.board.elements
        return tuple(name for name, element in self.bench.element_of.items() if index in elements[element].parts)

    def device(self, name: str) -> Device:
        """Return a device of the circuit by name."""
        return next(device for device in self.circuit.devices if device.name == name)

    def power_W(self, point: Point, part_id: str) -> float:
        """Return what a part dissipates at a solved point; both devices of a Darlington part together."""
        return sum(point.states[name].power_W for name in self.devices_of(part_id) if name in point.states)

    def rating(self, part_id: str, name: str) -> Figure | None:
        """Return a rating from the part data, or None."""
        entry = self.part(part_id).entry
        return None if entry is None else entry.ratings.get(name)

    def allowed(self, part_id: str, name: str, quantity: str) -> Figure | None:
        """Return a rating as the board's derating leaves it, its source saying so, or None.

        ``quantity`` is ``voltage``, ``current`` or ``power``.
        """
        rating, kind = self.rating(part_id, name), self.part(part_id).kind
        if rating is None:
            return None
        derating = self.limits.derating
        return Figure(rating.value * share_of(derating, kind, quantity), derated(derating, kind, quantity, rating.source))

    def share(self, part_id: str, quantity: str) -> float:
        """Return the share of a part's ratings that the board's derating leaves."""
        return share_of(self.limits.derating, self.part(part_id).kind, quantity)

    def rating_key(self, part_id: str, name: str) -> str:
        """Return the part-data key that would supply a rating: ``QSN1.ratings.ib``."""
        return self.data_key(part_id, f"ratings.{name}")

    def data_key(self, part_id: str, name: str) -> str:
        """Return the part-data key of something about a part: ``QSN1.safe_area``."""
        part = self.part(part_id)
        number = part.part_number if part.entry is None else part.entry.part_number
        return f"{toml_key(number)}.{name}" if number else f"a part number for {part_id}, then its {name}"

    def limits_key(self, name: str) -> str:
        """Return the limits-file key that would state something of this limiter: ``[limiter.Q10] carry``."""
        return f"[limiter.{toml_key(self.limiter.id)}] {name}"

    def finding(
        self,
        check: str,
        message: str,
        *,
        parts: tuple[str, ...],
        working: tuple[WorkingLine, ...],
        remedy: str | None,
        level: Level | None = None,
        assumption: bool = False,
        subject: str = "",
        nets: tuple[str, ...] = (),
        fits: tuple[Fit, ...] = (),
    ) -> Finding:
        """Return a finding about this limiter."""
        return Finding(
            check=check,
            limiter=self.limiter.id,
            parts=parts,
            nets=nets,
            message=message,
            working=working,
            remedy=remedy,
            level=level,
            assumption=assumption,
            subject=subject,
            fits=fits,
        )


Answer = Finding | NotChecked
"""What a check yields: something wrong, or why it could not tell."""
