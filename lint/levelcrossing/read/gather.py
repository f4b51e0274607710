"""The tree of a netlist, from brackets or from XML, to a board."""

from __future__ import annotations

from collections import Counter, defaultdict
from dataclasses import dataclass, field

from levelcrossing.errors import InputError
from levelcrossing.model import Board, Net, Part, Pin
from levelcrossing.read.brackets import Tree, child, children, text_of, words
from levelcrossing.read.fitted import fitting
from levelcrossing.units import natural_key

# KiCad 5 and older spell pin types in their own way.
_KINDS = {
    "BiDi": "bidirectional",
    "3state": "tri_state",
    "openCol": "open_collector",
    "openEm": "open_emitter",
    "unspc": "unspecified",
    "NotConnected": "no_connect",
    "unconnected": "no_connect",
}
_KNOWN_KINDS = frozenset(
    {
        "input",
        "output",
        "bidirectional",
        "tri_state",
        "passive",
        "free",
        "unspecified",
        "power_in",
        "power_out",
        "open_collector",
        "open_emitter",
        "no_connect",
    }
)
_OWN_FIELDS = frozenset({"Reference", "Value", "Footprint", "Datasheet"})
# Properties that KiCad writes of its own accord.
_OWN_PROPERTIES = _OWN_FIELDS | {"Sheetname", "Sheetfile"}
_MOST_NAMED = 6


@dataclass(slots=True)
class _Gathering:
    """What has been found so far."""

    file: str
    symbols: dict[tuple[str, str], dict[str, tuple[str, str]]] = field(default_factory=dict)
    by_name: dict[str, list[tuple[str, str]]] = field(default_factory=lambda: defaultdict(list))
    comps: dict[str, Tree] = field(default_factory=dict)
    nets: dict[str, list[tuple[str, str]]] = field(default_factory=dict)
    pin_net: dict[tuple[str, str], str] = field(default_factory=dict)
    nodes: dict[str, dict[str, Tree]] = field(default_factory=lambda: defaultdict(dict))
    doubled: set[str] = field(default_factory=set)
    strange_kinds: Counter[str] = field(default_factory=Counter)
    symbolless: list[str] = field(default_factory=list)
    remarks: list[str] = field(default_factory=list)


def gather(tree: Tree, file: str, form: str, remarks: tuple[str, ...] = ()) -> Board:
    """Return the board that a netlist's tree describes.

    Parameters
    ----------
    tree : Tree
        ``export`` and what stands in it; the XML form is given in the same shape.
    file : str
        The file as the user named it.
    form : str
        ``netlist`` or ``xml``.
    remarks : tuple of str
        What was remarked before.

    Raises
    ------
    InputError
        When it is no netlist, holds no parts or cannot be told apart.
    """
    if not tree or tree[0] != "export":
        head = repr(tree[0])[:30] if tree and isinstance(tree[0], str) else "nothing known"
        raise InputError(
            f"is no KiCad netlist: it starts with {head} instead of 'export'",
            remedy="export it again",
            file=file,
            line=1,
        )
    got = _Gathering(file, remarks=list(remarks))
    _take_symbols(got, tree)
    _take_parts(got, tree)
    _take_nets(got, tree, names_are_escaped=form == "netlist")
    parts = tuple(_part(got, reference) for reference in sorted(got.comps, key=natural_key))
    nets = tuple(Net(name=name, pins=tuple(sorted(pins))) for name, pins in sorted(got.nets.items()))
    if got.symbolless:
        got.remarks.append(
            f"{_named(got.symbolless, 'part')} without a symbol in the file: only the pins that the nets name are known"
        )
    for kind, count in sorted(got.strange_kinds.items()):
        got.remarks.append(
            f"the pin type {kind!r} of {count} pin{'s' if count > 1 else ''} is unknown and was taken as no type"
        )
    design = child(tree, "design")
    sheets = [text_of(child(sheet, "title_block"), "source") for sheet in children(design, "sheet")]
    sheets = sheets or [text_of(design, "source")]
    return Board(
        path=file,
        form=form,
        maker=text_of(design, "tool"),
        parts=parts,
        nets=nets,
        remarks=tuple(got.remarks),
        sheet_files=tuple(dict.fromkeys(sheet for sheet in sheets if sheet)),
    )


