"""Find, validate and run the rule files; make one finding of one cause."""

from __future__ import annotations

import importlib.util
import re
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from types import ModuleType
from typing import TypeVar

from levelcrossing.errors import RuleFileError
from levelcrossing.model import CaseFile, Finding, Outcome, PinModel

T = TypeVar("T")
SECTIONS = ("Why:", "What to do:", "Speaks when", "Stays quiet when")


@dataclass(frozen=True, slots=True, kw_only=True)
class RuleFile:
    """One rule as loaded.

    Parameters
    ----------
    name : str
        As used in reports and waivers.
    title, text : str
        First line of the docstring; the whole docstring.
    why, remedy, speaks, quiet : str
        Its sections.
    outcome : Outcome
        The worst outcome that the rule gives.
    sources : tuple of str
    explains : tuple of str
        Rules whose findings on the same circuit this one's finding stands for.
    check : callable
    covers : callable or None
        ``covers(case, finding, other)``: whether a finding of this rule stands for another, where that depends on more
        than their rules and places.
    path : str
    """

    name: str
    title: str
    text: str
    why: str
    remedy: str
    speaks: str
    quiet: str
    outcome: Outcome
    sources: tuple[str, ...]
    explains: tuple[str, ...]
    check: Callable[[CaseFile], Iterable[Finding]]
    path: str
    covers: Callable[[CaseFile, Finding, Finding], bool] | None = None


def rules_folder() -> Path:
    """Return the folder of the built-in rules: the repository's in a checkout, the package's when installed."""
    here = Path(__file__).resolve().parent
    shipped = here / "rules"
    return shipped if shipped.is_dir() else here.parent.parent / "rules"


def load_rules(folders: Sequence[Path] = ()) -> tuple[RuleFile, ...]:
    """Load the built-in rules and those of house-rules folders.

    Parameters
    ----------
    folders : sequence of Path
        Further folders; a rule there may not have the name of a built-in one.

    Returns
    -------
    tuple of RuleFile
        Sorted by name.

    Raises
    ------
    RuleFileError
        When a file lacks a part that every rule must have, or two rules have one name.
    """
    rules: dict[str, RuleFile] = {}
    for folder in [rules_folder(), *folders]:
        if not folder.is_dir():
            raise RuleFileError("is no folder of rules", file=str(folder), remedy="name a folder that holds rule files")
        for path in sorted(folder.glob("*.py")):
            if path.name.startswith("_"):
                continue
            rule = _load(path)
            if rule.name in rules:
                raise RuleFileError(
                    f"rule {rule.name!r} exists already in {rules[rule.name].path}", file=str(path), line=1
                )
            rules[rule.name] = rule
    return tuple(rules[name] for name in sorted(rules))


def _load(path: Path) -> RuleFile:
    spec = importlib.util.spec_from_file_location(f"levelcrossing_rule_{path.stem}", path)
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    try:
        spec.loader.exec_module(module)
    except SyntaxError as error:
        raise RuleFileError(f"is not valid Python: {error.msg}", file=str(path), line=error.lineno or 0) from error
    text = (module.__doc__ or "").strip()
    if not text:
        raise RuleFileError(
            "has no docstring", file=str(path), line=1, remedy="the docstring is the user's text of the rule"
        )
    for section in SECTIONS:
        if section not in text:
            raise RuleFileError(f"its docstring has no part {section!r}", file=str(path), line=1)
    name = _need(module, "NAME", str, path)
    if name.replace("-", "_") != path.stem:
        raise RuleFileError(f"NAME {name!r} does not fit the file's name", file=str(path), line=_line(path, "NAME"))
    sources = _need(module, "SOURCES", tuple, path)
    if not sources or not all(isinstance(source, str) and source for source in sources):
        raise RuleFileError("SOURCES names no authority", file=str(path), line=_line(path, "SOURCES"))
    check = _need(module, "check", object, path)
    if not callable(check):
        raise RuleFileError("check is no function", file=str(path), line=_line(path, "check"))
    return RuleFile(
        name=name,
        title=text.splitlines()[0].rstrip("."),
        text=text,
        why=_section(text, "Why:"),
        remedy=_section(text, "What to do:"),
        speaks=_section(text, "Speaks when"),
        quiet=_section(text, "Stays quiet when"),
        outcome=_need(module, "OUTCOME", Outcome, path),
        sources=tuple(sources),
        explains=tuple(getattr(module, "EXPLAINS", ())),
        check=check,
        path=str(path),
        covers=getattr(module, "covers", None),
    )


def _need(module: ModuleType, name: str, kind: type[T], path: Path) -> T:
    value = getattr(module, name, None)
    if value is None or not isinstance(value, kind):
        raise RuleFileError(f"has no {name} of type {kind.__name__}", file=str(path), line=1)
    return value


def _line(path: Path, word: str) -> int:
    for number, line in enumerate(path.read_text(encoding="utf-8").splitlines(), 1):
        if re.match(rf"(def )?{word}\b", line):
            return number
    return 1


def _section(text: str, start: str) -> str:
    body = text[text.index(start) + len(start) :]
    ends = [body.index(other) for other in SECTIONS if other != start and other in body]
    return " ".join(body[: min(ends, default=len(body))].split())


