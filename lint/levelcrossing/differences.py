"""What a revision changed: crossings and findings added, removed, better, worse, with the figures before and after.

Both sides are given in the JSON form of a review, so that a saved one is as good as a fresh one. Where the boards
themselves are at hand, parts and nets are matched by what they are, and renumbering them changes nothing.
"""

from __future__ import annotations

from collections.abc import Hashable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, fields
from typing import Any

from levelcrossing.figures import VOLTS_THAT_MATTER, Figure, differs, figures_of, worst_margin
from levelcrossing.matching import match_nets, match_parts, match_rows
from levelcrossing.model import Board, Outcome, PinSetting, Settings, Spread, Waiver


@dataclass(frozen=True, slots=True, kw_only=True)
class Side:
    """One revision.

    Parameters
    ----------
    label : str
        How the user calls it.
    form : mapping
        The review in its JSON form; one with empty tables when the board did not exist.
    board : Board or None
    settings : Settings or None
        None when they are not known (a saved review).
    """

    label: str
    form: Mapping[str, Any]
    board: Board | None = None
    settings: Settings | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """One thing that a revision changed.

    Parameters
    ----------
    kind : str
        ``worse``, ``added``, ``unclear`` (no longer judged), ``moved`` (figures only), ``better``, ``removed``.
    title : str
        The crossing or the place, named as in the new revision where it exists.
    before, after : str or None
        Verdict or outcome; None on the side where it does not exist.
    figures : tuple of Figure
        Those that moved, or all of an added crossing.
    findings : tuple of mapping
        Findings behind it, in the JSON form.
    notes : tuple of str
    counts : bool
        It decides the exit status.
    """

    kind: str
    title: str
    before: str | None
    after: str | None
    figures: tuple[Figure, ...] = ()
    findings: tuple[Mapping[str, Any], ...] = ()
    notes: tuple[str, ...] = ()
    counts: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Comparison:
    """All that a revision changed on one board."""

    old: str
    new: str
    stop_at: Outcome | None
    changes: tuple[Change, ...] = ()
    new_waivers: tuple[str, ...] = ()
    declared: tuple[str, ...] = ()
    rails: tuple[str, ...] = ()
    coverage: tuple[str, ...] = ()
    remarks: tuple[str, ...] = ()
    crossings: tuple[int, int] = (0, 0)

    @property
    def empty(self) -> bool:
        """Nothing that a reviewer need look at has changed."""
        return not (self.changes or self.new_waivers or self.declared or self.rails or self.coverage)

    @property
    def fails(self) -> bool:
        """Something became worse at or above the stop level."""
        return any(change.counts for change in self.changes)

    def of_kind(self, *kinds: str) -> list[Change]:
        """Return the changes of some kinds."""
        return [change for change in self.changes if change.kind in kinds]


KINDS = ("worse", "added", "unclear", "better", "removed", "moved")


@dataclass(slots=True)
class _Names:
    """How the old revision's parts and nets are called in the new one."""

    parts: Mapping[str, str] | None = None
    nets: Mapping[str, str] | None = None

    def part(self, name: str | None) -> str | None:
        if not name or self.parts is None:
            return name
        return self.parts.get(name, f"\0gone {name}")

    def net(self, name: str | None) -> str | None:
        if not name or self.nets is None:
            return name
        return self.nets.get(name, f"\0gone {name}")

    def place(self, place: str) -> str:
        """Return a part or pin ``U3.4`` under its new name; unchanged when it is gone."""
        part, dot, pin = place.partition(".")
        if self.parts is not None and part in self.parts:
            return self.parts[part] + dot + pin
        return self.nets.get(place, place) if self.nets is not None else place


