"""References and other small forms of EDIF: what stands inside the definitions and defines nothing."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import chain

from protlint.netlist.definitions import GlobalRef, Joined, Net, PortList, PortRef, Shorted, ViewRef
from protlint.netlist.forms import Form
from protlint.netlist.properties import integer, text_of


def items(form: Form, *heads: str) -> Iterator[Form]:
    """Yield the lists inside a form that begin with one of ``heads``."""
    for item in form:
        if type(item) is Form and item and item[0] in heads:
            yield item


def by_head(form: Form) -> dict[str, list[Form]]:
    """Return the lists inside a form by what they begin with."""
    found: dict[str, list[Form]] = {}
    for item in form:
        if type(item) is Form and item:
            found.setdefault(item[0], []).append(item)
    return found


def first(form: Form, head: str) -> Form | None:
    """Return the first list inside a form that begins with ``head``."""
    for item in form:
        if type(item) is Form and item and item[0] == head:
            return item
    return None


def keyword(forms: Sequence[Form], default: str) -> str:
    """Return the one word of the first of several lists, in lower case."""
    return str(forms[0][1]).lower() if forms and len(forms[0]) > 1 else default


def designators(forms: Sequence[Form]) -> tuple[str, ...]:
    """Return the texts of ``designator`` forms, without repetitions: of two, a section and its package."""
    if not forms:
        return ()
    texts = [text_of(item) for item in forms]
    return tuple(dict.fromkeys(text.strip() for text in texts if text is not None))


def program(form: Form) -> str | None:
    """Return the name of the program that wrote the file, with its version, where the file says so."""
    for status in items(form, "status"):
        for written in items(status, "written"):
            for each in items(written, "program"):
                version = first(each, "version")
                texts = [text_of(each[1]) if len(each) > 1 else None]
                texts.append(text_of(version[1]) if version is not None and len(version) > 1 else None)
                return " ".join(text for text in texts if text) or None
    return None


def word(form: Form, position: int = 1) -> str:
    """Return the identifier at a position of a reference.

    Raises
    ------
    InputError : there is none.
    """
    item = form[position] if len(form) > position else None
    if type(item) is str:
        return item
    if type(item) is Form and item.head == "name" and len(item) > 1:
        item = item[1]
    if not isinstance(item, str):
        raise form.error(f"({form.head} ...) names nothing")
    return item


def member(form: Form, position: int = 1) -> tuple[str, tuple[int, ...]]:
    """Return what a reference names: an identifier, and the element it picks where it is a ``member``, else ().

    Raises
    ------
    InputError : it names nothing, or the element is no list of integers.
    """
    item = form[position] if len(form) > position else None
    if type(item) is not Form or item.head != "member":
        return word(form, position), ()
    indices = tuple(index for index in map(integer, item[2:]) if index is not None)
    if not indices or len(indices) != len(item) - 2:
        raise item.error("(member ...) needs an identifier and the number of an element")
    return word(item), indices


def port_refs(form: Form) -> Iterator[PortRef]:
    """Yield the references to ports inside a form."""
    for item in form:
        if type(item) is PortRef:
            yield item
        elif type(item) is Form and item.head == "portref":
            yield _port_ref(item)


def _port_ref(form: Form) -> PortRef:
    """Return a ``portRef``; the instance may stand behind the bundle that holds the port.

    Raises
    ------
    InputError : it names nothing, or reaches into another level of the hierarchy.
    """
    port, element = member(form)
    bundle: str | None = None
    instance: str | None = None
    instance_element: tuple[int, ...] = ()
    inner = _inner(form)
    if type(inner) is PortRef:
        return PortRef(port, inner.instance, form.offset, element, inner.port)
    if type(inner) is Form and inner.head == "portref":
        bundle = word(inner)
        inner = _inner(inner)
    if type(inner) is Form and inner.head == "instanceref":
        instance, instance_element = member(inner)
        inner = _inner(inner)
    elif type(inner) is ViewRef or (type(inner) is Form and inner.head == "viewref"):
        inner = None
    if inner is not None:
        message = "this reference inside another reaches into another level of the hierarchy, which is not read"
        raise form.places.error(message, form.offset if isinstance(inner, ViewRef) else inner.offset)
    return PortRef(port, instance, form.offset, element, bundle, instance_element)


def nets_inside(form: Form) -> Iterator[Net]:
    """Yield the nets of a sheet, those in bundles too.

    Raises
    ------
    InputError : something is joined outside any net.
    """
    for item in form:
        if type(item) is Net:
            yield item
        elif type(item) is Form and item.head in ("netbundle", "listofnets"):
            yield from nets_inside(item)
        elif type(item) is Form and item.head == "joined":
            raise item.error("(joined ...) outside a net is not read")


def joined(form: Form) -> Joined:
    """Return what the ``joined`` of a net joins."""
    ends: list[PortRef | PortList | GlobalRef] = []
    for item in form:
        if type(item) is PortRef:  # nearly all are
            ends.append(item)
        elif type(item) is Form and item:
            if item[0] == "portref":
                ends.append(_port_ref(item))
            elif item[0] == "portlist":
                ends += _port_list(item)
            elif item[0] == "globalportref":
                ends.append(GlobalRef(word(item), item.offset))
    return tuple(ends)


def shorted(form: Form) -> Shorted:
    """Return the ports that the ``joined`` of an interface says are one inside.

    Raises
    ------
    InputError : it names something else than ports.
    """
    _no_global(form)
    return (*port_refs(form), *(ref for item in items(form, "portlist") for ref in _port_list(item)))


def view_refs(form: Form) -> tuple[ViewRef, ...]:
    """Return the views an instance offers, the first that leads somewhere being meant."""
    refs: list[ViewRef] = []
    for item in chain(form, *items(form, "viewlist")):
        if type(item) is ViewRef:  # nearly all are
            refs.append(item)
        elif type(item) is Form and item.head in ("viewref", "cellref"):
            cell = item if item[0] == "cellref" else first(item, "cellref")
            library = None if cell is None else first(cell, "libraryref")
            refs.append(
                ViewRef(
                    view=None if item is cell else word(item),
                    cell=None if cell is None else word(cell),
                    library=None if library is None else word(library),
                )
            )
    return tuple(refs)


def _port_list(form: Form) -> list[PortList]:
    _no_global(form)
    refs = tuple(port_refs(form))
    return [PortList(refs)] if refs else []


def _no_global(form: Form) -> None:
    stray = first(form, "globalportref")
    if stray is not None:
        raise stray.error("a globalPortRef is read in the joined of a net only")


def _inner(form: Form) -> Form | PortRef | ViewRef | None:
    return next((item for item in form[2:] if type(item) in (Form, PortRef, ViewRef)), None)