def run_rules(rules: Sequence[RuleFile], case: CaseFile) -> tuple[Finding, ...]:
    """Run every rule and keep one finding per cause, worst first.

    Parameters
    ----------
    rules : sequence of RuleFile
    case : CaseFile

    Returns
    -------
    tuple of Finding
    """
    found = [finding for rule in rules for finding in rule.check(case)]
    kept = consolidate(found, rules, case)
    return tuple(sorted(kept, key=finding_order))


def finding_order(finding: Finding) -> tuple[object, ...]:
    """Sort worst first, unconditional before conditional, then by place."""
    from levelcrossing.units import natural_key

    return (
        finding.outcome.rank,
        bool(finding.condition),
        finding.rule,
        natural_key(finding.part),
        natural_key(finding.pin),
        finding.net,
        finding.crossing if finding.crossing is not None else -1,
        finding.text,
    )


def consolidate(found: Sequence[Finding], rules: Sequence[RuleFile], case: CaseFile) -> list[Finding]:
    """Let a finding that explains others stand for them.

    Parameters
    ----------
    found : sequence of Finding
    rules : sequence of RuleFile
    case : CaseFile

    Returns
    -------
    list of Finding
        The explaining finding takes the worst outcome of those it stands for and lists their places in ``also``.
    """
    explains = {rule.name: rule.explains for rule in rules}
    covers = {rule.name: rule.covers for rule in rules if rule.covers is not None}

    def island_of(finding: Finding) -> int | None:
        if finding.crossing is None:
            return None
        return case.crossings[finding.crossing].crossing.island

    def depth(rule: str, seen: frozenset[str] = frozenset()) -> int:
        if rule in seen:
            return 0
        return 1 + max((depth(other, seen | {rule}) for other in explains.get(rule, ())), default=0)

    absorbed: set[int] = set()
    heads = sorted(range(len(found)), key=lambda index: (-depth(found[index].rule), found[index].outcome.rank, index))
    result: list[Finding] = []
    for index in heads:
        if index in absorbed:
            continue
        head = found[index]
        names = explains.get(head.rule, ())
        for other_index, other in enumerate(found):
            if other_index == index or other_index in absorbed:
                continue
            same_circuit = head.crossing is not None and (
                other.crossing == head.crossing
                or (island_of(other) is not None and island_of(other) == island_of(head) and _shares(head, other, case))
            )
            same_rule = other.rule == head.rule and (
                (bool(head.cause) and head.cause == other.cause) or _same_output(head, other, case)
            )
            explained = other.rule in names and (same_circuit or _same_channel(head, other, case))
            if explained and head.rule in covers:
                explained = covers[head.rule](case, head, other)
            if explained or same_rule:
                absorbed.add(other_index)
                head = _merged(head, other)
        result.append(head)
    return result


def _shares(head: Finding, other: Finding, case: CaseFile) -> bool:
    """Two findings speak of one cause when the explaining part stands in the other's circuit, or the pin is the same."""
    if (head.part, head.pin) == (other.part, other.pin):
        return True
    assert other.crossing is not None
    crossing = case.crossings[other.crossing].crossing
    ends = {pin.part for pin in (crossing.driver, crossing.stage_driver, crossing.receiver) if pin is not None}
    return head.part in {*crossing.link, *crossing.shifter.parts, *crossing.through, *ends}


def _same_output(head: Finding, other: Finding, case: CaseFile) -> bool:
    """Two findings at one receiver go back to one output: a translator's, seen alone and with what drives it."""
    if head.crossing is None or other.crossing is None or (head.part, head.pin) != (other.part, other.pin):
        return False
    outputs = [
        case.crossings[index].crossing.stage_driver or case.crossings[index].crossing.driver
        for index in (head.crossing, other.crossing)
    ]
    stages = [case.crossings[index].crossing.stage_driver is not None for index in (head.crossing, other.crossing)]
    return (
        any(stages)
        and not all(stages)
        and outputs[0] is not None
        and outputs[1] is not None
        and (outputs[0].part, outputs[0].number) == (outputs[1].part, outputs[1].number)
    )


def _same_channel(head: Finding, other: Finding, case: CaseFile) -> bool:
    """Two findings meet at one pin, or at two pins of one channel of a translator."""
    pin = case.pins.get((head.part, head.pin))
    if pin is None:
        return False
    sided = [one for one in case.pins_of(head.part) if one.facts is not None and one.facts.side]
    alone = len(sided) == 2  # a translator of one channel need not number it

    def channel(one: PinModel) -> str | None:
        return (
            one.facts.channel or ("the only one" if alone else None) if one.facts is not None and one in sided else None
        )

    for place in (f"{other.part}.{other.pin}", *other.also):
        part, _, number = place.rpartition(".")
        there = case.pins.get((part, number))
        if there is None or part != head.part:
            continue
        if number == head.pin or (channel(pin) is not None and channel(there) == channel(pin)):
            return True
    return False


def _merged(head: Finding, other: Finding) -> Finding:
    outcome = Outcome.worst(head.outcome, other.outcome)
    places = [
        place
        for place in (*head.also, *([f"{other.part}.{other.pin}"] if other.pin else []), *other.also)
        if place != f"{head.part}.{head.pin}"
    ]
    condition = head.condition if head.condition and (other.condition or outcome is head.outcome) else ""
    return replace(
        head,
        outcome=outcome,
        also=tuple(dict.fromkeys(places)),
        condition=condition
        or (other.condition if outcome is other.outcome and head.outcome is not outcome else head.condition),
    )
