"""Which pins of a diode part are anode and cathode."""

from __future__ import annotations

import re
from collections import defaultdict

from levelcrossing.model import Part, Pin
from levelcrossing.pinnames import pin_words


def diode_pairs(part: Part) -> list[tuple[Pin, Pin]]:
    """Return the (anode, cathode) pins of each diode in a part.

    Notes
    -----
    Names ``A`` and ``K`` decide (also ``A1``/``K1``); a common terminal serves all. Series pairs such as the BAT54S
    (1 anode, 2 cathode, 3 middle) and symbols without names follow KiCad's pin order: 1 cathode, 2 anode. BAT54C, BAV70,
    BAS40-05 and BAS70-05 have their cathodes joined at pin 3, BAT54A, BAW56, BAS40-06 and BAS70-06 their anodes (makers'
    data sheets, from memory).
    """
    named: dict[str, list[Pin]] = defaultdict(list)
    for pin in part.pins:
        word = (pin_words(pin.name) or ("",))[0].upper()
        if re.fullmatch(r"A\d?|ANODE\d?|\+", word):
            named["A"].append(pin)
        elif re.fullmatch(r"(K|C)\d?|CATHODE\d?|-", word) and word != "COM":
            named["K"].append(pin)
        else:
            named["?"].append(pin)
    anodes, cathodes, rest = named["A"], named["K"], named["?"]
    if len(part.pins) == 3 and re.search(
        r"BAT\d+S|BAV99|BAS70-04|BAS40-04|DUAL_SERIES|SERIES", f"{part.value} {part.symbol}".upper()
    ):
        by_number = {pin.number: pin for pin in part.pins}
        if {"1", "2", "3"} <= set(by_number):
            return [(by_number["1"], by_number["3"]), (by_number["3"], by_number["2"])]
    if len(part.pins) == 3 and len(rest) == 1 and len(anodes) == 1 and len(cathodes) == 1:
        return [(anodes[0], rest[0]), (rest[0], cathodes[0])]
    if len(anodes) > 1 and len(cathodes) == 1:
        return [(anode, cathodes[0]) for anode in anodes]
    if len(cathodes) > 1 and len(anodes) == 1:
        return [(anodes[0], cathode) for cathode in cathodes]
    if anodes and len(anodes) == len(cathodes):
        return list(zip(anodes, cathodes, strict=True))
    if len(part.pins) == 2 and not anodes and not cathodes:
        return [(part.pins[1], part.pins[0])]
    by_number = {pin.number: pin for pin in part.pins}
    if set(by_number) == {"1", "2", "3"} and not anodes and not cathodes:
        words = f"{part.value} {part.symbol}".upper()
        if re.search(r"BAT\d\dC|BAV70|BA[ST]\d\d-05|COM_?K|KAK|ACOM_?C", words):
            return [(by_number["1"], by_number["3"]), (by_number["2"], by_number["3"])]
        if re.search(r"BAT\d\dA|BAW56|BA[ST]\d\d-06|COM_?A|AKA", words):
            return [(by_number["3"], by_number["1"]), (by_number["3"], by_number["2"])]
    return []
