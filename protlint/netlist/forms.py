"""Text to positioned s-expressions: the one scanner behind netlists and rule files.

``FormParser`` is a :class:`sexpdata.Parser` and keeps its contract: made from a text, its :meth:`~FormParser.parse` returns
the list of top-level expressions, lists as lists, words as :meth:`~FormParser.atom` makes them, strings as ``str``. What
changes is what netlists need: a backslash is an ordinary character, no word turns into a number, a truth value or an empty
list, brackets, quotes and semicolons mean nothing, every list knows its place, and the scanning is one pass of one compiled
expression with a stack of its own, so that neither depth nor size can break it.
"""

from __future__ import annotations

import gc
import re
from array import array
from bisect import bisect_right
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from functools import cache
from itertools import accumulate
from typing import Any

import sexpdata  # type: ignore[import-untyped]

from protlint.sources import InputError

NESTING_LIMIT = 200
"""Deepest nesting read; real netlists stay below 20."""

_WHITE = r"[ \t\r\n\f\v]"
_IN_WORD = r'[^ \t\r\n\f\v()"]'
_WORD = _IN_WORD + "++"
_CLOSING = r"[) \t\r\n\f\v]*+"
_ANY = (
    # A list's head, two words and a plain string come with its opening, and so do closings that follow at once: most lists
    # of a netlist are one match, and matches are what scanning costs. Words and closings that are not there match as
    # nothing, which costs less than a group left out; everything else that can stand in a text is the last group.
    rf"\({_WHITE}*+({_IN_WORD}*+){_WHITE}*+({_IN_WORD}*+){_WHITE}*+({_IN_WORD}*+){_WHITE}*+"
    rf'(?:"([^"%\r\n]*+)"{_WHITE}*+)?({_CLOSING})'
    rf'|(\){_CLOSING}|{_WORD}|"[^"]*+"?)'
)
_ANY_GROUPS = 6
_IN_SHAPE = re.compile(r'[()?]|""|\w+')
_OUTLINE = re.compile(rf'\({_WHITE}*+((?:{_WORD})?)|\)|"[^"]*+"?|{_WORD}')
_PERCENT = re.compile(r"%(\d++(?: ++\d++)*+) *+%|%")


@cache
def _tokens(*shapes: str) -> re.Pattern[str]:
    """Return what scans a text: lists of some shapes in one match each, then whatever else there is, in six groups.

    Behind each shape's own groups is one for the closings that follow the list.
    """
    patterns = [f"(?i:{_shape(one)})({_CLOSING})|" for one in shapes]
    return re.compile("".join(patterns) + _ANY)


def _shape(shape: str) -> str:
    pattern, before = "", ""
    for piece in _IN_SHAPE.findall(shape):
        is_word = piece == "?" or piece.isalpha()
        white = "" if not before else f"{_WHITE}++" if is_word and before != "(" else f"{_WHITE}*+"
        groups = {"(": r"\(", ")": r"\)", "?": f"({_WORD})", '""': r'"([^"%\r\n]*+)"'}
        pattern += white + groups.get(piece, piece)
        before = piece
    return pattern


def read_forms(text: str, file: str) -> list[Form]:
    """Return the lists of a rule file, everything kept, in the order of the file.

    Words are :class:`Atom`, strings plain ``str`` (a line end inside one is one blank), lists :class:`Form`, which know
    their ``line`` and ``column`` and make errors that say so.

    Raises
    ------
    InputError : a list or a string is never closed, a closing parenthesis too many, or something outside any list.
    """
    parser = _RuleParser(text, file=file)
    forms = parser.parse()
    if not all(isinstance(form, Form) for form in forms):
        raise parser.places.error("this stands outside any parentheses", parser.outside())
    return forms


@contextmanager
def no_collection() -> Iterator[None]:
    """Hold back garbage collection while many small objects are made, and put it back as it was.

    Reading makes no cycles, so collecting meanwhile only goes over the same objects again and again. What was made counts as
    old when it ends: collections after it would else go over all of it once for each younger generation.
    """
    was_enabled = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_enabled:
            if gc.get_freeze_count() == 0:  # else a caller keeps objects frozen, which are to stay so
                gc.freeze()
                gc.unfreeze()
            gc.enable()


class Atom(str):
    """A word of a rule file, which is not a string."""

    __slots__ = ()