def compare_sides(
    old: Side, new: Side, *, stop_at: Outcome | None = Outcome.MALFUNCTION, accept_new_waivers: bool = False
) -> Comparison:
    """Say what became of each crossing and finding.

    Parameters
    ----------
    old, new : Side
    stop_at : Outcome or None
        What became worse counts from this outcome on; None for never.
    accept_new_waivers : bool
        Let waivers that are not in the old revision's settings silence what is new.
    """
    names = _Names()
    if old.board is not None and new.board is not None:
        names.parts = match_parts(old.board, new.board)
        names.nets = match_nets(old.board, new.board, names.parts)
    return _Comparing(old, new, names, stop_at, accept_new_waivers).result()


class _Comparing:
    def __init__(self, old: Side, new: Side, names: _Names, stop_at: Outcome | None, accept: bool) -> None:
        self.old, self.new, self.names, self.stop_at, self.accept = old, new, names, stop_at, accept
        self.old_rows: Sequence[Mapping[str, Any]] = old.form["crossings"]
        self.new_rows: Sequence[Mapping[str, Any]] = new.form["crossings"]
        self.old_findings: Sequence[Mapping[str, Any]] = old.form["findings"]
        self.new_findings: Sequence[Mapping[str, Any]] = new.form["findings"]
        self.row_pairs = match_rows(self.old_rows, self.new_rows, self._row_passes())
        self.finding_pairs = match_rows(self.old_findings, self.new_findings, self._finding_passes())
        self._pair_overlapping()
        self.old_of_finding = {after: before for before, after in self.finding_pairs}
        self.by_new_waiver = {index for index in range(len(self.new_findings)) if self._newly_waived(index)}

    # -- matching ----------------------------------------------------------------------------------------------------

    def _row_passes(self) -> list[Any]:
        names, same = self.names, _Names()

        def ends(row: Mapping[str, Any], by: _Names) -> tuple[Hashable, ...]:
            start, end = row["from"], row["to"]
            return by.part(start["part"]), start["pin"], by.part(end["part"]), end["pin"], bool(row.get("first_half"))

        def link(row: Mapping[str, Any], by: _Names) -> Hashable:
            return frozenset(by.part(part) for part in row["link"])

        def rails(row: Mapping[str, Any], by: _Names) -> Hashable:
            return by.net(row["from"]["rail"]), by.net(row["to"]["rail"])

        def rail_driven(row: Mapping[str, Any], by: _Names) -> Hashable | None:
            return (ends(row, by), link(row, by)) if row["from"]["part"] is None else None

        def pin_driven(row: Mapping[str, Any], by: _Names) -> Hashable | None:
            return ends(row, by) if row["from"]["part"] is not None else None

        def receiver(row: Mapping[str, Any], by: _Names) -> Hashable:
            return ends(row, by)[2:], row["from"]["part"] is None

        def driver(row: Mapping[str, Any], by: _Names) -> Hashable | None:
            return (ends(row, by)[:2], link(row, by)) if row["from"]["part"] is not None and row["link"] else None

        keys = [
            (lambda row, by: (ends(row, by), link(row, by), rails(row, by)), False),
            (lambda row, by: (ends(row, by), link(row, by)), False),
            (rail_driven, False),
            (pin_driven, False),
            (receiver, True),
            (driver, True),
        ]
        return [
            (lambda row, key=key: key(row, names), lambda row, key=key: key(row, same), alone) for key, alone in keys
        ]

    def _finding_passes(self) -> list[Any]:
        names, same = self.names, _Names()
        of_row = dict(self.row_pairs)

        def place(finding: Mapping[str, Any], by: _Names) -> tuple[Hashable, ...]:
            # Which of several places of one cause stands first goes by their numbers.
            return finding["rule"], frozenset(_places(finding, by))

        def row(finding: Mapping[str, Any], by: _Names) -> Hashable:
            index = finding.get("crossing")
            return index if by is same or index is None else of_row.get(index, "gone")

        def head(finding: Mapping[str, Any], by: _Names) -> Hashable:
            return finding["rule"], next(iter(_places(finding, by)))

        def mark(finding: Mapping[str, Any], by: _Names) -> Hashable | None:
            return (finding["rule"], finding["fingerprint"]) if finding.get("fingerprint") else None

        def rule_and_row(finding: Mapping[str, Any], by: _Names) -> Hashable | None:
            return (finding["rule"], row(finding, by)) if finding.get("crossing") is not None else None

        keys = [
            (lambda finding, by: (place(finding, by), row(finding, by)), False),
            (place, False),
            (mark, False),
            (head, False),
            (rule_and_row, True),
        ]
        return [
            (lambda one, key=key: key(one, names), lambda one, key=key: key(one, same), alone) for key, alone in keys
        ]

    def _pair_overlapping(self) -> None:
        """Pair the findings left over that share a place: one cause may have gained or lost some of its places."""
        left = {before for before, _ in self.finding_pairs}
        right = {after for _, after in self.finding_pairs}
        by_place: dict[tuple[str, str], int] = {}
        for index, finding in enumerate(self.new_findings):
            if index not in right:
                for place in _places(finding, _Names()):
                    by_place.setdefault((finding["rule"], place), index)
        for before, finding in enumerate(self.old_findings):
            if before in left:
                continue
            hits = [by_place.get((finding["rule"], place)) for place in _places(finding, self.names)]
            after = next((hit for hit in hits if hit is not None and hit not in right), None)
            if after is not None:
                right.add(after)
                self.finding_pairs.append((before, after))

    # -- waivers -----------------------------------------------------------------------------------------------------

    def _newly_waived(self, index: int) -> bool:
        """Tell whether a finding is accepted by a waiver that the old revision did not have."""
        finding = self.new_findings[index]
        if finding.get("waived") is None:
            return False
        before = self.old_of_finding.get(index)
        if before is not None and self.old_findings[before].get("waived") is not None:
            return False
        waivers = self.old.settings.waivers if self.old.settings is not None else ()
        return not any(self._covers(waiver, finding) for waiver in waivers)

    def _covers(self, waiver: Waiver, finding: Mapping[str, Any]) -> bool:
        if waiver.rule != finding["rule"] or waiver.reason != finding["waived"]:
            return False
        if waiver.fingerprint and finding.get("fingerprint"):
            return bool(waiver.fingerprint == finding["fingerprint"])
        pin = f"{finding['part']}.{finding['pin']}"
        return self.names.place(waiver.at) in (pin, finding["part"], finding["net"])

    def _silenced(self, index: int) -> bool:
        return self.new_findings[index].get("waived") is not None and (self.accept or index not in self.by_new_waiver)

    def _stops(self, outcome: str) -> bool:
        return self.stop_at is not None and Outcome(outcome).rank <= self.stop_at.rank

    # -- the result --------------------------------------------------------------------------------------------------

    def result(self) -> Comparison:
        """Return the comparison, what counts first."""
        rows, told = [], set[int]()
        for change, indices in self._row_changes():
            rows.append(change)
            if change.kind in ("worse", "added", "unclear"):
                told.update(indices)
        changes = [*rows, *self._finding_changes(told)]
        changes.sort(key=lambda change: (not change.counts, KINDS.index(change.kind), _rank(change), change.title))
        return Comparison(
            old=self.old.label,
            new=self.new.label,
            stop_at=self.stop_at,
            changes=tuple(changes),
            new_waivers=tuple(self._new_waivers()),
            declared=tuple(self._declared()),
            rails=tuple(self._rails()),
            coverage=tuple(self._coverage()),
            crossings=(len(self.old_rows), len(self.new_rows)),
        )

    def _row_changes(self) -> Iterator[tuple[Change, Sequence[int]]]:
        paired_old = {before for before, _ in self.row_pairs}
        paired_new = {after for _, after in self.row_pairs}
        for before, after in self.row_pairs:
            change = self._pair(self.old_rows[before], self.new_rows[after])
            if change is not None:
                yield change, self.new_rows[after].get("findings", ())
        for index, row in enumerate(self.new_rows):
            if index not in paired_new and not _hidden(row):
                yield (
                    Change(
                        kind="added",
                        title=crossing_title(row),
                        before=None,
                        after=row["verdict"],
                        figures=tuple(figures_of(None, row)),
                        findings=self._findings(row),
                        counts=self._counts(row),
                    ),
                    row.get("findings", ()),
                )
        for index, row in enumerate(self.old_rows):
            if index not in paired_old and not _hidden(row):
                yield Change(kind="removed", title=crossing_title(row), before=row["verdict"], after=None), ()

    def _findings(self, row: Mapping[str, Any]) -> tuple[Mapping[str, Any], ...]:
        return tuple(self.new_findings[index] for index in row.get("findings", ()))

    def _counts(self, row: Mapping[str, Any]) -> bool:
        indices = row.get("findings", ())
        if not indices:
            return self._stops(row["verdict"])
        return any(self._stops(self.new_findings[index]["outcome"]) and not self._silenced(index) for index in indices)

    def _pair(self, before: Mapping[str, Any], after: Mapping[str, Any]) -> Change | None:
        moved = tuple(one for one in figures_of(before, after) if differs(one.before, one.after, one.unit))
        old_verdict, new_verdict = before["verdict"], after["verdict"]
        kind = _kind(old_verdict, new_verdict)
        notes = []
        if kind == "same":
            if not moved or _hidden(before):
                return None
            fell = worst_margin(after) - worst_margin(before)
            kind = "moved"
            if old_verdict not in ("sound", "unknown") and abs(fell) > VOLTS_THAT_MATTER:
                kind = "worse" if fell < 0 else "better"
        if before["shifter"]["kind"] != after["shifter"]["kind"]:
            notes.append(f"was {before['shifter']['kind']}, is {after['shifter']['kind']}")
        old_link = sorted(self.names.place(part) for part in before["link"])
        if old_link != sorted(after["link"]):
            notes.append(f"was through {_listed(before['link'])}, is through {_listed(after['link'])}")
        return Change(
            kind=kind,
            title=crossing_title(after),
            before=old_verdict,
            after=new_verdict,
            figures=moved,
            findings=self._findings(after) if kind in ("worse", "unclear") else (),
            notes=tuple(notes),
            counts=kind in ("worse", "unclear") and self._counts(after),
        )

    def _finding_changes(self, told: set[int]) -> Iterator[Change]:
        """Yield what became of findings that no changed crossing tells of already."""
        paired_new = {after for _, after in self.finding_pairs}
        paired_old = {before for before, _ in self.finding_pairs}
        for index, finding in enumerate(self.new_findings):
            if index in told:
                continue
            kind, before = "added", None
            notes: tuple[str, ...] = ()
            if index in paired_new:
                old = self.old_findings[self.old_of_finding[index]]
                before = old["outcome"]
                kind = _kind(before, finding["outcome"])
                freed = old.get("waived") is not None and finding.get("waived") is None
                known = set(_places(old, self.names))
                fresh = [place for place in _places(finding, _Names()) if place not in known]
                if kind == "same" and not freed and not (fresh and finding.get("also")):
                    continue
                if kind in ("same", "better") and (freed or fresh):
                    kind = "worse"
                notes = ("the waiver that accepted it is gone",) if freed else ()
                notes += (f"now also at {_listed(fresh, 8)}",) if fresh else ()
            yield Change(
                kind=kind,
                title=f"{finding['rule']} at {finding_place(finding)}",
                before=before,
                after=finding["outcome"],
                findings=(finding,),
                notes=notes,
                counts=kind in ("added", "worse", "unclear")
                and self._stops(finding["outcome"])
                and not self._silenced(index),
            )
        for index, finding in enumerate(self.old_findings):
            if index not in paired_old and finding.get("crossing") is None:
                title = f"{finding['rule']} at {finding_place(finding)}"
                yield Change(kind="removed", title=title, before=finding["outcome"], after=None)

    def _new_waivers(self) -> Iterator[str]:
        for index in sorted(self.by_new_waiver):
            finding = self.new_findings[index]
            yield (
                f"{finding['outcome']} {finding['rule']} at {finding_place(finding)} is accepted by a waiver added in "
                f"this change: {finding['waived']}"
            )
        if self.old.settings is None or self.new.settings is None:
            return
        # A waiver that accepts nothing yet may be meant for what comes next.
        known = {(one.rule, self.names.place(one.at), one.reason, one.fingerprint) for one in self.old.settings.waivers}
        used = {(self.new_findings[index]["rule"], self.new_findings[index]["waived"]) for index in self.by_new_waiver}
        for waiver in self.new.settings.waivers:
            fresh = (waiver.rule, waiver.at, waiver.reason, waiver.fingerprint) not in known
            if fresh and (waiver.rule, waiver.reason) not in used:
                yield f"waiver of {waiver.rule} at {waiver.at} was added or altered: {waiver.reason}"

    def _declared(self) -> Iterator[str]:
        """Yield what the settings and the fields of the symbols declare differently."""
        if self.old.settings is None or self.new.settings is None:
            return
        before, after = _flat(self.old.settings, self.names), _flat(self.new.settings, _Names())
        for key in sorted(before.keys() | after.keys()):
            was, now = before.get(key, "not declared"), after.get(key, "not declared")
            if was != now:
                yield f"{key}: {was} -> {now}"

    def _rails(self) -> Iterator[str]:
        before = {self.names.net(rail["net"]): rail for rail in self.old.form["rails"]}
        after = {rail["net"]: rail for rail in self.new.form["rails"]}
        if not self.old.form["crossings"] and not before:
            return
        for net, rail in sorted(after.items()):
            was = before.get(net)
            if was is None:
                yield f"{net}: new rail, {_rail_volts(rail)}"
            elif any(differs(was[key], rail[key], "V") for key in ("low", "nominal", "high")):
                yield f"{net}: {_rail_volts(was)} -> {_rail_volts(rail)}"
        for name, rail in sorted(before.items(), key=lambda item: item[1]["net"]):
            if name not in after:
                yield f"{rail['net']}: no longer a rail, was {_rail_volts(rail)}"

    def _coverage(self) -> Iterator[str]:
        before, after = self.old.form["coverage"], self.new.form["coverage"]
        known = {(self.names.part(pin["part"]), pin["pin"]) for pin in before["not_judged"]}
        fresh = [pin for pin in after["not_judged"] if (pin["part"], pin["pin"]) not in known]
        if fresh:
            yield (
                f"{before['judged']} of {before['signal_pins']} signal pins were judged, now {after['judged']} of "
                f"{after['signal_pins']}; no longer or not yet judged: "
                + _listed([f"{pin['part']}.{pin['pin']} ({pin['why']})" for pin in fresh], 8)
            )


