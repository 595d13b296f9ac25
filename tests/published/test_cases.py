# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportUnknownLambdaType=false
"""Every published case the program reaches: point, A, B, C, D and eigenvalues, to all digits.

Two roads: the 20-digit values that come with the cases (60-digit arithmetic, see `independent` in
each file) and `published.independent`, which parses the equations itself. The sources stand in the
cases under `source` and in the test ids' case names.
"""

from __future__ import annotations

import math

import mpmath as mp
import pytest

from published import adapter, calling
from published.independent import OwnPlant, spectrum
from published.matching import NOTHING, PRINTED, about, differences, same_spectrum
from tangentbook.errors import TangentbookError

ALL = [
    pytest.param(name, index, id=f"{name}-{adapter.label(name, index) or index}")
    for name in adapter.reachable()
    for index in range(len(adapter.linearizations(name)))
]


def test_every_case_is_reached_or_named_as_later() -> None:
    """Nothing is left out silently: reached and later cases together are all nineteen."""
    assert len(adapter.all_names()) == 19
    assert sorted([*adapter.reachable(), *adapter.LATER]) == adapter.all_names()
    assert len(ALL) == sum(len(adapter.linearizations(n)) for n in adapter.reachable())


@pytest.mark.parametrize("tool", ["trim", "linearize"])
@pytest.mark.parametrize("name", adapter.LATER)
def test_a_later_case_is_refused_with_its_reason(name: str, tool: str) -> None:
    """What is understood but not done is refused by name, never answered wrongly."""
    with pytest.raises(TangentbookError) as refused:
        calling.call(tool, adapter.plant(name), adapter.later_point(name))
    assert refused.value.code == "request.not-available"
    what = {"aircraft-tables-level": "tables", "level-turn": "moving"}[name]
    assert what in refused.value.message
    assert refused.value.where == {"tables": "plant.tables", "moving": "point.moving"}[what]
    assert refused.value.hint


@pytest.mark.parametrize("name", adapter.reachable())
def test_the_plant_is_understood_as_the_case_states_it(name: str) -> None:
    """Roles and the order of states, inputs and outputs are those of the case."""
    case = adapter.read_case(name)
    summary = calling.kept("check-plant", adapter.plant(name))["plant"]
    assert summary["states"] == case["states"]
    assert summary["inputs"] == case["inputs"]
    assert summary["algebraic"] == case.get("algebraic", [])
    assert summary["outputs"] == [text.split("=")[0].strip() for text in case["outputs"]]
    roles = summary["roles"]
    assert all(roles[n] == "state" for n in case["states"] if "'" not in n)
    assert all(roles[n] == "input" for n in case["inputs"])


@pytest.mark.parametrize(("name", "index"), ALL)
def test_point_and_matrices_agree_with_the_sixty_digit_values(name: str, index: int) -> None:
    """Every value of the point and every entry, to the 10 printed digits."""
    published = adapter.linearizations(name)[index]
    entry = adapter.entry(name, index)
    assert entry["outcome"] == "done"
    assert entry["kind"] == "equilibrium"
    for quantity, value in published["point"].items():
        found = entry["values"][quantity]["value"]
        assert found == about(float(value), rel=PRINTED, absolute=NOTHING), quantity
    model = entry["model"]
    assert model["states"] == adapter.read_case(name)["states"]
    for matrix in "ABCD":
        if published[matrix] is None:
            assert all(row == [] for row in model[matrix])
            continue
        # a zero of the case is a zero here, except where the case rounds a parameter to 20 digits
        zero = NOTHING if published["parameters_changed"] else 0.0
        assert not differences(model[matrix], published[matrix], absolute=zero), matrix
    assert model["f0"] == [0] * len(model["states"])


