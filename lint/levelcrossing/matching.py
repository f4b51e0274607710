"""Which part, net and crossing of one revision is which of the other.

References are renumbered, nets renamed, parts swapped; what stays is the circuit. Parts are matched by the identifiers
of their symbols where both files give them, then by likeness of what they are connected to, from wide to narrow, and
last by reference. Nets follow from the pins they join, crossings from the pins they connect.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Hashable, Mapping, Sequence
from typing import TypeVar

from levelcrossing.likeness import board_labels, letters_of
from levelcrossing.model import Board, Part

Row = TypeVar("Row")
_ROUNDS = 5


def match_parts(old: Board, new: Board) -> dict[str, str]:
    """Return for each reference of the old board that of the same part on the new one; without those that are gone."""
    before = {part.reference: part for part in old.parts}
    after = {part.reference: part for part in new.parts}
    found = _by_symbol(before, after)
    old_labels, new_labels = board_labels(old, _ROUNDS), board_labels(new, _ROUNDS)
    for depth in range(_ROUNDS, -1, -1):
        left = _grouped(old_labels[depth], before, set(found))
        right = _grouped(new_labels[depth], after, set(found.values()))
        for label, references in left.items():
            others = right.get(label, [])
            same = [reference for reference in references if reference in others]
            found.update(zip(same, same, strict=True))
            rest = [reference for reference in references if reference not in same]
            free = [reference for reference in others if reference not in same]
            # Equal value alone makes two parts the same only when there is no other choice.
            if depth > 0 or len(rest) == len(free) == 1:
                found.update(zip(rest, free, strict=False))
    taken = set(found.values())
    found.update({name: name for name in before if name not in found and name in after and name not in taken})
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


def _grouped(labels: Mapping[tuple[str, str], str], parts: Mapping[str, Part], taken: set[str]) -> dict[str, list[str]]:
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
