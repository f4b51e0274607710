"""What pin names say: alternates, supply pins."""

from __future__ import annotations

import re

from levelcrossing.model import Pin

SUPPLY_NAME = re.compile(
    r"(?:[AD]|IO|USB|ADC|PLL|RF|PS|CORE|OSC|RTC)?_?V?(?:VCC|VDD|VEE|VSS|VBAT|VIN|VBUS|VIO|VLOGIC|VREG|VSYS|VPP|VMOT|VM|VCORE|VUSB)"
    r"(?:[_A-Z0-9.+()/{}-]*)|V\+|V-|\+?\d+V\d*.*|\d+[.]\d+V.*|3V3.*|GND.*|.*GND|AGND|PGND|EP|EPAD|PAD|THERMAL.*|VS|VCC.*|VDD.*|VL|VS\+|VS-",
    re.IGNORECASE,
)

# Names of the ends of an asynchronous serial line, from the part's own point of view.
SERIAL_OUT, SERIAL_IN = (re.compile(rf"(U(ART)?\d?_?)?{way}(D|O|I)?\d?", re.IGNORECASE) for way in ("TX", "RX"))


def pin_words(name: str) -> tuple[str, ...]:
    """Split a pin name into its alternates, without overbars: ``~{RESET}/PC6`` gives ``RESET`` and ``PC6``.

    Parameters
    ----------
    name : str
        Name as written in the symbol.

    Returns
    -------
    tuple of str
    """
    plain = re.sub(r"~\{([^}]*)\}|~", lambda match: match.group(1) or "", name).replace("{slash}", "/")
    return tuple(word.strip() for word in re.split(r"[/\s]|(?<=\w)\((?=\w)", plain) if word.strip())


def looks_like_supply(pin: Pin) -> bool:
    """Tell from type and name whether a pin is a supply pin (types lie; a supply name on a rail is believed)."""
    words = pin_words(pin.name.replace("_{", "").replace("}", ""))
    named = bool(words) and SUPPLY_NAME.fullmatch(words[0]) is not None
    return named or (
        pin.kind in ("power_in", "power_out") and not (words and re.match(r"(EN|SW|FB|PG)", words[0], re.I))
    )