# ---------------------------------------------------------------------------------------------------------- small steps


def crossing_title(row: Mapping[str, Any]) -> str:
    """Name a crossing: ``U1.5 (TX) on +5V -> U2.7 (RX) on +3V3 through R3``."""
    through = f" through {_listed(row['link'])}" if row["link"] else ""
    return f"{_end(row['from'])} -> {_end(row['to'])}{through}"


def _end(end: Mapping[str, Any]) -> str:
    rail = end["rail"] or ""
    if not end["part"]:
        return rail or "a rail"
    name = (end["name"] or "").strip("~{}")
    shown = f"{end['part']}.{end['pin']}" + (f" ({name})" if name and name != end["pin"] else "")
    return shown + (f" on {rail}" if rail else "")


def _places(finding: Mapping[str, Any], names: _Names) -> list[str]:
    """Return all places of a finding as they are called in the new revision, the one it is told at first."""
    if not finding["part"]:
        return [f"net {names.net(finding['net'])}"]
    head = f"{names.part(finding['part'])}" + (f".{finding['pin']}" if finding["pin"] else "")
    return [head, *(names.place(place) for place in finding.get("also", ()))]


def finding_place(finding: Mapping[str, Any]) -> str:
    """Return the narrowest place of a finding in the JSON form."""
    if finding["part"]:
        return f"{finding['part']}.{finding['pin']}" if finding["pin"] else f"{finding['part']}"
    return f"{finding['net'] or 'the board'}"


