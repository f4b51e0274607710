"""The direction of imports: what the data passes later is never known to what it passes earlier.

``LAYERS`` is the order of ``DEVELOPERS.md`` in a form that can be checked. A new module needs a place in it.
"""

from __future__ import annotations

import ast
import subprocess
import sys
from collections.abc import Iterator
from fnmatch import fnmatchcase
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]
ENGINE = ROOT / "lint" / "levelcrossing"
RULES = ROOT / "rules"

WORDS = ("vocabulary",)
FACTS = (*WORDS, "kinds of parts", "trade data", "settings")
SOLVING = (*WORDS, "numerics", "circuits")

LAYERS: dict[str, tuple[tuple[str, ...], tuple[str, ...]]] = {
    # layer: (its modules, the layers that it may know besides itself), in the order of the data
    "vocabulary": (("levelcrossing", "errors", "model", "model.*", "units", "levels"), ()),
    "kinds of parts": (("pinnames", "partkinds", "diodepins"), WORDS),
    "trade data": (("trade_*", "tradebook"), WORDS),
    "settings": (("declared", "symbolfields", "settings"), WORDS),
    "reading": (("read", "read.*"), WORDS),
    "rails": (("rail_*", "rails"), FACTS),
    "pins": (("pins", "directions"), FACTS),
    "islands": (("islands",), FACTS),
    "crossings": (("crossings", "shifters", "measuring", "switches"), (*FACTS, "pins", "islands")),
    # The numerical core solves circuits and has never heard of boards: of the vocabulary it knows types alone.
    "numerics": (
        ("network", "devices", "elimination", "arrays", "solve", "waveforms", "transient", "bitrate", "decks"),
        WORDS,
    ),
    "circuits": (("corners", "circuits"), (*WORDS, "numerics")),
    "solutions": (
        ("solutions", "offstates", "remedies", "dividers", "breakeven", "speeds", "busrates"),
        (*SOLVING, "kinds of parts"),
    ),
    "judging": (("rulebook", "scope", "likeness", "waivers", "houserows"), (*WORDS, "settings")),
    "review": (
        ("review",),
        (*FACTS, "reading", "rails", "pins", "islands", "crossings", "solutions", "judging"),
    ),
    "comparison": (("figures", "matching", "differences"), (*WORDS, "judging")),
    "reports": (("reports", "reports.*"), (*WORDS, "judging", "comparison")),
    "commands": (
        (
            *(
                "reviewing",
                "railtree",
                "compare",
                "rulelist",
                "settings_draft",
                "waive",
                "sizing",
                "sizing_cells",
                "partinfo",
            ),
            *("roots", "revisions", "deckfiles"),
        ),
        (*SOLVING, *FACTS, "reading", "rails", "solutions", "judging", "review", "comparison", "reports"),
    ),
    "command line": (("cli", "__main__"), (*WORDS, "reports", "commands")),
}

# Outside package: the modules that may import it. The fewer, the easier it is to change.
OUTSIDE = {
    "kiutils": ("read.sheet_files",),
    "networkx": ("islands", "crossings"),
    "rich": ("reports.terminal", "reports.screen"),
    "numpy": (
        *("dividers", "breakeven"),
        *("network", "elimination", "arrays", "solve", "waveforms", "transient", "bitrate"),
        *("corners", "circuits", "solutions", "offstates", "speeds"),
    ),
}
# Part of the standard library: the modules that may import it. No network at all.
CAREFUL = {
    "subprocess": ("revisions",),
    "importlib": ("cli", "rulebook"),
    "tempfile": ("revisions", "waive"),
    "time": (),
    "socket": (),
    "urllib.request": (),
    "http": (),
    "ssl": (),
    "pickle": (),
    "ctypes": (),
}


def name_of(path: Path) -> str:
    """Return a module's name within the package; the package itself is ``levelcrossing``."""
    words = [word for word in path.relative_to(ENGINE).with_suffix("").parts if word != "__init__"]
    return ".".join(words) or "levelcrossing"


TREES = {name_of(path): ast.parse(path.read_text(encoding="utf-8")) for path in sorted(ENGINE.rglob("*.py"))}
RULE_TREES = {path.stem: ast.parse(path.read_text(encoding="utf-8")) for path in sorted(RULES.glob("*.py"))}


