"""EDIF 2 0 0 text to definitions: the grammar's netlist subset, each form turned into what it defines as it closes.

Forms that nothing here uses (drawings, displays, comments, user data, and any unknown one) are passed over whole, and so is
what stands inside them. What cannot be read and would change the netlist if it were passed over is refused by name.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Mapping, Sequence
from itertools import chain
from math import prod
from typing import NoReturn, Protocol

from protlint.netlist.definitions import (
    Cell,
    Contents,
    Design,
    Edif,
    Instance,
    Library,
    Name,
    Net,
    Port,
    PortInstance,
    PortRef,
    Scope,
    Sheet,
    View,
    ViewRef,
)
from protlint.netlist.forms import Form, FormParser
from protlint.netlist.grammar import LEVELS, REFUSED, USED, may_hold
from protlint.netlist.model import Property
from protlint.netlist.notes import Notes
from protlint.netlist.properties import Origin, Scales, integer, read_property, read_scales, text_of
from protlint.netlist.references import (
    by_head,
    designators,
    first,
    items,
    joined,
    keyword,
    member,
    nets_inside,
    port_refs,
    program,
    shorted,
    view_refs,
    word,
)
from protlint.sources import InputError

ARRAY_LIMIT = 65_536
"""Most elements of one array; real buses stay below 1,024."""
NAME_LIMIT = 1_000
"""Most characters of an array's name or designator, which every element repeats."""
DIMENSIONS_LIMIT = 4
"""Most dimensions of an array."""

_BEGINNING = re.compile(r"[ \t\r\n\f\v]*\([ \t\r\n\f\v]*(edif)(?![^ \t\r\n\f\v()\"])|[ \t\r\n\f\v]*(\()?", re.IGNORECASE)
_IDENTIFIER = re.compile(r"[A-Za-z][A-Za-z0-9_]*|&[A-Za-z0-9_]+")


class Named(Protocol):
    """What has a name and a place."""

    @property
    def name(self) -> Name: ...  # noqa: D102
    @property
    def offset(self) -> int: ...  # noqa: D102


def read_definitions(text: str, file: str) -> tuple[Edif, Notes]:
    """Return what an EDIF 2 0 0 text defines, and the notes taken while reading it.

    Raises
    ------
    InputError : the text is no EDIF 2 0 0, is damaged, or uses what is refused.
    """
    beginning = _BEGINNING.match(text)
    assert beginning is not None
    if not beginning[1]:
        what = "another s-expression file" if beginning[2] else "something else"
        what = what if text.strip() else "an empty file"
        raise InputError(f"this is {what}, not EDIF: a netlist begins with (edif ...)", file=file, line=1, column=1)
    return _Reader(text, file).read()


