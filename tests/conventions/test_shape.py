"""Shape of the sources: length, docstrings, keyword-only defaults, sorted public lists."""

from __future__ import annotations

import ast
import importlib
import re

import pytest

from conventions.sources import PACKAGES, ROOT, Module, modules, public_functions

MAX_LINES = 400
ALL = [pytest.param(module, id=module.name) for module in modules()]

# parameters with a default that may be given by position, with the reason
BY_POSITION: dict[str, str] = {
    "tangentbook.cli.main": "the entry point of the console script is called with none",
    "tangentbook.running.worker.main": "called with none, or with the arguments of a test",
    "tangentbook.calculus.typeset.latex": "latex(graph, node, known) reads as one request",
    "tangentbook.analysis.scaling.equilibrate": "a matrix, like another matrix",
    "tangentbook.tools.numbers.rounded": "rounded(value, 10) reads as it is said",
    "tangentbook.tools.numbers.shown": "shown(value, 6) reads as it is said",
    "tangentbook.tools.numbers.shown_float": "shown_float(value, 6) reads as it is said",
}


@pytest.mark.parametrize("module", ALL)
def test_a_module_stays_short(module: Module) -> None:
    """A module that outgrows 400 lines is two modules."""
    assert len(module.text.splitlines()) <= MAX_LINES


@pytest.mark.parametrize("module", ALL)
def test_what_is_public_says_what_it_is(module: Module) -> None:
    """Modules, public classes and public functions have docstrings."""
    missing = [] if ast.get_docstring(module.tree) else [module.name]
    missing += [
        node.name
        for node in module.tree.body
        if isinstance(node, ast.ClassDef)
        and not node.name.startswith("_")
        and not ast.get_docstring(node)
    ]
    missing += [
        name
        for name, node in public_functions(module)
        if not ast.get_docstring(node) and not name.endswith(".__init__")
    ]
    assert not missing


@pytest.mark.parametrize("module", ALL)
def test_parameters_with_defaults_are_keyword_only(module: Module) -> None:
    """What may be left out is given by name, except where the list above says why not."""
    by_position = [
        name
        for name, node in public_functions(module)
        if node.args.defaults and f"{module.name}.{name}" not in BY_POSITION
    ]
    assert not by_position


def test_the_exceptions_are_needed() -> None:
    """No reason is kept for a function that is gone or follows the rule."""
    found = {
        f"{module.name}.{name}"
        for module in modules()
        for name, node in public_functions(module)
        if node.args.defaults
    }
    assert set(BY_POSITION) <= found
    assert all(BY_POSITION.values())


def _order(name: str) -> tuple[int, str]:
    """Constants, then classes, then the rest, each by alphabet (as the linter sorts them)."""
    return (0 if name.isupper() else 1 if name[:1].isupper() else 2, name)


PUBLIC = [module for module in modules() if "__all__" in module.text]


@pytest.mark.parametrize("module", PUBLIC, ids=[m.name for m in PUBLIC])
def test_public_lists_are_sorted_and_true(module: Module) -> None:
    """__all__ is sorted, without doubles, and names what the module has."""
    loaded = importlib.import_module(module.name)
    names: list[str] = loaded.__all__
    assert names == sorted(set(names), key=_order)
    assert all(hasattr(loaded, name) for name in names)


def test_the_packages_have_public_lists() -> None:
    """The packages that others build on say what is public."""
    listed = {module.name for module in PUBLIC}
    assert {"tangentbook.calculus", "tangentbook.plant", "tangentbook_reports"} <= listed


_SILENCED = re.compile(
    r"# (?P<rule>noqa: [A-Z]+\d+(, [A-Z]+\d+)*|pyright: ignore\[\w+(, \w+)*\])"
    r"(?P<why>\s+(- \S.{2,}|\(\S.{2,}\)|# \S.{2,}))?$"
)


@pytest.mark.parametrize("module", ALL)
def test_every_exception_to_a_rule_has_its_reason(module: Module) -> None:
    """A comment that silences the linter or the type checker names the rule and says why."""
    explained: set[str] = set()
    for line in module.text.splitlines():
        assert "type: ignore" not in line
        said = _SILENCED.search(line)
        assert said or not re.search(r"# noqa|# pyright: ignore", line), line
        if said and said.group("why"):
            explained.add(said.group("rule"))
        # the same exception further down needs no second explanation
        assert not said or said.group("rule") in explained, line


@pytest.mark.parametrize("module", ALL)
def test_nothing_is_left_to_do(module: Module) -> None:
    """No reminders stay in the sources, and no path of anybody's machine."""
    assert not re.search(r"\b(TODO|FIXME|XXX|HACK)\b", module.text)
    assert not re.search(r"/(home|Users|root|work)/", module.text)


def test_only_the_evaluator_compiles() -> None:
    """Exec and compile stand in one module, which makes its own text; eval nowhere."""
    found: dict[str, set[str]] = {}
    for module in modules():
        for node in ast.walk(module.tree):
            called = node.func if isinstance(node, ast.Call) else None
            if isinstance(called, ast.Name) and called.id in ("eval", "exec", "compile"):
                found.setdefault(module.name, set()).add(called.id)
    assert found == {"tangentbook.calculus.evaluate": {"exec", "compile"}}


@pytest.mark.parametrize("package", PACKAGES)
def test_types_are_shipped(package: str) -> None:
    """Both packages carry the marker by which type checkers read their annotations."""
    assert (PACKAGES[package] / "py.typed").exists()


def test_modules_of_tests_have_unique_names() -> None:
    """Test modules are told apart by their file names."""
    names = [path.name for path in (ROOT / "tests").rglob("test_*.py")]
    assert sorted(names) == sorted(set(names))
