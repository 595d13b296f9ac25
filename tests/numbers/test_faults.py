# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportUnknownLambdaType=false
"""Faults put into the program: each check value must fail on the fault it is there for.

A check that cannot fail says nothing. Every test breaks one thing (an entry, a derivative rule, an
eigenvalue, the point, a unit) by as little as matters, runs the same call as everybody, and demands
a failed check, its caution, and an answer that no longer claims to be confirmed.
"""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING, Any

import pytest
from flint import acb, arb, fmpq

from published.calling import JSON, call, check, codes, kept
from tangentbook.contract.codes import CHECKS
from tangentbook.contract.plant import BRIDGE
from tangentbook.tools.scales import Scales

if TYPE_CHECKING:
    from collections.abc import Callable

# by name: the packages re-export functions that are called as their modules are
linearize = importlib.import_module("tangentbook.analysis.linearize")
linear = importlib.import_module("tangentbook.analysis.linear")
spectrum = importlib.import_module("tangentbook.analysis.spectrum")
refine = importlib.import_module("tangentbook.analysis.refine")
trim = importlib.import_module("tangentbook.analysis.trim")
derive = importlib.import_module("tangentbook.calculus.derive")

FAULT = arb("1.0001")
"""Wrong by 1e-4: the size of a slip that a reader would not notice."""

PLANT: JSON = {
    "name": "everything",
    "time": "1",
    "equations": [
        "2*x'' + sin(x)*x' + exp(x)*z = u",
        "z' = (x - z*w)/(1 + z^2)",
        "0 = w^3 + w - x - u/2",
    ],
    "algebraic": ["w"],
    "inputs": ["u"],
    "outputs": {"power": "x*u + w^2", "z": "z"},
}
POINT: JSON = {"hold": {"u": "0.7"}, "guess": {"x": 0.2, "z": 0.5, "w": 0.4}}
AT_60: JSON = {"hold": {"theta": "60 deg"}}

ROUTES = ("jacobian.second-route", "model.remainder")


def entries() -> list[tuple[str, str]]:
    """Every nonzero entry of A, B, C, D that is computed, as (row, column)."""
    model = kept("linearize", PLANT, POINT)["points"][0]["model"]
    found: list[tuple[str, str]] = []
    for matrix, rows, columns in (
        ("A", model["states"], model["states"]),
        ("B", model["states"], model["inputs"]),
        ("C", model["outputs"], model["states"]),
        ("D", model["outputs"], model["inputs"]),
    ):
        for i, row in enumerate(rows):
            for j, column in enumerate(columns):
                if model[matrix][i][j] and (row, column) != ("x", "x'"):
                    found.append((matrix + " " + row, column))
    return found


def broken_entry(
    monkeypatch: pytest.MonkeyPatch, row: str, column: str, change: Callable[[arb], arb | None]
) -> None:
    """Put a fault into one entry of the assembled model."""
    assemble = linear.linear_model
    kind, name = row.split(" ")

    def wrong(*arguments: Any) -> Any:  # noqa: ANN401 - as the program passes them
        model = assemble(*arguments)
        rows = model.rates if kind in "AB" else model.output_rows
        value = change(rows[name][column])
        if value is None:
            del rows[name][column]
        else:
            rows[name][column] = value
        return model

    monkeypatch.setattr(linearize, "linear_model", wrong)


def assert_unconfirmed(result: JSON, *failed: str) -> None:
    """These checks fail, the caution says so, and the answer does not claim confirmation."""
    for code in failed:
        assert not check(result, code)["holds"], code
    assert "check-failed" in codes(result)
    assert "every entry confirmed" not in result["answer"]
    assert "NOT" in result["answer"]


def test_without_a_fault_every_check_is_made_and_holds() -> None:
    """The plant of these tests is a fair one: all checks are made on it."""
    result = kept("linearize", PLANT, POINT)
    made = {c["code"] for c in result["checks"]}
    assert made == set(CHECKS) - {"printed.bound"}
    assert all(c["holds"] for c in result["checks"])
    assert "every entry confirmed" in result["answer"]
    assert len(entries()) >= 10


@pytest.mark.parametrize(("row", "column"), entries(), ids="/".join)
def test_an_entry_wrong_by_one_in_ten_thousand_shows(
    monkeypatch: pytest.MonkeyPatch, row: str, column: str
) -> None:
    """Every entry of A, B, C, D in turn, by both independent routes."""
    broken_entry(monkeypatch, row, column, lambda v: v * FAULT)
    result = call("linearize", PLANT, POINT)
    assert_unconfirmed(result, *ROUTES)
    for code in ROUTES:
        assert 1e-5 < check(result, code)["value"] <= 1e-3
        assert column in check(result, code)["what"]


@pytest.mark.parametrize(("row", "column"), entries(), ids="/".join)
def test_a_dropped_entry_shows(monkeypatch: pytest.MonkeyPatch, row: str, column: str) -> None:
    """An entry that is missing altogether."""
    broken_entry(monkeypatch, row, column, lambda _: None)
    assert_unconfirmed(call("linearize", PLANT, POINT), *ROUTES)