def _named(names: list[str], noun: str) -> str:
    """Return "2 parts (R1, R2)"."""
    shown = ", ".join(names[:_MOST_NAMED]) + (", ..." if len(names) > _MOST_NAMED else "")
    return f"{len(names)} {noun}{'s' if len(names) > 1 else ''} ({shown})"


def _take_symbols(got: _Gathering, tree: Tree) -> None:
    """Take the symbols' pins, under their own name and their aliases."""
    for section in children(tree, "libparts"):
        for libpart in children(section, "libpart"):
            library, name = text_of(libpart, "lib"), text_of(libpart, "part")
            pins = {
                text_of(pin, "num"): (text_of(pin, "name"), text_of(pin, "type"))
                for block in children(libpart, "pins")
                for pin in children(block, "pin")
            }
            aliases = [
                " ".join(words(alias)) for block in children(libpart, "aliases") for alias in children(block, "alias")
            ]
            for called in (name, *aliases):
                if got.symbols.setdefault((library, called), pins) is pins:
                    got.by_name[called].append((library, called))


def _take_parts(got: _Gathering, tree: Tree) -> None:
    """Take the parts; those of one reference are merged when they are alike."""
    nameless = 0
    unlike: set[str] = set()
    for section in children(tree, "components"):
        for comp in children(section, "comp"):
            reference = text_of(comp, "ref")
            if not reference:
                nameless += 1
            elif reference in got.comps:
                got.doubled.add(reference)
                first = got.comps[reference]
                if any(child(first, head) != child(comp, head) for head in ("value", "libsource")):
                    unlike.add(reference)
            else:
                got.comps[reference] = comp
    if unlike:
        raise InputError(
            f"has different parts of the same reference: {_named(sorted(unlike, key=natural_key), 'reference')}",
            remedy="annotate the schematic and export it again",
            file=got.file,
        )
    if nameless:
        got.remarks.append(f"{nameless} part{'s' if nameless > 1 else ''} without a reference left out")
    if not got.comps:
        what = "holds no parts" if children(tree, "components") else "holds no list of parts"
        raise InputError(what, remedy="export it from a schematic that has symbols on it", file=got.file)
    if got.doubled:
        names = _named(sorted(got.doubled, key=natural_key), "reference")
        got.remarks.append(f"{names} listed more than once, alike each time: taken as one part each")


def _take_nets(got: _Gathering, tree: Tree, *, names_are_escaped: bool) -> None:
    """Take the nets; one name is one net.

    In XML KiCad writes ``/a{slash}b`` as ``/a/b``, so that two nets may come to share a name: there the code tells them
    apart.
    """
    codes: dict[str, str] = {}
    repeated: list[str] = []
    strangers: list[str] = []
    twice: list[str] = []
    for section in children(tree, "nets"):
        for net in children(section, "net"):
            nodes = children(net, "node")
            name = text_of(net, "name")
            if not name and nodes:
                name = f"(net {text_of(net, 'code') or len(got.nets) + 1} without a name)"
                got.remarks.append(f"a net without a name is called {name!r}")
            code = text_of(net, "code")
            if name in got.nets and not names_are_escaped and code != codes[name]:
                got.remarks.append(f"two nets are called {name!r}: the second is called {f'{name} (net {code})'!r}")
                name = f"{name} (net {code})"
            if name in got.nets:
                repeated.append(name)
            codes.setdefault(name, code)
            pins = got.nets.setdefault(name, []) if name else []
            for node in nodes:
                reference, number = text_of(node, "ref"), text_of(node, "pin")
                if not reference or not number:
                    got.remarks.append(f"a node of the net {name!r} names no part or no pin and was left out")
                    continue
                if reference not in got.comps:
                    got.comps[reference] = ["comp"]
                    strangers.append(reference)
                before = got.pin_net.setdefault((reference, number), name)
                if before != name:
                    if reference in got.doubled:
                        raise InputError(
                            f"has several parts called {reference}: pin {number} is on {before!r} and on {name!r}",
                            remedy="annotate the schematic and export it again",
                            file=got.file,
                        )
                    twice.append(f"{reference}.{number}")
                    continue
                if number not in got.nodes[reference]:
                    pins.append((reference, number))
                    got.nodes[reference][number] = node
    if repeated:
        got.remarks.append(f"{_named(repeated, 'net name')} given more than once: taken as one net each")
    if strangers:
        got.remarks.append(f"{_named(strangers, 'part')} on nets but not among the parts: value and symbol are unknown")
    if twice:
        got.remarks.append(f"{_named(twice, 'pin')} on several nets: taken as on the first")
    if not got.nets:
        got.remarks.append("no net joins any pins")


