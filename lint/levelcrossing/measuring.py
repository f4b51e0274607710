"""What measures a voltage rather than reads it as high or low: a divider from another rail into an input that can.

A controller's pin behind a divider from the battery is the usual way to measure that battery. Its level need not reach
VIH, and no rule about levels has anything to say; what the pin bears still counts.
"""

from __future__ import annotations

import re
from collections.abc import Collection, Iterable

from levelcrossing.model import Element, PartFacts, PinModel, Rails

# Groups of parts whose pins may measure. Gate arrays measure nowhere but at pins of their own.
MEASURING_GROUPS = frozenset({"mcu", "module"})
# Names of what is measured, in nets and pins.
ANALOG = re.compile(
    r"ADC|AIN|ANALOG|(^|[/_])AN?\d|SENS|MEAS|MON(ITOR)?([_\d/]|$)|BATT?([_\d/]|$)|DIV|TEMP|NTC|POT([_\d/]|$)|VREF|[UVI]_?(IN|BUS|SYS)",
    re.IGNORECASE,
)


def pulled_down(net: str, elements: Iterable[Element], rails: Rails) -> bool:
    """Tell whether a resistor leads from a net to ground.

    Parameters
    ----------
    net : str
    elements : iterable of Element
        Of the net's island.
    rails : Rails

    Returns
    -------
    bool
    """
    return any(
        element.kind == "resistor" and net in element.nets and any(rails.is_ground(other) for other in element.nets)
        for element in elements
    )


def measures(receiver: PinModel, nets: Collection[str], known: PartFacts | None) -> bool | None:
    """Tell whether a pin behind a divider measures its voltage.

    Parameters
    ----------
    receiver : PinModel
    nets : collection of str
        Its net and those tied to it by small resistances.
    known : PartFacts or None
        Of its part.

    Returns
    -------
    bool or None
        True where net or pin are named for it, None where the pin could measure and nothing says that it does not.
    """
    group = known.group if known is not None else ""
    if group not in MEASURING_GROUPS and (receiver.drive is None or group == "fpga"):
        return False
    return True if any(ANALOG.search(name) for name in (*nets, receiver.name)) else None