@pytest.mark.parametrize(("name", "index"), ALL)
def test_everything_agrees_with_differences_of_the_equations_read_anew(
    name: str, index: int
) -> None:
    """The second parser, mpmath and differences at 80 digits lead to the same model."""
    published = adapter.linearizations(name)[index]
    entry = adapter.entry(name, index)
    own = OwnPlant(adapter.plant(name), published["parameters_changed"])
    near = {n: v["value"] for n, v in entry["values"].items()}
    model = own.model(near, adapter.held(name))
    for quantity, value in model.values.items():
        found = entry["values"][quantity]["value"]
        assert found == about(float(value), rel=PRINTED, absolute=NOTHING), quantity
    for matrix in "ABCD":
        found = entry["model"][matrix]
        assert not differences(found, getattr(model, matrix), absolute=NOTHING), matrix
    expected = [complex(v) for v in model.eigenvalues]
    assert same_spectrum(calling.eigenvalues(entry), expected)


@pytest.mark.parametrize(("name", "index"), ALL)
def test_eigenvalues_agree_with_those_of_the_published_matrix(name: str, index: int) -> None:
    """Eigenvalues of the 20-digit A at 100 digits, where a double one still has 10 of them."""
    published = adapter.linearizations(name)[index]
    with mp.workdps(100):
        expected = [complex(v) for v in spectrum(published["A"])]
    assert same_spectrum(calling.eigenvalues(adapter.entry(name, index)), expected)


@pytest.mark.parametrize(("name", "index"), ALL)
def test_the_radius_of_every_eigenvalue_covers_the_published_one(name: str, index: int) -> None:
    """A stated radius encloses the truth around the printed value, and is no excuse."""
    published = adapter.linearizations(name)[index]
    with mp.workdps(100):
        own = OwnPlant(adapter.plant(name), published["parameters_changed"])
        entry = adapter.entry(name, index)
        near = {n: v["value"] for n, v in entry["values"].items()}
        truths = own.model(near, adapter.held(name)).eigenvalues
        for found in entry["stability"]["eigenvalues"]:
            printed = mp.mpc(mp.mpf(found["re"]), mp.mpf(found["im"]))
            inside = [t for t in truths if abs(t - printed) <= found["radius"] + mp.mpf("1e-30")]
            assert len(inside) >= found["count"], (found, truths)
            assert found["radius"] <= 2e-9 * max(abs(complex(printed)), 1.0)


@pytest.mark.parametrize(("name", "index"), ALL)
def test_every_check_holds_and_no_verdict_is_given(name: str, index: int) -> None:
    """The check values hold, the answer says what was confirmed, stability is not judged."""
    result = adapter.result(name, index)
    assert result["outcome"] == "done"
    assert all(check["holds"] for check in result["checks"])
    made = {check["code"] for check in result["checks"]}
    assert {"point.residual", "jacobian.second-route", "model.remainder"} <= made
    assert "confirmed" in result["answer"]
    assert "NOT" not in result["answer"]
    assert_no_verdict(result)


def assert_no_verdict(result: calling.JSON) -> None:
    """Nothing in a result claims stability, and no word of approval stands in it."""
    for entry in result["points"]:
        stability = entry.get("stability") or {}
        assert "verdict" not in stability
        assert "linear" not in stability
    texts = " ".join([result["answer"], *(c["text"] for c in result["cautions"])]).lower()
    for word in ("asymptotically", " is stable", " is unstable", "marginal", "safe", "certified"):
        assert word not in texts


@pytest.mark.parametrize("name", adapter.reachable())
def test_gain_at_rest_is_c_times_the_solved_a(name: str) -> None:
    """D - C A^-1 B of the published matrices; none where A is singular, and the reason is given."""
    if not adapter.read_case(name)["inputs"]:
        return
    for index, published in enumerate(adapter.linearizations(name)):
        model = adapter.entry(name, index)["model"]
        with mp.workdps(60):
            A, B, C, D = (mp.matrix([[mp.mpf(v) for v in r] for r in published[m]]) for m in "ABCD")
            if min(abs(v) for v in spectrum(published["A"])) < mp.mpf("1e-15"):
                assert model["dc_gain"] is None
                assert model["dc_gain_note"]
                continue
            gain = D - C * mp.inverse(A) * B
            rows = [[gain[i, j] for j in range(gain.cols)] for i in range(gain.rows)]
        scale = max(abs(float(v)) for row in rows for v in row)
        assert not differences(model["dc_gain"], rows, absolute=1e-15 * scale)
        assert math.isfinite(scale)
