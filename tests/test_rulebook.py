"""Rule files are complete, and a malformed one is refused with its file and line."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

from levelcrossing.errors import RuleFileError
from levelcrossing.rulebook import load_rules, rules_folder

RULES = load_rules()
TESTS = Path(__file__).parent / "rules"
GOOD = '''"""A house rule.

Why: because.

What to do: something.

Speaks when it must.

Stays quiet when it may.
"""

from levelcrossing.model import Outcome

NAME = "house-rule"
OUTCOME = Outcome.MARGINAL
SOURCES = ("the house",)


def check(case):
    """Find nothing."""
    return []
'''


@pytest.mark.parametrize("rule", RULES, ids=lambda rule: rule.name)
def test_every_rule_has_its_text_its_sources_and_its_test(rule) -> None:  # type: ignore[no-untyped-def]
    assert rule.why and rule.remedy and rule.speaks and rule.quiet and rule.sources
    test = TESTS / f"test_{rule.name.replace('-', '_')}.py"
    functions = [
        node.name for node in ast.walk(ast.parse(test.read_text(encoding="utf-8"))) if isinstance(node, ast.FunctionDef)
    ]
    assert len([name for name in functions if name.startswith("test_")]) >= 1


@pytest.mark.parametrize("rule", RULES, ids=lambda rule: rule.name)
def test_a_rule_explains_only_rules_that_exist(rule) -> None:  # type: ignore[no-untyped-def]
    names = {other.name for other in RULES} | {"too-slow"}
    assert set(rule.explains) <= names and rule.name not in rule.explains


def test_rules_import_the_vocabulary_and_units_only() -> None:
    for path in rules_folder().glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.ImportFrom) and (node.module or "").startswith("levelcrossing"):
                assert node.module in ("levelcrossing.model", "levelcrossing.units"), path.name


def test_a_house_rule_is_dropped_in(tmp_path: Path) -> None:
    (tmp_path / "house_rule.py").write_text(GOOD, encoding="utf-8")
    assert "house-rule" in [rule.name for rule in load_rules([tmp_path])]


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (("Why: because.", ""), "no part 'Why:'"),
        (("Stays quiet when it may.", ""), "no part 'Stays quiet when'"),
        (('NAME = "house-rule"', ""), "has no NAME"),
        (('NAME = "house-rule"', 'NAME = "other"'), "does not fit the file's name"),
        (('NAME = "house-rule"', 'NAME = "house-rule"\nx = ('), "is not valid Python"),
        (('SOURCES = ("the house",)', "SOURCES = ()"), "names no authority"),
        (("OUTCOME = Outcome.MARGINAL", 'OUTCOME = "bad"'), "has no OUTCOME"),
        (("def check(case):", "def look(case):"), "has no check"),
    ],
)
def test_a_malformed_rule_is_refused_with_file_and_line(tmp_path: Path, change: tuple[str, str], message: str) -> None:
    path = tmp_path / "house_rule.py"
    path.write_text(GOOD.replace(*change), encoding="utf-8")
    with pytest.raises(RuleFileError) as caught:
        load_rules([tmp_path])
    assert message in caught.value.what and caught.value.file == str(path) and caught.value.line >= 1


def test_two_rules_of_one_name_are_refused(tmp_path: Path) -> None:
    (tmp_path / "sink_current.py").write_text(GOOD.replace("house-rule", "sink-current"), encoding="utf-8")
    with pytest.raises(RuleFileError, match="exists already"):
        load_rules([tmp_path])
