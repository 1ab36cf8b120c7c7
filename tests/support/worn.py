"""Boards worn at random: odd values, ratings gone or absurd, needs missing, by seed."""

from __future__ import annotations

import random
import re
from typing import Any

from tests.support.judged import SOUND, Job

NEEDS = {
    "carry": "A", "output": "V", "sink": "K/W", "short": "s", "load": "ohm", "load_current": "A", "load_cold": "ohm",
    "load_capacitance": "F", "shunt_rise": "K",
}  # fmt: skip


def worn(seed: int) -> Job:
    """Return a sound board with much of it changed."""
    dice = random.Random(seed)
    job = dice.choice([*SOUND.values()])()
    board = job.board
    for row, value in re.findall(r"^(\w+ RES )(\S+)", board, re.MULTILINE):
        if dice.random() < 0.4:
            board = board.replace(row + value, f"{row}{float(f'{10 ** dice.uniform(-2, 5.5):.3g}'):g}")
    if dice.random() < 0.3:
        board = board.replace("POWER:", "OTHER:")
    tables = {key: dict(value) for key, value in job.tables.items()}
    tables["limiter"] = {"*": _needs(dice, tables["limiter"]["*"])}
    if dice.random() < 0.3:
        tables["board"]["derating"] = dice.choice(["ECSS-Q-ST-30-11C", "EEE-INST-002"])
    if dice.random() < 0.2:
        tables["board"]["ambient"] = ["-55 degC", "27 degC", "160 degC"]
    if dice.random() < 0.3:
        tables.pop("drive", None)
    data = {name: _entry(dice, entry) for name, entry in job.data.items() if dice.random() > 0.05}
    return Job(board, tables, data)


def _needs(dice: random.Random, needs: dict[str, Any]) -> dict[str, Any]:
    kept = {name: value for name, value in needs.items() if dice.random() > 0.3}
    kept |= {name: f"{10 ** dice.uniform(-4, 2):.3g} {unit}" for name, unit in NEEDS.items() if dice.random() < 0.3}
    if "cap" in kept:
        kept.pop(dice.choice(["cap", "carry"]), None)
    return kept


def _entry(dice: random.Random, entry: dict[str, Any]) -> dict[str, Any]:
    ratings = {name: value for name, value in entry["ratings"].items() if dice.random() > 0.15}
    for name, value in ratings.items():
        if isinstance(value, str) and name != "tj_max" and dice.random() < 0.1:
            number, unit = value.split()
            ratings[name] = f"{float(number) * 10 ** dice.uniform(-3, 3):.4g} {unit}"
    tables = {name: table for name, table in entry.items() if name in ("kind", "source") or dice.random() > 0.15}
    return {**tables, "ratings": ratings}
