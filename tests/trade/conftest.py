"""Parts as a netlist would give them, in few words, and the shipped library."""

import pytest

from levelcrossing import tradebook
from levelcrossing.model import Part, Pin


def make_part(value, symbol="", reference="U1", library="", pins=(), fields=()):
    """Make a part; each pin is "number", "number:name" or "number:name:kind"."""
    made = []
    for text in pins:
        number, name, kind = [*text.split(":"), "", ""][:3]
        made.append(Pin(part=reference, number=number, name=name, kind=kind, net=f"net {number}"))
    return Part(
        reference=reference,
        value=value,
        symbol=symbol or value,
        library=library,
        fields=tuple(fields),
        pins=tuple(made),
    )


@pytest.fixture(scope="session")
def book():
    return tradebook.load()


@pytest.fixture(scope="session")
def part():
    return make_part


@pytest.fixture(scope="session")
def pin(book):
    """Ask the library about one pin: pin("74LVC245", "A1") or with number and kind."""

    def ask(value, name, number="99", kind="bidirectional", symbol="", pins=()):
        facts = book.part(make_part(value, symbol, pins=[*pins, f"{number}:{name}:{kind}"]))
        assert facts is not None, value
        return facts.pin(Pin(part="U1", number=number, name=name, kind=kind, net="n"))

    return ask