def imported(tree: ast.AST) -> Iterator[str]:
    """Yield the full name of everything imported, wherever in the module, also for the type checker alone."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, "imports are written in full"
            assert node.module is not None
            for alias in node.names:
                yield f"{node.module}.{alias.name}"


def own_imports(tree: ast.AST) -> set[str]:
    """Return the modules of the package that a module imports."""
    found = set()
    for name in imported(tree):
        head, _, rest = name.partition(".")
        if head == "levelcrossing":
            # ``from levelcrossing.units import parse`` names a module and something in it, or a module of a package.
            found.add(rest if rest in TREES else rest.rpartition(".")[0] or "levelcrossing")
    return found


def layer_of(module: str) -> str:
    layers = [
        layer for layer, (patterns, _) in LAYERS.items() if any(fnmatchcase(module, pattern) for pattern in patterns)
    ]
    assert len(layers) == 1, f"{module} belongs to {layers or 'no layer'}: give it one place in LAYERS"
    return layers[0]


@pytest.mark.parametrize("module", TREES)
def test_a_module_knows_only_what_comes_before_it(module: str) -> None:
    layer = layer_of(module)
    allowed = {layer, *LAYERS[layer][1]}
    wrong = {f"{other} ({layer_of(other)})" for other in own_imports(TREES[module]) if layer_of(other) not in allowed}
    assert not wrong, f"{module} ({layer}) may not import {', '.join(sorted(wrong))}"


@pytest.mark.parametrize("module", LAYERS["numerics"][0])
def test_the_numerical_core_runs_without_the_vocabulary(module: str) -> None:
    others = own_imports(ast.Module(running(TREES[module]), []))
    assert {layer_of(other) for other in others} <= {"numerics"}


def running(tree: ast.Module) -> list[ast.stmt]:
    """Return a module without what only the type checker reads."""
    return [
        node
        for node in tree.body
        if not (isinstance(node, ast.If) and isinstance(node.test, ast.Name) and node.test.id == "TYPE_CHECKING")
    ]


def test_layers_know_earlier_layers_only() -> None:
    order = list(LAYERS)
    for layer, (_, known) in LAYERS.items():
        assert all(order.index(other) < order.index(layer) for other in known), layer


def test_no_two_modules_import_each_other_in_a_circle() -> None:
    graph = {module: own_imports(tree) - {module} for module, tree in TREES.items()}
    while graph:
        free = {module for module, others in graph.items() if not others & graph.keys()}
        assert free, f"a circle among {sorted(graph)}"
        graph = {module: others for module, others in graph.items() if module not in free}


@pytest.mark.parametrize("package", OUTSIDE)
def test_an_outside_package_is_imported_in_few_places(package: str) -> None:
    users = {module for module, tree in TREES.items() if any(name.split(".")[0] == package for name in imported(tree))}
    assert users <= set(OUTSIDE[package])
    assert users, f"nothing imports {package} any more: drop it from the dependencies"


def test_nothing_else_from_outside_is_imported() -> None:
    known = sys.stdlib_module_names | OUTSIDE.keys() | {"levelcrossing"}
    strange = {
        f"{module}: {name}"
        for module, tree in TREES.items()
        for name in imported(tree)
        if name.split(".")[0] not in known
    }
    assert not strange


@pytest.mark.parametrize("package", CAREFUL)
def test_what_reaches_outside_is_imported_in_known_places_only(package: str) -> None:
    users = {
        module for module, tree in TREES.items() if any(f"{name}.".startswith(f"{package}.") for name in imported(tree))
    }
    assert users <= set(CAREFUL[package])


def test_only_commands_look_at_the_clock() -> None:
    for module, tree in TREES.items():
        asks = any(isinstance(node, ast.Attribute) and node.attr in ("today", "now", "utcnow") for node in calls(tree))
        assert not asks or layer_of(module) == "commands", module


def calls(tree: ast.AST) -> Iterator[ast.expr]:
    """Yield what is called."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Call):
            yield node.func


@pytest.mark.parametrize("module", sorted(TREES.keys() - {"cli"}))
def test_only_the_command_line_prints(module: str) -> None:
    for function in calls(TREES[module]):
        assert not (isinstance(function, ast.Name) and function.id in ("print", "input")), module
    streams = {
        node.attr
        for node in ast.walk(TREES[module])
        if isinstance(node, ast.Attribute) and isinstance(node.value, ast.Name) and node.value.id == "sys"
    }
    assert not streams & {"stdout", "stderr", "stdin", "__stdout__", "__stderr__"}, module


@pytest.mark.parametrize("module", TREES)
def test_text_is_never_run_as_a_program(module: str) -> None:
    names = {function.id for function in calls(TREES[module]) if isinstance(function, ast.Name)}
    assert not names & {"eval", "exec", "compile", "__import__"}


@pytest.mark.parametrize("rule", RULE_TREES)
def test_a_rule_knows_the_vocabulary_only(rule: str) -> None:
    assert own_imports(RULE_TREES[rule]) <= {"model", "units"}
    strange = {
        name.split(".")[0] for name in imported(RULE_TREES[rule]) if not name.startswith("levelcrossing.")
    } - sys.stdlib_module_names
    assert not strange, "a rule needs nothing but the vocabulary and the standard library"


def test_there_are_rules_to_look_at() -> None:
    assert len(RULE_TREES) >= 20


def test_starting_the_program_loads_nothing_heavy() -> None:
    """Numerics, graphs, sheets and drawing are loaded by the command that needs them: ``--help`` answers at once."""
    code = f"import sys; sys.path.insert(0, {str(ROOT / 'lint')!r}); import levelcrossing.cli; print(*sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    loaded = {name.split(".")[0] for name in done.stdout.split()}
    assert "levelcrossing" in loaded
    assert not loaded & OUTSIDE.keys()
