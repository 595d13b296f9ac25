"""Stable codes: what is raised is registered, what is registered is used."""

from __future__ import annotations

import ast
import re
from typing import TYPE_CHECKING

import pytest

from conventions.sources import Module, modules
from tangentbook import errors
from tangentbook.contract.codes import CAUTIONS, CHECKS, ERRORS

if TYPE_CHECKING:
    from collections.abc import Iterator

CLASSES = {
    name
    for name, value in vars(errors).items()
    if isinstance(value, type) and issubclass(value, errors.TangentbookError)
}
# an error taken up again with a better place keeps its code
PASSED_ON = re.compile(r"error\.code")


def _raised(module: Module) -> Iterator[tuple[str, str]]:
    """The codes given to the error classes, with their place."""
    for node in ast.walk(module.tree):
        if not (isinstance(node, ast.Call) and node.args):
            continue
        function = node.func
        name = function.attr if isinstance(function, ast.Attribute) else ast.unparse(function)
        if name not in CLASSES:
            continue
        code, place = node.args[0], f"{module.name}:{node.lineno}"
        if isinstance(code, ast.Constant) and isinstance(code.value, str):
            yield code.value, place
        else:
            assert PASSED_ON.fullmatch(ast.unparse(code)), f"{place}: no literal code"


def _texts() -> Iterator[str]:
    """All text literals outside the registers."""
    for module in modules():
        if module.name == "tangentbook.contract.codes":
            continue
        for node in ast.walk(module.tree):
            if isinstance(node, ast.Constant) and isinstance(node.value, str):
                yield node.value


def test_every_error_code_raised_is_registered() -> None:
    """No error carries a code that the register does not explain."""
    unknown = {(c, place) for m in modules() for c, place in _raised(m) if c not in ERRORS}
    assert not unknown


def test_every_registered_error_code_is_raised() -> None:
    """The register explains nothing that cannot happen."""
    raised = {code for module in modules() for code, _ in _raised(module)}
    assert not set(ERRORS) - raised


@pytest.mark.parametrize("register", [CHECKS, CAUTIONS], ids=["checks", "cautions"])
def test_every_check_and_caution_is_used(register: dict[str, str]) -> None:
    """Each registered check and caution stands in the sources as a literal."""
    assert not set(register) - set(_texts())


FORMS = {
    "errors": (ERRORS, r"[a-z]+\.[a-z]+(-[a-z]+)*"),
    "checks": (CHECKS, r"[a-z]+\.[a-z]+(-[a-z]+)*"),
    "cautions": (CAUTIONS, r"[a-z]+(-[a-z]+)*"),
}


@pytest.mark.parametrize("name", FORMS)
def test_codes_have_one_form_and_an_explanation(name: str) -> None:
    """Codes are lower-case words; each has a line that says what it means."""
    register, form = FORMS[name]
    for code, meaning in register.items():
        assert re.fullmatch(form, code), code
        assert meaning
        assert len(meaning) < 100
        assert meaning == meaning.strip(" .")


def test_every_error_class_is_in_the_tree_of_the_module() -> None:
    """The drawing at the head of the errors' module shows every class."""
    assert errors.__doc__ is not None
    assert all(name in errors.__doc__ for name in CLASSES)