class Places:
    """Turns offsets into lines and columns, both from 1, columns in characters; CR, LF and CRLF all end a line."""

    __slots__ = ("_starts", "_text", "file")

    def __init__(self, text: str, file: str | None = None) -> None:
        self._text = text
        self.file = file
        self._starts: Sequence[int] = ()

    def at(self, offset: int) -> tuple[int, int]:
        """Return (line, column) of the character at ``offset``."""
        if not self._starts:
            text, self._text = self._text, ""  # not needed any more, and large
            if "\r" in text:
                text = text.replace("\r\n", " \n").replace("\r", "\n")
            self._starts = array("q", accumulate((len(line) + 1 for line in text.split("\n")), initial=0))
        line = bisect_right(self._starts, offset)
        return line, offset - self._starts[line - 1] + 1

    def error(self, message: str, offset: int) -> InputError:
        """Return the error to raise about what stands at ``offset``."""
        line, column = self.at(offset)
        return InputError(message, file=self.file, line=line, column=column)


class Form(list[Any]):
    """One parenthesised list: its items, and the place of its opening parenthesis."""

    __slots__ = ("offset", "places")
    offset: int
    places: Places

    @property
    def head(self) -> str:
        """The first item where that is a word, else an empty string."""
        return self[0] if self and isinstance(self[0], str) else ""

    @property
    def line(self) -> int:
        """The line of the opening parenthesis, from 1."""
        return self.places.at(self.offset)[0]

    @property
    def column(self) -> int:
        """The column of the opening parenthesis, from 1."""
        return self.places.at(self.offset)[1]

    def error(self, message: str) -> InputError:
        """Return the error to raise about this list, with its file, line and column."""
        return self.places.error(message, self.offset)


class _Table(dict[str | None, Any]):
    """A mapping that asks ``make`` for what it lacks, once a key."""

    def __init__(self, make: Callable[[str], Any]) -> None:
        super().__init__()
        self.make = make

    def __missing__(self, key: str) -> Any:
        value = self[key] = self.make(key)
        return value


