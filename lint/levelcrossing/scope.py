"""What comes in sight on a board and is not judged: mains, high voltage, isolation, batteries, medical use."""

from __future__ import annotations

import re

from levelcrossing.model import CaseFile

HIGH_VOLTS = 60.0
_SIGNS = (
    (
        re.compile(
            r"\b(230|240|220|110|115|120)\s?V(AC)?\b|\bMAINS\b|\bAC_?[LN]\b|HLK-|IRM-\d|\bSSR\b|TRIAC|BT13[689]|MOC30",
            re.I,
        ),
        "mains: not judged; local electrical codes, the applicable product standard and a licensed engineer decide",
    ),
    (
        re.compile(
            r"ISO\d{3,4}|ADUM|SI86\d\d|ADM\d{3,4}E?.*ISO|PC817|TLP\d{3}|6N13[5-9]|4N\d\d|EL817|VO6\d+|HCPL|LTV-?8\d\d",
            re.I,
        ),
        "isolation: each side was judged on its own supply; creepage, clearance and insulation were not (applicable standard, licensed engineer)",
    ),
    (
        re.compile(
            r"\bBATT?ERY|\b(LI-?ION|LIPO|18650|CR20\d\d)\b|TP4056|MCP738\d\d|BQ2\d{4}|\+BATT?\b|\bVBATT?\b", re.I
        ),
        "batteries: their voltage range was used, charging, protection and safety were not judged (applicable standard, cell maker)",
    ),
    (
        re.compile(r"\b(ECG|EEG|EMG|PACEMAKER|DEFIB|PATIENT|MAX3010\d|ADS129\d|AD8232)\b", re.I),
        "medical use: leakage currents, isolation and safety were not judged (IEC 60601 series, licensed practice)",
    ),
)


def out_of_scope(case: CaseFile) -> tuple[str, ...]:
    """Name what a review of logic levels does not cover on this board.

    Parameters
    ----------
    case : CaseFile

    Returns
    -------
    tuple of str
        One line each with the parts or nets that gave the sign; empty when nothing did.
    """
    found = []
    for pattern, text in _SIGNS:
        signs = [
            part.reference
            for part in case.board.parts
            if part.fitted and (pattern.search(part.value) or pattern.search(part.symbol))
        ]
        signs += [net.name for net in case.board.nets if pattern.search(net.name)]
        if signs:
            more = f" and {len(signs) - 3} more" if len(signs) > 3 else ""
            found.append(f"{', '.join(signs[:3])}{more}: {text}")
    high = [
        net
        for net, rail in case.rails.by_net.items()
        if rail.volts is not None and abs(rail.volts.nominal) > HIGH_VOLTS
    ]
    if high:
        found.append(
            f"{', '.join(sorted(high)[:3])}: above {HIGH_VOLTS:g} V, outside extra-low voltage: not judged; local codes, the applicable standard and a licensed engineer decide"
        )
    return tuple(found)
