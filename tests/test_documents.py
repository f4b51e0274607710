"""What the documents show works: examples of rules, rows and settings are loaded, links lead somewhere."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from levelcrossing import tradebook
from levelcrossing.rulebook import load_rules
from levelcrossing.settings import TOP_KEYS, parse_settings

ROOT = Path(__file__).resolve().parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")


def blocks(text: str, language: str) -> list[str]:
    """Return the code blocks of a language."""
    return re.findall(rf"^```{language}\n(.*?)^```$", text, re.MULTILINE | re.DOTALL)


def anchors(text: str) -> set[str]:
    """Return the anchors that headings get."""
    heads = re.findall(r"^#+ (.+)$", re.sub(r"^```.*?^```$", "", text, flags=re.MULTILINE | re.DOTALL), re.MULTILINE)
    return {re.sub(r"[^\w\- ]", "", head.lower()).replace(" ", "-") for head in heads}


def test_the_example_of_a_rule_is_a_rule(tmp_path: Path) -> None:
    (example,) = blocks(DEVELOPERS, "python")
    (tmp_path / "shifter_size.py").write_text(example, encoding="utf-8")
    assert "shifter-size" in [rule.name for rule in load_rules([tmp_path])]


def test_the_example_of_a_row_is_a_row(tmp_path: Path) -> None:
    (example,) = blocks(DEVELOPERS, "toml")
    house = tmp_path / "house.toml"
    house.write_text(example, encoding="utf-8")
    book = tradebook.load(extra=[house])
    assert "tide sounder TS2" in [row.id for row in book.table("part")]


def test_every_table_of_trade_data_is_described() -> None:
    shipped = {row.table for row in tradebook.load().rows}
    assert not [table for table in sorted(shipped) if f"`{table}`" not in DEVELOPERS]


def test_every_engine_module_has_its_step() -> None:
    engine = ROOT / "lint" / "levelcrossing"
    names = {path.stem for path in engine.glob("*.py")} - {"__init__"}
    told = set(re.findall(r"`(\w+)`", DEVELOPERS))
    assert not {name for name in names - told if not name.startswith("trade_")}


def test_settings_in_the_readme_are_settings_and_show_every_table() -> None:
    examples = blocks(README, "toml")
    assert examples
    for example in examples:
        parse_settings(example)
    assert not [key for key in TOP_KEYS if not re.search(rf"^\[*{key}\b", "\n".join(examples), re.MULTILINE)]


@pytest.mark.parametrize("text", [README, DEVELOPERS], ids=["README", "DEVELOPERS"])
def test_links_within_the_documents_lead_somewhere(text: str) -> None:
    for target in re.findall(r"\]\(([^)]+)\)", text):
        if target.startswith("#"):
            assert target[1:] in anchors(text), target
        elif "://" not in target:
            assert (ROOT / target.split("#")[0]).exists(), target
