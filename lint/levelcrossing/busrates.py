"""What a line must carry: the rate from the settings, else from a bus that its names give away."""

from __future__ import annotations

import fnmatch
import re
from collections.abc import Sequence
from dataclasses import dataclass

from levelcrossing.model import BusFacts, Crossing, Settings
from levelcrossing.pinnames import pin_words

# Buses whose usual least rate is a safe thing to ask of a line by its name alone; of others only settings speak.
BY_NAME = ("i2c", "uart")


@dataclass(frozen=True, slots=True, kw_only=True)
class Needed:
    """A rate with its reason: bit/s, the longest 30-70 % rise [s] where the bus limits it, and why."""

    bits_per_second: float
    why: str
    rise_30_70_max_s: float | None = None


def needed(crossing: Crossing, buses: Sequence[BusFacts], settings: Settings) -> Needed | None:
    """Return the rate that a crossing must carry, None when nothing tells.

    Parameters
    ----------
    crossing : Crossing
    buses : sequence of BusFacts
    settings : Settings

    Returns
    -------
    Needed or None
    """
    nets = [crossing.receiver.net, crossing.driver.net if crossing.driver else ""]
    for pattern, rate in settings.rates:
        if any(net and fnmatch.fnmatchcase(net, pattern) for net in nets):
            return Needed(bits_per_second=rate, why=f"the settings ask {pattern} for it")
    for bus in buses:
        if bus.name in BY_NAME and _named(bus, crossing, nets):
            limit = bus.modes[0].rise_max_s if bus.open_drain and bus.modes else None
            return Needed(
                bits_per_second=bus.bits_per_second,
                why=f"the names say {bus.name.upper()}, whose usual least rate it is",
                rise_30_70_max_s=limit,
            )
    return None


def _named(bus: BusFacts, crossing: Crossing, nets: Sequence[str]) -> bool:
    """Tell whether net and pin names agree on a role of the bus."""
    names = [re.sub(r"[~{}]", "", net.rsplit("/", 1)[-1]) for net in nets if net]
    names = [re.sub(r"([_-](3V3|5V|1V8|2V5|LV|HV)|5V|3V3)$", "", name, flags=re.IGNORECASE) for name in names]
    for _, pattern in bus.nets:
        wanted = re.compile(pattern, re.IGNORECASE)
        if any(wanted.fullmatch(name) for name in names):
            return True
    if bus.name != "i2c":
        return False
    words = [word for pin in (crossing.driver, crossing.receiver) if pin is not None for word in pin_words(pin.name)]
    return any(
        re.fullmatch(pattern, word, re.IGNORECASE)
        for _, pattern in bus.pins
        for word in words
        if "SD" in word.upper() or "SC" in word.upper()
    ) and all(
        pin is not None and pin.drive is not None and pin.drive.style == "open-drain" for pin in (crossing.driver,)
    )