@pytest.mark.parametrize(("row", "column"), [("A x'", "z"), ("B z", "u"), ("D power", "u")])
def test_a_wrong_sign_shows(monkeypatch: pytest.MonkeyPatch, row: str, column: str) -> None:
    """The slip of pencil and paper."""
    broken_entry(monkeypatch, row, column, lambda v: -v)
    assert_unconfirmed(call("linearize", PLANT, POINT), *ROUTES)


def test_a_wrong_row_of_a_rate_that_is_a_state_shows(monkeypatch: pytest.MonkeyPatch) -> None:
    """The entry 1 of a state whose rate is the next state."""
    broken_entry(monkeypatch, "A x", "x'", lambda v: v * FAULT)
    assert_unconfirmed(call("linearize", PLANT, POINT), "jacobian.second-route")


def test_a_wrong_unit_of_a_column_shows(monkeypatch: pytest.MonkeyPatch) -> None:
    """A size of a unit that is wrong by 1e-4 makes a row and a column wrong."""
    per = Scales.per
    monkeypatch.setattr(
        Scales, "per", lambda self, name: per(self, name) * (FAULT if name == "M" else 1)
    )
    result = call("linearize", BRIDGE, AT_60)
    assert result["points"][0]["model"]["A"][1][2] != 4.166666667e-06
    assert_unconfirmed(result, "printed.units")


def _scaled(rule: Callable[[Any, int, int], int]) -> Callable[[Any, int, int], int]:
    factor = fmpq(10001, 10000)
    return lambda graph, node, argument: graph.mul(graph.const(factor), rule(graph, node, argument))


@pytest.mark.parametrize(
    ("rule", "output"),
    [(name, f"{name}(x/4 + 1/3)") for name in sorted(derive._LOCAL) if name not in ("abs", "sign")],
)
def test_a_wrong_derivative_rule_shows(
    monkeypatch: pytest.MonkeyPatch, rule: str, output: str
) -> None:
    """Every rule of differentiation wrong by 1e-4: three roads disagree with it."""
    monkeypatch.setitem(derive._LOCAL, rule, _scaled(derive._LOCAL[rule]))
    plant: JSON = {
        "name": "rule",
        "time": "1",
        "equations": ["x' = u - x"],
        "inputs": ["u"],
        "outputs": {"y": output},
    }
    result = call("linearize", plant, {"hold": {"x": "1/5"}})
    assert_unconfirmed(result, *ROUTES, "jacobian.symbolic")


@pytest.mark.parametrize("rule", ["mul", "div", "pow", "atan2"])
@pytest.mark.parametrize("side", [0, 1])
def test_a_wrong_rule_of_two_places_shows(
    monkeypatch: pytest.MonkeyPatch, rule: str, side: int
) -> None:
    """Products, quotients, powers and angles, each of the two partial derivatives."""
    right = derive._PARTIALS[rule]

    def wrong(graph: Any, *arguments: Any) -> tuple[int, int]:  # noqa: ANN401 - as passed
        pair = [*right(graph, *arguments)]
        pair[side] = graph.mul(graph.const(fmpq(10001, 10000)), pair[side])
        return pair[0], pair[1]

    monkeypatch.setitem(derive._PARTIALS, rule, wrong)
    text = {"mul": "sin(x)*exp(u)", "div": "sin(x)/exp(u)", "pow": "(2 + x)^(u/3)"}
    plant: JSON = {
        "name": "rule",
        "time": "1",
        "equations": ["x' = u - x"],
        "inputs": ["u"],
        "outputs": {"y": text.get(rule, "atan2(sin(x), exp(u))")},
    }
    result = call("linearize", plant, {"hold": {"x": "1/5"}})
    assert_unconfirmed(result, *ROUTES, "jacobian.symbolic")


def test_a_wrong_derivative_value_shows_in_every_route(monkeypatch: pytest.MonkeyPatch) -> None:
    """Each derivative node's value in turn, wrong by 1e-4."""
    evaluate = linear.Partials.evaluate
    count = 0

    def wrong(place: int) -> Callable[..., dict[int, arb]]:
        def changed(self: Any, values: Any) -> dict[int, arb]:  # noqa: ANN401 - as passed
            nonlocal count
            at = evaluate(self, values)
            count = len(self.nodes)
            node = self.nodes[place % count]
            at[node] = at[node] * FAULT
            return at

        return changed

    place = 0
    while place == 0 or place < count:
        monkeypatch.setattr(linear.Partials, "evaluate", wrong(place))
        result = call("linearize", BRIDGE, AT_60)
        assert_unconfirmed(result, *ROUTES, "jacobian.symbolic")
        place += 1
    assert place >= 6


def test_an_entry_of_unknown_size_printed_as_zero_shows(monkeypatch: pytest.MonkeyPatch) -> None:
    """An entry known only to +-1e-6 would be printed as 0: its bound is beyond the limit."""
    broken_entry(monkeypatch, "A x'", "z", lambda v: v * arb(0, "1e-6"))
    result = call("linearize", PLANT, POINT)
    assert result["points"][0]["model"]["A"][1][2] == 0
    assert_unconfirmed(result, "printed.bound")


