"""The program's sources as syntax trees, for tests of the rules they follow."""

from __future__ import annotations

import ast
import functools
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Iterator

ROOT = Path(__file__).resolve().parents[2]
PACKAGES = {
    "tangentbook": ROOT / "server" / "tangentbook",
    "tangentbook_reports": ROOT / "reports" / "tangentbook_reports",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Module:
    """One module: its dotted name, where it is, its text and its tree."""

    name: str
    path: Path
    text: str
    tree: ast.Module

    @property
    def part(self) -> str:
        """The package ("plant") or top-level module ("cli") it belongs to."""
        return self.name.partition(".")[2].partition(".")[0] or "__init__"


@functools.cache
def modules() -> tuple[Module, ...]:
    """Every module of both packages."""
    return tuple(module for package in PACKAGES for module in _modules(package))


def _modules(package: str) -> Iterator[Module]:
    folder = PACKAGES[package]
    for path in sorted(folder.rglob("*.py")):
        inner = path.relative_to(folder).with_suffix("").parts
        name = ".".join((package, *(part for part in inner if part != "__init__")))
        text = path.read_text("utf-8")
        yield Module(name=name, path=path, text=text, tree=ast.parse(text))


def imports(module: Module) -> Iterator[tuple[str, int]]:
    """The modules named in any import statement, wherever it stands, with its line."""
    for node in ast.walk(module.tree):
        if isinstance(node, ast.Import):
            yield from ((alias.name, node.lineno) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert not node.level, f"{module.name}: relative import"
            source = node.module or ""
            # "from tangentbook import tools" names the package tools
            names = [alias.name for alias in node.names] if source == "tangentbook" else []
            yield from ((f"{source}.{name}", node.lineno) for name in names)
            if not names:
                yield source, node.lineno


def public_functions(
    module: Module,
) -> Iterator[tuple[str, ast.FunctionDef | ast.AsyncFunctionDef]]:
    """Functions and methods that others may call, as "function" or "Class.method"."""
    for node in module.tree.body:
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef):
            if not node.name.startswith("_"):
                yield node.name, node
        elif isinstance(node, ast.ClassDef) and not node.name.startswith("_"):
            for inner in node.body:
                if isinstance(inner, ast.FunctionDef | ast.AsyncFunctionDef) and (
                    not inner.name.startswith("_") or inner.name == "__init__"
                ):
                    yield f"{node.name}.{inner.name}", inner
