"""Imports run one way, and only the workers load what computes."""

from __future__ import annotations

import os
import subprocess
import sys

import pytest

from conventions.sources import Module, imports, modules

BELOW = {"_version", "contract", "errors", "running", "service"}
BESIDE = {"audit", "differences", "expectations", "sheet_runs", "sheets"}

# what each part may import of the program itself (its own modules always)
INSIDE: dict[str, set[str]] = {
    "__init__": {"_version"},
    "__main__": {"cli"},
    "_version": set(),
    "errors": set(),
    "calculus": set(),
    "plant": {"calculus", "errors"},
    "analysis": {"calculus", "errors", "plant"},
    "contract": {"_version", "errors"},
    "tools": {"_version", "analysis", "calculus", "contract", "errors", "plant"},
    "running": {"_version", "contract", "errors"},
    "service": {"_version", "contract", "errors", "running"},
    "differences": {"contract", "errors"},
    "expectations": {"contract", "errors"},
    "sheets": {"contract", "errors", "running"},
    "sheet_runs": {"contract", "errors", "expectations", "running", "sheets"},
    "audit": {"_version", "contract", "differences", "errors", "running"},
    "cli": BELOW | BESIDE,
}

# what each part may import of others (the standard library always)
OUTSIDE: dict[str, set[str]] = {
    # mpmath comes with sympy
    "calculus": {"flint", "mpmath", "numpy", "sympy"},
    "plant": {"flint", "numpy", "pint", "scipy"},
    "analysis": {"flint", "numpy", "scipy"},
    "contract": {"pydantic", "pydantic_core"},
    "tools": {"flint", "tangentbook_reports"},
    "running": {"pydantic"},
    "service": {"anyio", "mcp", "mcp_types"},
    "audit": {"tangentbook_reports"},
}

# single modules that may do more, with the reason
MORE: dict[str, set[str]] = {
    # the worker's main module is the one place that loads the tools; the parent starts it by name
    "tangentbook.running.worker": {"tangentbook.tools"},
}

NUMERIC = {"flint", "mpmath", "numpy", "pint", "scipy", "sympy"}

ALL = [pytest.param(module, id=module.name) for module in modules()]


def _allowed(module: Module, name: str) -> bool:
    top, _, rest = name.partition(".")
    if top in sys.stdlib_module_names:
        return True
    if any(name == more or name.startswith(more + ".") for more in MORE.get(module.name, ())):
        return True
    if module.name.startswith("tangentbook_reports"):
        return top in ("markdown_it", "tangentbook_reports")
    if top == "tangentbook":
        part = rest.partition(".")[0]
        return part == module.part or part in INSIDE[module.part]
    return top in OUTSIDE.get(module.part, set())


@pytest.mark.parametrize("module", ALL)
def test_a_module_imports_only_what_its_part_may(module: Module) -> None:
    """Every import statement, lazy ones and those for annotations included, is on the list."""
    wrong = [
        f"{name} (line {line})" for name, line in imports(module) if not _allowed(module, name)
    ]
    assert not wrong


def test_the_list_has_no_part_that_is_gone() -> None:
    """Parts on the lists exist, and every part is on them."""
    parts = {m.part for m in modules() if not m.name.startswith("tangentbook_reports")}
    assert set(INSIDE) == parts
    assert set(OUTSIDE) <= parts
    assert set(MORE) <= {m.name for m in modules()}


def test_the_list_says_what_the_design_says() -> None:
    """The directions that matter most, spelled out: a slip in the lists above shows here."""
    protocol = {"mcp", "mcp_types", "pydantic", "pydantic_core"}
    for part in ("calculus", "plant", "analysis"):
        assert not protocol & OUTSIDE[part]
        assert "contract" not in INSIDE[part]
    for part in ("contract", "running", "service", "cli", "sheets", "sheet_runs", "audit"):
        assert not NUMERIC & OUTSIDE.get(part, set())
        assert not {"calculus", "plant", "analysis", "tools"} & INSIDE[part]
    assert [m for m, more in MORE.items() if "tangentbook.tools" in more] == [
        "tangentbook.running.worker"
    ]


def test_no_import_is_made_from_a_name_except_the_tools() -> None:
    """import_module stands only where tools are found through the registry."""
    users = [m.name for m in modules() if "import_module" in m.text or "__import__" in m.text]
    assert users == ["tangentbook.tools.perform"]


def _loaded(statement: str) -> set[str]:
    code = f"import sys; {statement}; print(*sorted(sys.modules))"
    environment = {**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)}
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, env=environment
    )
    return set(done.stdout.split())


@pytest.mark.parametrize(
    "module",
    ["service.stdio", "cli", "sheets", "sheet_runs", "audit", "contract.schemas", "running.worker"],
)
def test_the_parent_process_loads_nothing_numeric(module: str) -> None:
    """Importing server, command line, sheets, audit and the worker's frame stays light."""
    assert not NUMERIC & _loaded(f"import tangentbook.{module}")


def test_the_expression_graph_loads_no_symbolic_library() -> None:
    """The packages calculus and plant do not load sympy or the units library."""
    loaded = _loaded("import tangentbook.calculus, tangentbook.plant")
    assert not {"sympy", "pint", "tangentbook.calculus.symbolic"} & loaded