class FormParser(sexpdata.Parser):  # type: ignore[misc]
    """Parse s-expressions of the EDIF kind, fast and with positions.

    Parameters
    ----------
    text : the whole text.
    file : the file's name in errors.
    reducers : a list whose head is a key here is replaced, as it closes, by what the function makes of it; where there are
        any, lists that begin with no word are passed over.
    shapes : lists of a shape that is a key here are never made: what the function makes of the offset and the words and
        strings left open stands in their place. A shape is written as the list it stands for, ``(word ? (word ""))``: its
        words match in any case, ``?`` is any word, ``""`` a plain string.
    """

    def __init__(
        self,
        text: str,
        *,
        file: str | None = None,
        reducers: Mapping[str, Callable[[Form], object]] | None = None,
        shapes: Mapping[str, Callable[..., object]] | None = None,
    ) -> None:
        super().__init__(text, nil=None, true=None, false=None)
        self.places = Places(text, file)
        self.reducers = reducers or {}
        self.shapes = shapes or {}
        self.unpaired: list[tuple[int, str]] = []
        """Strings that hold a per cent sign without its partner, with their offsets."""

    def head(self, token: str) -> str | None:
        """Return the head a list is to have for the word it begins with; None passes the whole list over."""
        head: str = self.atom(token)
        return head

    def atom(self, token: str) -> Any:
        """Return what a word becomes: itself. Where a subclass says otherwise, it is asked once for every distinct word."""
        return token

    def string_at(self, raw: str, offset: int) -> str:
        """Return a string that holds line ends or per cent signs as it was meant.

        Line ends are no part of a string; decimal codes between per cent signs are characters (``%34%`` is ``"``).
        """
        raw = raw.replace("\r", "").replace("\n", "")
        if "%" not in raw:
            return raw
        unpaired = False

        def character(match: re.Match[str]) -> str:
            nonlocal unpaired
            decoded = _decoded(match[1]) if match[1] else None
            unpaired = unpaired or decoded is None
            return match[0] if decoded is None else decoded

        text = _PERCENT.sub(character, raw)
        if unpaired:
            self.unpaired.append((offset, text))
        return text

    def parse(self) -> list[Any]:
        """Return the top-level expressions.

        Raises
        ------
        InputError : unbalanced parentheses, an unterminated string, nesting past :data:`NESTING_LIMIT`.
        """
        heads, reducers, places = _Table(self.head), self.reducers, self.places
        # Where words are made of what stands there, one serves all its places; where not, looking it up only costs.
        atoms = None if type(self).atom is FormParser.atom else _Table(self.atom)
        heads[""] = None if reducers else ""
        scan = _tokens(*self.shapes)
        of_shapes = scan.groups - _ANY_GROUPS
        shaped: dict[int, tuple[int, Callable[..., object]]] = {}
        begin = 0
        for shape, make in self.shapes.items():
            end = begin + shape.count("?") + shape.count('""')
            shaped[end + 1] = begin, make
            begin = end + 1
        stack: list[Form] = []
        current = Form()
        skipped = 0  # how many lists are open in the one being passed over, itself included
        for match in scan.finditer(self.string):
            groups, last = match.groups(), match.lastindex or 0
            if last <= of_shapes:
                begin, make = shaped[last]
                if not skipped:
                    current.append(make(match.start(), *groups[begin : last - 1]))
                closings = groups[last - 1].count(")")
            elif (other := groups[-1]) is None:
                word, first, second, text, closing = groups[of_shapes:-1]
                if skipped or (head := heads[word]) is None:
                    skipped += 1
                    if not closing:
                        if len(stack) + skipped > NESTING_LIMIT:
                            raise self._too_deep(match.start())
                        continue
                    closings = closing.count(")")
                else:
                    form = Form()  # empty, since filling it costs less than handing its items over in a tuple
                    form.offset = match.start()
                    form.places = places
                    if word:
                        form.append(head)
                        if first:
                            form.append(first if atoms is None else atoms[first])
                            if second:
                                form.append(second if atoms is None else atoms[second])
                    if text is not None:
                        form.append(text)
                    if not closing:
                        stack.append(current)
                        current = form
                        if len(stack) > NESTING_LIMIT:
                            raise self._too_deep(match.start())
                        continue
                    reduce = reducers.get(form[0]) if reducers else None
                    current.append(form if reduce is None else reduce(form))
                    closings = closing.count(")") - 1
            elif (mark := other[0]) == ")":
                closings = other.count(")")
            elif mark == '"':
                if len(other) == 1 or other[-1] != '"':
                    raise places.error("this string is never closed: its closing quote is missing", match.start())
                if not skipped:
                    current.append(self.string_at(other[1:-1], match.start()))
                continue
            else:
                if not skipped:
                    current.append(other if atoms is None else atoms[other])
                continue
            while closings:
                closings -= 1
                if skipped:
                    skipped -= 1
                    continue
                if not stack:
                    raise places.error("this closing parenthesis has no opening one", self.outside())
                form = current
                current = stack.pop()
                reduce = reducers.get(form[0]) if reducers else None
                current.append(form if reduce is None else reduce(form))
        if stack or skipped:
            raise self.unclosed()
        return list(current)

    def _too_deep(self, offset: int) -> InputError:
        return self.places.error(f"nested more than {NESTING_LIMIT} deep, which no file needs", offset)

    def open_lists(self) -> Iterator[list[tuple[int, str]]]:
        """Yield at every opening, and once at the end, the lists then open, outermost first, as (offset, first word).

        A second, slower pass for when the text is known to be wrong.
        """
        stack: list[tuple[int, str]] = []
        for match in _OUTLINE.finditer(self.string):
            if match[1] is not None:
                stack.append((match.start(), match[1].lower()))
                yield stack
            elif match[0] == ")":
                stack.pop()
        yield stack

    def unclosed(self) -> InputError:
        """Return the error about a list that is never closed: the innermost that is open where the text ends."""
        *_, still_open = self.open_lists()
        return self.places.error("this parenthesis is never closed", still_open[-1][0])

    def outside(self) -> int:
        """Return the offset of the first thing outside any list: a word, a string, or a closing parenthesis too many."""
        depth = 0
        for match in _OUTLINE.finditer(self.string):
            if match[1] is not None:
                depth += 1
            elif depth == 0:
                return match.start()
            elif match[0] == ")":
                depth -= 1
        return len(self.string)


class _RuleParser(FormParser):
    """Rule files: words are told from strings, a string may run over several lines, a per cent sign is only itself."""

    def atom(self, token: str) -> Atom:
        return Atom(token)

    def string_at(self, raw: str, offset: int) -> str:
        return re.sub(r"\s*[\r\n]\s*", " ", raw)


def _decoded(codes: str) -> str | None:
    """Return the characters that decimal codes stand for, None where one of them is no printable character or line end."""
    numbers = [int(code) if len(code) < 8 else 0 for code in codes.split()]
    return "".join(map(chr, numbers)) if all(_printable(number) for number in numbers) else None


def _printable(code: int) -> bool:
    return code in (9, 10, 13) or 32 <= code < 127 or 128 <= code < 0xD800 or 0xDFFF < code <= 0x10FFFF