def _pins_of(got: _Gathering, reference: str, symbol: dict[str, tuple[str, str]]) -> tuple[Pin, ...]:
    """Return a part's pins: those of its symbol and those that the nets name."""
    nodes = got.nodes.get(reference, {})
    pins: list[Pin] = []
    for number in sorted({*symbol, *nodes}, key=natural_key):
        node = nodes.get(number, [])
        name, kind = symbol.get(number, ("", ""))
        name = text_of(node, "pinfunction") or name
        kind, _, suffix = (text_of(node, "pintype") or kind).partition("+")
        kind = _KINDS.get(kind, kind)
        if kind and kind not in _KNOWN_KINDS:
            got.strange_kinds[kind] += 1
            kind = ""
        pins.append(
            Pin(
                part=reference,
                number=number,
                name="" if name == "~" else name,
                kind=kind,
                net=got.pin_net.get((reference, number), ""),
                unused="no_connect" in suffix,
            )
        )
    return tuple(pins)


def _part(got: _Gathering, reference: str) -> Part:
    """Return one part with its pins."""
    comp = got.comps[reference]
    source = child(comp, "libsource")
    library, name = text_of(source, "lib"), text_of(source, "part")
    symbol = got.symbols.get((library, name))
    if symbol is None and len(got.by_name[name]) == 1:
        symbol = got.symbols[got.by_name[name][0]]  # the library was renamed, the symbol is still unmistakable
    untyped = any(not text_of(node, "pintype") for node in got.nodes.get(reference, {}).values())
    if symbol is None and untyped and comp[1:]:
        got.symbolless.append(reference)
    fields: dict[str, str] = {}
    for block in children(comp, "fields"):
        for item in children(block, "field"):
            fields.setdefault(text_of(item, "name"), " ".join(words(item)))
    flagged = False
    keywords = ""
    for item in children(comp, "property"):
        label = text_of(item, "name")
        if label == "dnp":
            # A flag has no value; a user's field of that name has one, which may be empty.
            denied = text_of(item, "value").casefold() in ("", "0", "no", "false")
            flagged = flagged or not (children(item, "value") and denied)
        elif label == "ki_keywords":
            keywords = text_of(item, "value")
        elif label not in _OWN_PROPERTIES and not label.startswith(("ki_", "exclude_from_")):
            fields.setdefault(label, text_of(item, "value"))
    own = tuple((label, text) for label, text in fields.items() if label and label not in _OWN_FIELDS)
    value, footprint = text_of(comp, "value"), text_of(comp, "footprint")
    description = text_of(source, "description") or text_of(comp, "description") or fields.get("Description", "")
    why, remark = fitting(value, f"{library}:{name}", footprint, description, own, flagged)
    if remark:
        got.remarks.append(f"{reference} {remark}")
    stamps = [stamp for head in ("tstamps", "tstamp") for stamp in words(child(comp, head))]
    return Part(
        reference=reference,
        value=value,
        library=library,
        symbol=name,
        description=description,
        keywords=keywords,
        footprint=footprint,
        fields=own,
        fitted=not why,
        not_fitted_why=why,
        sheet=text_of(child(comp, "sheetpath"), "names") or "/",
        uuids=tuple(sorted({piece for stamp in stamps for piece in stamp.split()})),
        pins=_pins_of(got, reference, symbol or {}),
    )