class _Reader(FormParser):
    """A parser whose lists become definitions as they close, so that no more than one cell stands in memory as lists."""

    def __init__(self, text: str, file: str) -> None:
        refuse = dict.fromkeys(REFUSED, self._refuse)
        reducers: dict[str, Callable[[Form], object]] = {
            "edifversion": self._version,
            "keywordalias": self._alias,
            "viewmap": self._view_map,
            "technology": self._technology,
            "instance": self._instance,
            "net": self._net,
            "view": self._view,
            "cell": self._cell,
            "library": self._library,
            "external": self._library,
            "design": self._design,
        }
        # Nearly all references and properties are of these shapes, and they are most of a netlist.
        shapes: dict[str, Callable[..., object]] = {
            "(portref ? (instanceref ?))": self._plain_port_ref,
            "(viewref ? (cellref ? (libraryref ?)))": self._plain_view_ref,
            "(viewref ? (cellref ?))": self._plain_view_ref,
            '(property ? (string ""))': self._plain_property,
        }
        super().__init__(text, file=file, reducers=refuse | reducers, shapes=shapes)
        self.notes = Notes(self.places)
        self._scales: Scales = {}
        self._property_names: dict[str, str] = {}
        self._words: dict[str, str] = {}
        self._view_refs: dict[tuple[str, str, str | None], ViewRef] = {}
        self._aliases: dict[str, str] = {}
        self._met: set[str] = set()

    def read(self) -> tuple[Edif, Notes]:
        """Return the whole file's definitions."""
        forms = self.parse()
        self.reducers, self.shapes = {}, {}  # they hold the parser, and the parser the text
        if any(not isinstance(each, str) or each.strip("\x1a") for each in forms[1:]):  # control-Z closes files of DOS
            offset = getattr(forms[1], "offset", None)
            offset = self.outside() if offset is None else offset
            raise self.places.error("there is more after the end of (edif ...)", offset)
        form = forms[0]
        for offset, raw in self.unpaired[:1]:
            self.notes.add("percent", offset, repr(raw), count=len(self.unpaired))
        if first(form, "edifversion") is None:
            raise form.error("it states no edifVersion: protlint reads EDIF 2 0 0")
        level = next((str(item[1]) for item in items(form, "ediflevel") if len(item) > 1), "0")
        libraries = tuple(item for item in form if type(item) is Library)
        designs = tuple(item for item in form if type(item) is Design)
        self._duplicates(libraries)
        return Edif(self._name(form), level, program(form), libraries, designs, self.places), self.notes

    def atom(self, token: str) -> str:
        """Return a word as it is, but the same object in all its places: references are many and repeat what they name."""
        return self._words.setdefault(token, token)

    def head(self, token: str) -> str | None:
        """Return a keyword in lower case, None for those that are passed over."""
        keyword = token.lower()
        self._met.add(keyword)
        keyword = self._meant(keyword)
        return keyword if keyword in USED or keyword in REFUSED else None

    def _plain_port_ref(self, offset: int, port: str, instance: str) -> PortRef:
        same = self._words.setdefault
        return tuple.__new__(PortRef, (same(port, port), same(instance, instance), offset, (), None, ()))

    def _plain_view_ref(self, _offset: int, view: str, cell: str, library: str | None = None) -> ViewRef:
        """Return the reference that an instance makes: the same few on every part, so they are looked up."""
        words = view, cell, library
        known = self._view_refs.get(words)
        if known is None:
            known = self._view_refs[words] = ViewRef(*words)
        return known

    def _plain_property(self, offset: int, name: str, text: str) -> Form:
        """Return a property of a text, as if no ``string`` stood around it."""
        form = Form(("property", self.atom(name), text))
        form.offset = offset
        form.places = self.places
        return form

    def _meant(self, keyword: str) -> str:
        return self._aliases.get(keyword, keyword)

    def unclosed(self) -> InputError:
        """Return the error about what is never closed: where something begins inside what cannot hold it, its holder.

        In a file that lacks one parenthesis somewhere in the middle, the list still open at the end is the outermost one,
        which tells nobody anything.
        """
        for open_lists in self.open_lists():
            inner_at, inner = open_lists[-1]
            meant = self._meant(inner)
            if meant not in LEVELS:
                continue
            holder = next((head for _, word in reversed(open_lists[:-1]) if (head := self._meant(word)) in LEVELS), None)
            if holder is not None and not may_hold(holder, meant):
                outer_at, outer = open_lists[-2]
                line, column = self.places.at(inner_at)
                message = f"({outer} ...) is never closed; it is still open where ({inner} ...) begins at {line}:{column}"
                return self.places.error(message, outer_at)
        offset, head = open_lists[-1]
        return self.places.error(f"({head or ''} ...) is never closed: the file ends inside it", offset)

    def _name(self, form: Form, position: int = 1) -> Name:
        """Return the name that a form defines, and note what EDIF does not allow in it."""
        item = form[position] if len(form) > position else None
        if type(item) is str and _IDENTIFIER.fullmatch(item):
            return Name(item, item.removeprefix("&"))
        dimensions: tuple[int, ...] = ()
        text: str | None = None
        if type(item) is Form and item.head == "array":
            dimensions = self._dimensions(item)
            form, item = item, item[1] if len(item) > 1 else None
        if type(item) is Form and item.head == "rename":
            text = next((shown for shown in map(text_of, item[2:]) if shown is not None), None)
            form, item = item, item[1] if len(item) > 1 else None
        if type(item) is Form and item.head == "name":
            form, item = item, item[1] if len(item) > 1 else None
        if not isinstance(item, str) or not item:
            raise form.error(f"({form.head} ...) has no name")
        if _IDENTIFIER.fullmatch(item) is None:
            self.notes.add("identifier", form.offset, repr(item))
        name = Name(item, text or item.removeprefix("&"), dimensions)
        if dimensions and len(name.text) > NAME_LIMIT:
            raise form.error(f"an array's name of more than {NAME_LIMIT} characters, the most that is read")
        return name

    def _dimensions(self, form: Form) -> tuple[int, ...]:
        sizes = [integer(item) for item in form[2:] if not isinstance(item, Form)]
        dimensions = tuple(size for size in sizes if size is not None)
        if len(dimensions) != len(sizes) or not 1 <= len(dimensions) <= DIMENSIONS_LIMIT or min(dimensions) < 1:
            raise form.error(f"an array needs its number of elements, 1 or more, in up to {DIMENSIONS_LIMIT} dimensions")
        if prod(dimensions) > ARRAY_LIMIT:
            raise form.error(f"an array of more than {ARRAY_LIMIT} elements, the most that is read")
        return dimensions

    def _properties(self, found: Mapping[str, Sequence[Form]], origin: Origin) -> tuple[Property, ...]:
        forms = (*found.get("property", ()), *found.get("parameter", ()), *found.get("parameterassign", ()))
        return tuple([read_property(item, self._property_name(item), origin, self._scales, self.notes) for item in forms])

    def _property_name(self, form: Form) -> str:
        """Return the name of a property as people see it: the same few on every part, so plain ones are looked up."""
        name = form[1] if len(form) > 1 else None
        known = self._property_names.get(name) if type(name) is str else None
        if known is None:
            known = self._name(form).text
            if type(name) is str and _IDENTIFIER.fullmatch(name):
                self._property_names[name] = known
        return known

    def _port(self, form: Form) -> Port:
        found = by_head(form)
        inner = next(iter(found.get("listofports", ())), None) if form[0] == "portbundle" else None
        return Port(
            name=self._name(form),
            direction=keyword(found.get("direction", ()), "") or None,
            designators=designators(found.get("designator", ())),
            properties=self._properties(found, "interface"),
            ports=() if inner is None else tuple(self._port(port) for port in items(inner, "port", "portbundle")),
            offset=form.offset,
        )

    def _port_instance(self, form: Form) -> PortInstance:
        found = by_head(form)
        named = next(port_refs(form), None)
        port, element = member(form) if named is None else (named.port, named.member)
        return PortInstance(port, element, designators(found.get("designator", ())), self._properties(found, "instance"))

    def _instance(self, form: Form) -> Instance:
        found = by_head(form)
        name, designated = self._name(form), designators(found.get("designator", ()))
        if name.dimensions and any(len(text) > NAME_LIMIT and len(text.split()) != name.width for text in designated):
            raise form.error(f"an array's designator of more than {NAME_LIMIT} characters, the most that is read")
        return Instance(
            name=name,
            views=view_refs(form),
            designators=designated,
            properties=self._properties(found, "instance"),
            ports=tuple(map(self._port_instance, found.get("portinstance", ()))),
            offset=form.offset,
        )

    def _net(self, form: Form) -> Net:
        name = self._name(form)
        groups = [joined(item) for item in items(form, "joined")]
        for subnet in form:
            if type(subnet) is Net:  # the same node, drawn or routed apart
                if subnet.name.dimensions != name.dimensions:
                    raise form.error(f"a subnet of another width ({subnet.name.text}) is not read")
                groups.append(subnet.joined)
        return Net(name, tuple(chain.from_iterable(groups)), form.offset)

    def _sheet(self, form: Form) -> Sheet:
        instances = tuple(item for item in form if type(item) is Instance)
        nets = tuple(nets_inside(form))
        self._duplicates(instances)
        self._duplicates(nets)
        return Sheet(instances, nets)

    def _contents(self, forms: Sequence[Form]) -> Contents | None:
        """Return the contents of a view; several forms of them are one."""
        pages = [page for form in forms for page in items(form, "page")]
        sheets = (*forms, *pages)
        connectors: dict[Name, None] = {}
        seen: dict[str, str] = {}
        for item in chain.from_iterable(items(sheet, "offpageconnector") for sheet in sheets):
            name = self._name(item)
            connectors[name] = None
            if seen.setdefault(name.identifier, name.text) != name.text:
                self.notes.add("duplicate", item.offset, repr(name.identifier))
        return Contents(list(map(self._sheet, sheets)), len(pages), tuple(connectors)) if forms else None

    def _view(self, form: Form) -> View:
        found = by_head(form)
        interfaces = found.get("interface", ())
        ports = tuple(self._port(port) for interface in interfaces for port in items(interface, "port", "portbundle"))
        self._duplicates(ports)
        stated = chain.from_iterable(self._properties(by_head(interface), "interface") for interface in interfaces)
        return View(
            name=self._name(form),
            kind=keyword(found.get("viewtype", ()), ""),
            ports=ports,
            shorts=tuple(shorted(item) for interface in interfaces for item in items(interface, "joined")),
            properties=(*stated, *self._properties(found, "interface")),
            contents=self._contents(found.get("contents", ())),
            offset=form.offset,
        )

    def _cell(self, form: Form) -> Cell:
        found = by_head(form)
        views = tuple(item for item in form if type(item) is View)
        self._duplicates(views)
        return Cell(
            name=self._name(form),
            kind=keyword(found.get("celltype", ()), "generic"),
            views=views,
            properties=self._properties(found, "cell"),
            offset=form.offset,
        )

    def _library(self, form: Form) -> Library:
        cells = tuple(item for item in form if type(item) is Cell)
        self._duplicates(cells)
        self._scales = {}
        return Library(self._name(form), form.head == "external", cells, form.offset)

    def _design(self, form: Form) -> Design:
        cell = first(form, "cellref")
        if cell is None:
            raise form.error("(design ...) names no cell")
        library = first(cell, "libraryref")
        return Design(self._name(form), word(cell), None if library is None else word(library), form.offset)

    def _alias(self, form: Form) -> Form:
        """Take another word for a keyword, given as (keywordAlias new known), which is from memory of the standard.

        Should a writer mean the two words the other way round, its new word is one of EDIF's own, and refused.
        """
        new, known = word(form).lower(), word(form, 2).lower()
        if new in USED or new in REFUSED:
            raise form.error(f"(keywordAlias {new} {known}): another meaning for the keyword {new} is not read")
        if new in self._met:
            raise form.error(f"(keywordAlias {new} {known}): {new} stands in front of its alias already")
        self._aliases[new] = self._meant(known)
        return form

    def _view_map(self, form: Form) -> Form:
        """Check that a viewMap says no more of ports than what is taken for granted: those of one name are the same.

        Raises
        ------
        InputError : ports of different names are said to be the same.
        """
        for each in items(form, "portmap"):
            names = {ref.port.removeprefix("&").lower() for ref in port_refs(each)}
            if len(names) > 1 or first(each, "portgroup") is not None:
                raise each.error(
                    "a viewMap whose views call their ports differently is not read; export the netlist without it"
                )
        return form

    def _technology(self, form: Form) -> None:
        self._scales = read_scales(form)

    def _version(self, form: Form) -> Form:
        version = " ".join(str(item) for item in form[1:])
        if version != "2 0 0":
            raise form.error(f"this is EDIF {version or 'of no version'}; protlint reads EDIF 2 0 0 only")
        return form

    def _refuse(self, form: Form) -> NoReturn:
        raise form.error(f"({form.head} ...): {REFUSED[form.head]} are not read; export the netlist without them")

    def _duplicates(self, things: Iterable[Named]) -> None:
        """Note the identifiers that stand for two things in one scope."""
        scope: Scope[Named] = Scope()
        for thing in things:
            kind = scope.add(thing.name.identifier, thing)
            if kind is not None:
                self.notes.add(kind, thing.offset, repr(thing.name.identifier))
