"""Files damaged at random: bytes cut out or doubled, or lists left out, doubled, swapped and filled with oddities."""

from __future__ import annotations

import random
import re

_TOKEN = re.compile(rb'"[^"]*"|[()]|[^\s()"]+')


def cut_up(data: bytes, chance: random.Random) -> bytes:
    """Some bytes of a file cut out, doubled, or replaced by what may hurt."""
    for _ in range(chance.choice((1, 1, 2, 5))):
        start = chance.randrange(len(data) + 1)
        stop = min(len(data), start + chance.choice((0, 1, 2, 10, 100, 1000)))
        pieces = (b"", b"(", b")", b'"', b"%", b"\0", b"\xff", b"0", b" ", data[start:stop] * 2, chance.randbytes(4))
        data = data[:start] + chance.choice(pieces) + data[stop:]
    return data


ODD = (
    b"()", b"(())", b"-1", b"(name)", b'"x"', b"9" * 30, b"(array X 70000)", b"(array X 3)", b"(member A 0 1)",
    b"(net)", b"(rename)", b"(string)", b"(e 1 99999)", b"(designator (string))", b"(viewRef V)", b"(portRef P (portRef Q))",
    b"(portList)", b"(property A (number (e)))", b"(scale 0 0 (unit))", b"(joined)", b"(listOfPorts (portBundle))",
    b"(cellType RIPPER)", b"(globalPortRef G)", b"(globalPortRef A)", b"(keywordAlias N net)",
    b"(viewMap (portMap (portRef A)))",
)  # fmt: skip
"""What stands in no sane file."""


def rearranged(data: bytes, chance: random.Random) -> bytes:
    """A file whose parentheses still balance, but with lists left out, doubled, swapped, or with other words in them."""
    tokens = _TOKEN.findall(data)
    for _ in range(chance.choice((1, 1, 2, 5))):
        start = chance.randrange(len(tokens))
        stop = _end_of(tokens, start)
        piece = tokens[start:stop]
        other = chance.randrange(len(tokens))
        odd = _TOKEN.findall(chance.choice(ODD))
        tokens[start:stop] = chance.choice(([], piece * 2, tokens[other : _end_of(tokens, other)], odd))
        if not tokens:
            break
    return b" ".join(tokens)


def _end_of(tokens: list[bytes], start: int) -> int:
    """Where the list or word ends that begins at ``start``; a closing parenthesis is taken as nothing."""
    depth = 0
    for position in range(start, len(tokens)):
        depth += {b"(": 1, b")": -1}.get(tokens[position], 0)
        if depth <= 0:
            return position + (depth == 0)
    return len(tokens)
