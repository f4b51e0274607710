"""Which part, net and crossing of one revision is which of the other.

References are renumbered, nets renamed, parts swapped; what stays is the circuit. Parts are matched by the identifiers
of their symbols where both files give them, then by likeness of what they are connected to, from wide to narrow, and
last by reference. Nets follow from the pins they join, crossings from the pins they connect.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Container, Hashable, Mapping, Sequence
from typing import TypeVar

from levelcrossing.likeness import board_labels, letters_of, pin_label
from levelcrossing.model import Board, Part

Row = TypeVar("Row")
_ROUNDS = 5


def match_parts(old: Board, new: Board) -> dict[str, str]:
    """Return for each reference of the old board that of the same part on the new one; without those that are gone."""
    return _Matcher(old, new).parts()


class _Matcher:
    """Matches parts from what is certain to what is likely; each pair found settles its neighbours first.

    Equal circuits (the channels of a buffer) are all alike: whichever pair is chosen first, its neighbours must follow
    it, or a part of one channel would be paired with one of another.
    """

    def __init__(self, old: Board, new: Board) -> None:
        self._before = {part.reference: part for part in old.parts}
        self._after = {part.reference: part for part in new.parts}
        self._on_old, self._on_new = _parts_by_net(old), _parts_by_net(new)
        self._old_labels, self._new_labels = board_labels(old, _ROUNDS), board_labels(new, _ROUNDS)
        self._depth = _ROUNDS
        self._found: dict[str, str] = {}
        self._taken: set[str] = set()
        self._nets: dict[str, str] = {}
        self._taken_nets: set[str] = set()
        self._waiting: list[tuple[str, str, str]] = []

    def parts(self) -> dict[str, str]:
        """Return the pairs."""
        for one, other in _by_symbol(self._before, self._after).items():
            self._pair(one, other)
        for self._depth in range(_ROUNDS, -1, -1):
            self._settle()
            groups = [(left, right) for left, right in self._groups() if left and right]
            for left, right in sorted(groups, key=lambda group: len(group[0]) * len(group[1])):
                self._pair_group(left, right)
        for name in self._before:
            if name not in self._found and name in self._after and name not in self._taken:
                self._pair(name, name)
        return self._found

    def _groups(self) -> list[tuple[list[str], list[str]]]:
        left = _grouped(self._old_labels[self._depth], self._before, self._found)
        right = _grouped(self._new_labels[self._depth], self._after, self._taken)
        return [(references, right.get(label, [])) for label, references in left.items()]

    def _pair_group(self, left: list[str], right: list[str]) -> None:
        """Pair parts that are alike as far as one looks: first those that kept their reference."""
        for name in left:
            if name in right and name not in self._found and name not in self._taken:
                self._pair(name, name)
                self._settle()
        rest = [name for name in left if name not in self._found]
        free = [name for name in right if name not in self._taken]
        # Equal value alone makes two parts the same only when there is no other choice.
        if self._depth == 0 and not len(rest) == len(free) == 1:
            return
        for name in rest:
            other = next((name for name in free if name not in self._taken), None)
            if other is not None and name not in self._found:
                self._pair(name, other)
                self._settle()

    def _pair(self, one: str, other: str) -> None:
        if one not in self._found and other not in self._taken:
            self._found[one] = other
            self._taken.add(other)
            self._waiting.append(("part", one, other))

    def _pair_nets(self, one: str, other: str) -> None:
        depth = max(self._depth, 1)
        alike = self._old_labels[depth].get(("net", one)) == self._new_labels[depth].get(("net", other))
        if alike and one not in self._nets and other not in self._taken_nets:
            self._nets[one] = other
            self._taken_nets.add(other)
            self._waiting.append(("net", one, other))

    def _settle(self) -> None:
        while self._waiting:
            kind, one, other = self._waiting.pop()
            if kind == "part":
                self._settle_part(self._before[one], self._after[other])
            else:
                self._settle_net(one, other)

    def _settle_part(self, one: Part, other: Part) -> None:
        if pin_label(one, "1"):
            nets = {pin.number: pin.net for pin in other.pins if pin.net}
            for pin in one.pins:
                if pin.net and pin.number in nets:
                    self._pair_nets(pin.net, nets[pin.number])
            return
        left = [pin.net for pin in one.pins if pin.net not in self._nets]
        right = [pin.net for pin in other.pins if pin.net not in self._taken_nets]
        if len(left) == len(right) == 1 and left[0] and right[0]:
            self._pair_nets(left[0], right[0])

    def _settle_net(self, one: str, other: str) -> None:
        left = self._neighbours(self._on_old.get(one, ()), self._old_labels[self._depth], self._found)
        right = self._neighbours(self._on_new.get(other, ()), self._new_labels[self._depth], self._taken)
        for key, references in left.items():
            others = right.get(key, [])
            if len(references) == len(others) == 1:
                self._pair(references[0], others[0])
        for part, _ in self._on_old.get(one, ()):
            if part.reference in self._found and not pin_label(part, "1"):
                self._settle_part(part, self._after[self._found[part.reference]])

    @staticmethod
    def _neighbours(
        pins: Sequence[tuple[Part, str]], labels: Mapping[tuple[str, str], str], taken: Container[str]
    ) -> dict[tuple[str, str], list[str]]:
        found: dict[tuple[str, str], list[str]] = {}
        for part, number in pins:
            label = labels.get(("part", part.reference))
            if label is not None and part.reference not in taken:
                found.setdefault((pin_label(part, number), label), []).append(part.reference)
        return found


def _parts_by_net(board: Board) -> dict[str, list[tuple[Part, str]]]:
    found: dict[str, list[tuple[Part, str]]] = {}
    for part in board.parts:
        for pin in part.pins:
            if pin.net:
                found.setdefault(pin.net, []).append((part, pin.number))
    return found


def _by_symbol(before: Mapping[str, Part], after: Mapping[str, Part]) -> dict[str, str]:
    """Match parts whose symbols' identifiers and sheet are the same, where these single out one part on each side."""

    def keyed(parts: Mapping[str, Part]) -> dict[Hashable, str]:
        keys = {name: (frozenset(part.uuids), part.sheet) for name, part in parts.items() if part.uuids}
        counts = Counter(keys.values())
        return {key: name for name, key in keys.items() if counts[key] == 1}

    left, right = keyed(before), keyed(after)
    pairs = {left[key]: right[key] for key in left if key in right}
    return {old: new for old, new in pairs.items() if letters_of(old) == letters_of(new)}


