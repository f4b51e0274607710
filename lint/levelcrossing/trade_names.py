"""What the name of a net says: a voltage, a signal, or ground."""

from __future__ import annotations

import re
from collections.abc import Sequence

from levelcrossing.model import Provenance, Spread
from levelcrossing.trade_rows import Row

_AUTOMATIC = re.compile(r"^(Net-\(|N\$|unconnected-\(|N-\d{4,}|\$)", re.IGNORECASE)
_VOLTAGE = re.compile(r"(?<![A-Z0-9])[+-]?\d{1,2}(?:V\d{0,2}|[.,]\d{1,3}V?)(?![A-Z0-9]*\d)", re.IGNORECASE)


def last_component(net_name: str) -> str:
    """Return the last part of a hierarchical net name: ``/Power/+3V3`` gives ``+3V3``."""
    plain = re.sub(r"~\{([^}]*)\}", r"\1", net_name.strip()).replace("{slash}", "_").replace("~", "")
    return plain.rstrip("/").rsplit("/", 1)[-1].strip()


class RailNames:
    """The rows of ``rail_names.toml``."""

    def __init__(self, rows: Sequence[Row]) -> None:
        self.voltages = [row for row in rows if row.table == "rail_name"]
        self.ranges = [row for row in rows if row.table == "rail_range"]
        self.lists = {row.id: row for row in rows if row.table == "word_list"}
        self._compiled: dict[str, re.Pattern[str]] = {}
        self._signal_words: frozenset[str] | None = None

    def _pattern(self, text: str) -> re.Pattern[str]:
        if text not in self._compiled:
            self._compiled[text] = re.compile(text, re.IGNORECASE)
        return self._compiled[text]

    def _any(self, name: str, word_list: str) -> bool:
        row = self.lists.get(word_list)
        return row is not None and any(self._pattern(text).fullmatch(name) for text in row.get("match", ()))

    def volts(self, net_name: str) -> tuple[Spread, Provenance] | None:
        """Return the voltage that a net's name carries [V], or None when it carries none or looks like a signal."""
        if _AUTOMATIC.match(net_name) or self.looks_like_ground(net_name):
            return None
        name = last_component(net_name)
        if self.looks_like_signal(name):
            return None
        for row in self.ranges:
            if any(self._pattern(text).fullmatch(name) for text in row.patterns):
                low, nominal, high = row.get("volts")
                return Spread(low=low, nominal=nominal, high=high), row.provenance
        for row in self.voltages:
            for text in row.patterns:
                found = self._pattern(text).fullmatch(name)
                if found is not None:
                    value = _value(found)
                    if value is None:
                        return None
                    return Spread.exactly(value), row.provenance
        return None

    def looks_like_signal(self, net_name: str) -> bool:
        """Tell whether a name with a voltage in it is a signal's (``3V3_EN``, ``SDA_3V3``, ``1V8_3V3_SEL``)."""
        name = last_component(net_name)
        if self._any(name, "bus bits"):
            return True
        if self._signal_words is None:
            row = self.lists.get("signal words")
            self._signal_words = frozenset(word.upper() for word in row.get("words", ())) if row else frozenset()
        tokens = [token for token in re.split(r"[_\-/ .()\[\]<>]+", name.upper()) if token]
        if any(
            token.strip("~#+").rstrip("#") in self._signal_words or self._any(token, "signal patterns")
            for token in tokens
        ):
            return True
        # two different voltages in one name are the two ends of something, not a rail
        found = {hit.lstrip("+-").upper().replace(",", ".") for hit in _VOLTAGE.findall(name)}
        return len(found) > 1

    def looks_like_ground(self, net_name: str) -> bool:
        """Tell whether a net is named like ground."""
        return self._any(last_component(net_name), "ground")


def _value(found: re.Match[str]) -> float | None:
    groups = found.groupdict()
    if groups.get("tenths"):
        value = int(groups["tenths"]) / 10
    else:
        value = float(f"{groups['whole']}.{groups.get('part') or 0}")
    if value > 60:
        return None
    return -value if groups.get("sign") in ("-", "N", "n") else value