def _listed(items: Iterable[str], most: int = 6) -> str:
    everything = list(items)
    if not everything:
        return "nothing"
    more = f" and {len(everything) - most} more" if len(everything) > most else ""
    return ", ".join(everything[:most]) + more


def _hidden(row: Mapping[str, Any]) -> bool:
    """Tell whether a row is only the sound first half of a way through a translator."""
    return bool(row.get("first_half")) and row["verdict"] == "sound"


def _kind(before: str, after: str) -> str:
    if before == after:
        return "same"
    if after == "unknown":
        return "unclear"
    if before == "unknown":
        return "better" if after == "sound" else "worse"
    return "worse" if Outcome(after).rank < Outcome(before).rank else "better"


def _rank(change: Change) -> int:
    return Outcome(change.after or change.before or "sound").rank


def _rail_volts(rail: Mapping[str, Any]) -> str:
    if rail["nominal"] is None:
        return "voltage unknown"
    if rail["low"] == rail["high"]:
        return f"{rail['nominal']:g} V"
    return f"{rail['nominal']:g} V ({rail['low']:g} to {rail['high']:g} V)"


def _flat(settings: Settings, names: _Names) -> dict[str, str]:
    """Return every declared figure as text, keyed by what it is about."""
    flat: dict[str, str] = {}
    for net, volts in settings.rails.items():
        flat[f"rail {names.net(net) if names.nets and net in names.nets else net}"] = _spread_text(volts)
    for title, table in (("pin", settings.pins), ("far end", settings.far_ends)):
        for place, setting in table.items():
            flat[f"{title} {names.place(place)}"] = _pin_text(setting)
    for net, rate in settings.rates:
        flat[f"rate of {names.net(net) if names.nets and net in names.nets else net}"] = f"{rate:g} bit/s"
    plain = Settings()
    for key in ("rail_tolerance", "resistor_tolerance", "stray_farads", "thin_margin_volts"):
        if getattr(settings, key) != getattr(plain, key):
            flat[key.replace("_", " ")] = f"{getattr(settings, key):g}"
    for row, digest in settings.parts_rows:
        flat[f"the project's own trade row {row}"] = digest
    if settings.stop_at is not None:
        flat["stop level"] = "never" if settings.stop_at is Outcome.SOUND else settings.stop_at.value
    return flat


def _spread_text(volts: Spread) -> str:
    wide = f" ({volts.low:g} to {volts.high:g} V)" if volts.low != volts.high else ""
    return f"{volts.nominal:g} V{wide}"


def _pin_text(setting: PinSetting) -> str:
    words = []
    for item in fields(PinSetting):
        value = getattr(setting, item.name)
        if item.name == "line" or value is None or value == "":
            continue
        number = f"{value:g}" if isinstance(value, float) else str(value)
        text = _spread_text(value) if isinstance(value, Spread) else number
        words.append(f"{item.name.removesuffix('_volts').replace('_', ' ')} {text}")
    return ", ".join(words) or "nothing"


def empty_form(path: str) -> dict[str, Any]:
    """Return the JSON form of a board that does not exist, for everything to be new."""
    return {
        "form": 1,
        "board": {"path": path, "parts": 0, "nets": 0, "pins": 0},
        "rails": [],
        "crossings": [],
        "findings": [],
        "coverage": {"signal_pins": 0, "judged": 0, "not_judged": []},
    }
