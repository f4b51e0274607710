"""The command ``rules``: lists the rules, or shows the text of one."""

from __future__ import annotations

import argparse
import difflib
from pathlib import Path

from levelcrossing.errors import CommandError
from levelcrossing.reports.clean import terminal
from levelcrossing.rulebook import RuleFile, load_rules


def run(args: argparse.Namespace) -> tuple[str, int]:
    """Return the text of the command and its exit status."""
    rules = load_rules([Path(folder) for folder in args.rules])
    if args.name is None:
        return listing(rules), 0
    for rule in rules:
        if rule.name == args.name:
            return explanation(rule), 0
    close = difflib.get_close_matches(args.name, [rule.name for rule in rules], n=1, cutoff=0.4)
    raise CommandError(
        f"there is no rule {terminal(args.name)!r}",
        remedy=f"did you mean {close[0]}?" if close else "`levelcrossing rules` lists them",
    )


def listing(rules: tuple[RuleFile, ...]) -> str:
    """Return one line per rule: name, worst outcome, title."""
    width = max((len(rule.name) for rule in rules), default=0)
    ordered = sorted(rules, key=lambda rule: (rule.outcome.rank, rule.name))
    lines = [f"{rule.name.ljust(width)}  {rule.outcome.value:<11}  {rule.title}" for rule in ordered]
    return "\n".join(
        [
            *lines,
            "",
            f"{len(rules)} rules; the outcome is the worst one each can give.",
            "`levelcrossing rules NAME` explains one.",
            "",
        ]
    )


def explanation(rule: RuleFile) -> str:
    """Return the whole text of a rule with its authority."""
    return "\n".join(
        [
            f"{rule.name}  (up to {rule.outcome.value})",
            "",
            rule.text,
            "",
            "Sources:",
            *(f"  - {source}" for source in rule.sources),
            "",
        ]
    )