# --- eigenvalues


class _WrongMatrix:
    """A matrix whose eigenvalue solver errs by 1e-6 in the first eigenvalue."""

    right = spectrum.acb_mat

    def __init__(self, matrix: object) -> None:
        self.matrix = self.right(matrix)

    def eig(self, **options: object) -> list[acb]:
        """The eigenvalues, the first one wrong."""
        values = self.matrix.eig(**options)
        return [values[0] * arb("1.000001"), *values[1:]]


def test_a_wrong_eigenvalue_shows(monkeypatch: pytest.MonkeyPatch) -> None:
    """The characteristic polynomial does not agree, and the check fails."""
    monkeypatch.setattr(spectrum, "acb_mat", _WrongMatrix)
    result = call("linearize", BRIDGE, AT_60)
    assert not check(result, "eigenvalues.second-route")["holds"]
    assert "check-failed" in codes(result)


def test_a_wrong_eigenvalue_stands_in_the_answer(monkeypatch: pytest.MonkeyPatch) -> None:
    """A failed check belongs in the answer, not only among the cautions."""
    monkeypatch.setattr(spectrum, "acb_mat", _WrongMatrix)
    assert_unconfirmed(call("linearize", BRIDGE, AT_60), "eigenvalues.second-route")


def test_a_wrong_eigenvalue_of_a_large_block_shows(monkeypatch: pytest.MonkeyPatch) -> None:
    """Two runs in double precision that disagree by 1e-6 are no confirmation."""
    right = spectrum.eigvals
    calls: list[int] = []

    def wrong(matrix: Any) -> Any:  # noqa: ANN401 - as passed
        calls.append(1)
        values = right(matrix)
        values[0] *= 1 + (1e-6 if len(calls) % 2 else 0)
        return values

    monkeypatch.setattr(spectrum, "eigvals", wrong)
    n = 30
    equations = [
        f"c{k}' = c{k % n + 1} - 3*c{k} + c{(k - 2) % n + 1} - c{k}^3" for k in range(1, n + 1)
    ]
    plant: JSON = {"name": "ring", "time": "1", "equations": equations, "outputs": {"y": "c1"}}
    result = call("linearize", plant, {"hold": {f"c{k}": 0 for k in range(1, n + 1)}})
    assert calls
    assert not check(result, "eigenvalues.second-route")["holds"]
    assert "check-failed" in codes(result)


# --- the point


def shifted(monkeypatch: pytest.MonkeyPatch, factor: str) -> None:
    """Move every refined value of the point, after it was judged; not those of the other route."""
    values = trim._values

    def wrong(search: Any, free: Any) -> Any:  # noqa: ANN401 - as passed
        return values(search, [v * arb(factor) if float(v.rad()) > 0 else v for v in free])

    monkeypatch.setattr(trim, "_values", wrong)


def test_a_refinement_to_a_wrong_value_is_no_point(monkeypatch: pytest.MonkeyPatch) -> None:
    """A value that does not meet its conditions is not given out at all."""
    ball = refine._ball
    monkeypatch.setattr(refine, "_ball", lambda value, *rest: ball(value * arb("1.000001"), *rest))
    assert call("trim", BRIDGE, AT_60)["outcome"] == "no-point"


@pytest.mark.parametrize("factor", ["1.000001", "1.00001"])
def test_a_model_at_a_point_that_is_off_shows(monkeypatch: pytest.MonkeyPatch, factor: str) -> None:
    """A point wrong by 1e-6 leaves rates that the linear model does not have."""
    shifted(monkeypatch, factor)
    assert_unconfirmed(call("linearize", BRIDGE, AT_60), "model.remainder")


def test_a_point_off_by_1e_minus_5_shows(monkeypatch: pytest.MonkeyPatch) -> None:
    """The double-precision iteration is the other route to the point."""
    shifted(monkeypatch, "1.00001")
    result = call("trim", BRIDGE, AT_60)
    assert not check(result, "point.second-route")["holds"]
    assert "check-failed" in codes(result)


def test_a_point_off_by_1e_minus_6_shows_in_trim(monkeypatch: pytest.MonkeyPatch) -> None:
    """9100.01 N m instead of 9100 N m: six digits are printed, so a wrong sixth must show."""
    shifted(monkeypatch, "1.000001")
    result = call("trim", BRIDGE, AT_60)
    assert not all(c["holds"] for c in result["checks"])


def test_a_point_that_two_routes_dispute_is_not_called_computed_twice(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """A failed check belongs in the answer."""
    shifted(monkeypatch, "1.00001")
    assert "computed twice" not in call("trim", BRIDGE, AT_60)["answer"]


def test_an_iterate_that_does_not_solve_the_equations_is_no_point(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """A refinement that goes astray ends without a point, not with a wrong one."""
    correction = refine._correction
    nudge = arb("1e-6")
    monkeypatch.setattr(
        refine,
        "_correction",
        lambda *arguments: [step + nudge for step in correction(*arguments)],
    )
    result = call("trim", BRIDGE, AT_60)
    assert result["outcome"] == "no-point" or not all(c["holds"] for c in result["checks"])
