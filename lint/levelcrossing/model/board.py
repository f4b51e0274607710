"""The board as the readers hand it on: parts, pins, nets."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class Pin:
    """One pin of a part, as the netlist has it.

    Parameters
    ----------
    part : str
        Reference of the part.
    number : str
        Pin number, text.
    name : str
        Pin name as written (may hold ``~{...}``, ``/``); empty when the symbol gives none.
    kind : str
        Electrical type in one spelling whatever the file's age: ``input``, ``output``, ``bidirectional``,
        ``tri_state``, ``passive``, ``free``, ``unspecified``, ``power_in``, ``power_out``, ``open_collector``,
        ``open_emitter``, ``no_connect``; empty when the netlist does not say.
    net : str
        Name of the net it is on; empty when on none.
    unused : bool
        Marked as deliberately not connected.
    """

    part: str
    number: str
    name: str
    kind: str
    net: str
    unused: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """One part of a board.

    Parameters
    ----------
    reference, value, footprint, description : str
        As written.
    library, symbol : str
        Library and name of the schematic symbol (``74xx``, ``74LS245``).
    fields : tuple of (str, str)
        User fields in file order, without reference, value, footprint and datasheet.
    fitted : bool
        False when a not-fitted property or a not-fitted value (``NA(...)``, ``DNP``) says so.
    not_fitted_why : str
        The evidence for ``fitted == False``.
    sheet : str
        Path of the sheet (``/power/``).
    uuids : tuple of str
        Identifiers of the symbol's units in the sheets; order carries no meaning.
    pins : tuple of Pin
        All pins that the symbol or the nets name, in natural order of their numbers.
    """

    reference: str
    value: str
    library: str = ""
    symbol: str = ""
    description: str = ""
    keywords: str = ""
    footprint: str = ""
    fields: tuple[tuple[str, str], ...] = ()
    fitted: bool = True
    not_fitted_why: str = ""
    sheet: str = "/"
    uuids: tuple[str, ...] = ()
    pins: tuple[Pin, ...] = ()

    def field(self, *names: str) -> str:
        """Return the first non-empty field of one of these names (case ignored), or an empty text."""
        wanted = [name.casefold() for name in names]
        for wish in wanted:
            for name, text in self.fields:
                if name.casefold() == wish and text:
                    return text
        return ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Net:
    """One net: its name and its pins as (reference, pin number), sorted."""

    name: str
    pins: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Board:
    """A whole board as read.

    Parameters
    ----------
    path : str
        The reviewed file as the user named it.
    form : str
        ``netlist``, ``xml`` or ``sheets``.
    maker : str
        What wrote the file (``Eeschema 9.0.2``).
    parts : tuple of Part
        Sorted by reference, natural order.
    nets : tuple of Net
        Sorted by name.
    remarks : tuple of str
        What the reader had to put right or leave out, one line each.
    sheet_files : tuple of str
        Sheets that the board was drawn on, where the file names them (relative to ``path``).
    """

    path: str
    form: str
    maker: str = ""
    parts: tuple[Part, ...]
    nets: tuple[Net, ...]
    remarks: tuple[str, ...] = ()
    sheet_files: tuple[str, ...] = ()
