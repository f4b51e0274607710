"""From a ``[[bus]]`` row of trade data to what it says of a bus."""

from __future__ import annotations

from levelcrossing.model import BusFacts, BusMode
from levelcrossing.trade_pins import scaled
from levelcrossing.trade_rows import Row


def bus_facts(row: Row) -> BusFacts:
    """Return what a ``[[bus]]`` row says."""
    return BusFacts(
        name=row.id,
        title=row.get("title") or row.id.upper(),
        nets=tuple(row.get("names", {}).items()),
        pins=tuple(row.get("pins", {}).items()),
        bits_per_second=row.get("rate_bits_per_second"),
        least_bits_per_second=row.get("rate_least_bits_per_second"),
        least_why=row.get("rate_least_why", ""),
        together=tuple(tuple(roles.split()) for roles in row.get("together", ())),
        parts=row.get("parts", ""),
        rise_max_s=scaled(row.get("rise_max_nanoseconds"), 1e-9),
        rise_fraction=row.get("rise_fraction"),
        open_drain=bool(row.get("open_drain", False)),
        both_directions=bool(row.get("both_directions", False)),
        modes=tuple(
            BusMode(
                name=mode["id"],
                bits_per_second=float(mode["bits_per_second"]),
                rise_max_s=scaled(mode.get("rise_max_nanoseconds"), 1e-9),
                fall_max_s=scaled(mode.get("fall_max_nanoseconds"), 1e-9),
                load_max_farads=scaled(mode.get("load_max_picofarads"), 1e-12),
                sink_amps=scaled(mode.get("sink_milliamperes"), 1e-3),
                sink_volts=mode.get("sink_volts"),
            )
            for mode in row.get("modes", ())
        ),
        notes=tuple(row.get("rules", ())),
        provenance=row.provenance,
    )