def _grouped(
    labels: Mapping[tuple[str, str], str], parts: Mapping[str, Part], taken: Container[str]
) -> dict[str, list[str]]:
    groups: dict[str, list[str]] = {}
    for reference in parts:  # in the order of the board, which is that of the numbers
        label = labels.get(("part", reference))
        if label is not None and reference not in taken:
            groups.setdefault(label, []).append(reference)
    return groups


def match_nets(old: Board, new: Board, parts: Mapping[str, str]) -> dict[str, str]:
    """Return for each net of the old board that net of the new one which shares most of its pins."""
    net_of = {pin: net.name for net in new.nets for pin in net.pins}
    names = {net.name for net in new.nets}
    found: dict[str, str] = {}
    for net in old.nets:
        votes = Counter(
            net_of[parts[part], number] for part, number in net.pins if (parts.get(part, ""), number) in net_of
        )
        if votes:
            found[net.name] = min(votes, key=lambda name: (-votes[name], name != net.name, name))
        elif net.name in names:
            found[net.name] = net.name
    return found


def match_rows(
    old: Sequence[Row],
    new: Sequence[Row],
    passes: Sequence[tuple[Callable[[Row], Hashable | None], Callable[[Row], Hashable | None], bool]],
) -> list[tuple[int, int]]:
    """Pair rows of two tables by keys, from the strictest to the loosest.

    Parameters
    ----------
    old, new : sequence
    passes : sequence of (key of an old row, key of a new row, alone)
        A key of None never matches. With ``alone`` a key must single out one row on each side.

    Returns
    -------
    list of (int, int)
        Indices of the pairs, sorted.
    """
    pairs: list[tuple[int, int]] = []
    left, right = set(range(len(old))), set(range(len(new)))
    for key_of_old, key_of_new, alone in passes:
        before: dict[Hashable, list[int]] = {}
        after: dict[Hashable, list[int]] = {}
        for index in sorted(left):
            before.setdefault(key_of_old(old[index]), []).append(index)
        for index in sorted(right):
            after.setdefault(key_of_new(new[index]), []).append(index)
        for key, rows in before.items():
            others = after.get(key, [])
            if key is None or not others or (alone and not len(rows) == len(others) == 1):
                continue
            for one, other in zip(rows, others, strict=False):
                pairs.append((one, other))
                left.discard(one)
                right.discard(other)
    return sorted(pairs)
