"""Brackets: every token stays text, and damage is named with its line."""

import re
from pathlib import Path

import pytest
import sexpdata

from levelcrossing.errors import InputError
from levelcrossing.read.brackets import DEEPEST, MOST_TOKENS, children, read_brackets, text_of

ROOT = Path(__file__).resolve().parents[2]
# Netlists of this project, and those of a collection that may stand beside it.
NETLISTS = sorted(
    [
        *(ROOT / "tests/read/good_input").glob("*.net"),
        *(ROOT / "sample_boards").rglob("*.net"),
        *(ROOT.parent / "shared/boards").glob("*/*.net"),
    ]
)


class _SecondReader(sexpdata.Parser):
    """Keeps every atom as text, and square brackets within it: published netlists name pins ``SIO[2]`` unquoted."""

    def __init__(self, text):
        super().__init__(text, nil=None, true=None)
        self.brackets, self.closing_brackets = {"(": ")"}, {")"}
        self.atom_end = set('()"; \t\r\n')
        self.atom_end_or_escape_re = re.compile(r'[()"; \t\r\n\\]')

    def atom(self, token):
        return token


@pytest.mark.parametrize("path", NETLISTS, ids=lambda path: path.stem)
def test_a_second_reader_sees_the_same_tree(path):
    text = path.read_text(encoding="utf-8")
    assert read_brackets(text, path.name) == _SecondReader(text).parse()[0]


@pytest.mark.parametrize(
    "token",
    [
        "58103E50",
        "01",
        "1e5",
        "nil",
        "t",
        "-1",
        "'1k",
        "D[0]",
        "A;B",
        '5"',
        "a\\b",
        "#PWR01",
        "~{OE}",
        "Tür",
        "|",
        ",",
        "1_000",
        "10\u00a0k",
        "a\x0bb",
        "inf",
    ],
)
def test_an_unquoted_token_stays_as_it_is(token):
    assert read_brackets(f"(export (value {token}))", "x.net") == ["export", ["value", token]]


@pytest.mark.parametrize(
    ("quoted", "text"),
    [
        (r'""', ""),
        (r'"a b"', "a b"),
        (r'"(no bracket)"', "(no bracket)"),
        (r'"say \"open\""', 'say "open"'),
        (r'"back\\slash"', "back\\slash"),
        (r'"two\nlines"', "two\nlines"),
        ('"two\nlines"', "two\nlines"),
        (r'"nil"', "nil"),
        (r'"\\\\n"', "\\\\n"),
    ],
)
def test_a_quoted_text_loses_only_its_escapes(quoted, text):
    assert read_brackets(f"(export (value {quoted}))", "x.net") == ["export", ["value", text]]


def test_line_ends_of_any_kind_and_what_copies_leave_behind():
    assert read_brackets("(export\r\n (a\tb)\r\n)\r\n\0\x1a\n", "x.net") == ["export", ["a", "b"]]


@pytest.mark.parametrize(
    ("text", "line", "what"),
    [
        (
            "(export\n (nets\n  (net (code 1)\n",
            3,
            "is cut off: the bracket '(net (code 1)' of this line is never closed",
        ),
        ("(export\n (a b)))", 2, "closes a bracket that nothing opened"),
        (")", 1, "closes a bracket that nothing opened"),
        ('(export\n (a "b\n c', 2, "ends within a quoted text that begins here"),
        ('(export\n (a "b\\', 2, "ends within a quoted text that begins here"),
        ("(export)\n(export)", 2, "goes on after the bracket that ends the netlist"),
        ("(export)\nrest", 2, "goes on after the bracket that ends the netlist"),
        ("export (a)", 1, "does not start with a bracket"),
        ("(export " + "(" * 100_000, 1, f"nests brackets more than {DEEPEST} deep"),
        ("(export " + "(" * 100_000 + ")" * 100_000 + ")", 1, f"nests brackets more than {DEEPEST} deep"),
    ],
)
def test_damage_is_named_with_its_line(text, line, what):
    with pytest.raises(InputError) as caught:
        read_brackets(text, "x.net")
    assert (caught.value.what, caught.value.line, caught.value.file) == (what, line, "x.net")


def test_the_deepest_nesting_allowed_is_read_and_one_more_is_not():
    def nested(depth):
        return "(" * depth + ")" * depth

    assert read_brackets(nested(DEEPEST), "x.net") is not None
    with pytest.raises(InputError):
        read_brackets(nested(DEEPEST + 1), "x.net")


def test_a_flood_of_brackets_stops_before_memory_does(monkeypatch):
    assert MOST_TOKENS > 4 * 1_473_580  # tokens of the largest real netlist seen
    monkeypatch.setattr("levelcrossing.read.brackets.MOST_TOKENS", 1000)
    with pytest.raises(InputError, match="more than 1,000 words and brackets"):
        read_brackets("(export" + "()" * 1000 + ")", "x.net")


def test_children_are_found_through_idle_brackets():
    tree = read_brackets("(components ((comp (ref A)) (comp (ref B))) (comp (ref C)) word ())", "x.net")
    assert [text_of(comp, "ref") for comp in children(tree, "comp")] == ["A", "B", "C"]
