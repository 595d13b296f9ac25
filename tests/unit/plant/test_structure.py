"""Which equation serves which unknown, and what is said where none or too many do."""

from __future__ import annotations

import pytest

from tangentbook.calculus import plain_text
from unit.plant.plants import Parts, plant, refused

TOO_FEW = "add the missing equation, or declare the quantity as input or parameter"
TOO_MANY = "remove it, or name the unknown it determines under `algebraic` or `states`"
BOUND = (
    "eliminate one of the bound states, or differentiate the constraint and solve it together "
    "with the equations (reduce the index to 1)"
)
CROWD = (
    "check which equation was meant for the unknown without one; else eliminate a state or "
    "differentiate the constraint"
)
REPEATS = (
    "one of these equations repeats the others in its highest rates; check the coefficients, "
    "eliminate a state, or differentiate the constraint"
)

CASES: list[tuple[str, list[str], Parts, tuple[str, str, str, str]]] = [
    (
        "one of two unknowns lacks an equation",
        ["x' = z"],
        {"algebraic": ["z"]},
        (
            "structure.too-few-equations",
            "equations",
            "1 equation for 2 unknowns (x', z): one of x', z lacks an equation",
            TOO_FEW,
        ),
    ),
    (
        "the unknown that lacks an equation",
        ["x' = -x", "y' = x"],
        {"algebraic": ["z"]},
        (
            "structure.too-few-equations",
            "equations",
            "2 equations for 3 unknowns (x', y', z): z lacks an equation",
            TOO_FEW,
        ),
    ),
    (
        "two equations for one rate",
        ["x' = 1", "x' = 2"],
        {},
        (
            "structure.too-many-equations",
            "equation 2",
            "2 equations for 1 unknown (x'): equation 2 is left over",
            TOO_MANY,
        ),
    ),
    (
        "a rate that cancels",
        ["x' = x'"],
        {},
        (
            "structure.no-unknowns",
            "equations",
            (
                "the equations hold no rate and no algebraic unknown: an equation with one new "
                "name at its left is a definition"
            ),
            "write a rate as x', or list what the equations determine under `algebraic`",
        ),
    ),
    (
        "a constraint between states",
        ["x'' = -L*x", "y'' = -L*y - g", "x^2 + y^2 = 1"],
        {"algebraic": ["L"], "parameters": {"g": 9.81}},
        (
            "structure.hidden-constraint",
            "equation 3",
            (
                "equation 3 (x^2 + y^2 = 1) holds no highest rate and no algebraic unknown; it "
                "binds x, y among themselves, a hidden constraint"
            ),
            BOUND,
        ),
    ),
    (
        "two equations for one unknown while another has none",
        ["x' + z = 1", "z = y", "2*z = y", "y' = w + x'"],
        {"algebraic": ["z", "w"]},
        (
            "structure.hidden-constraint",
            "equation 3",
            (
                "equation 2, equation 3 together hold only the unknown z, so a combination of them "
                "is a hidden constraint, while w lacks an equation"
            ),
            CROWD,
        ),
    ),
    (
        "a combination without rates",
        ["x' + y' = 1", "2*x' + 2*y' = x"],
        {},
        (
            "structure.hidden-constraint",
            "equation 1",
            (
                "equation 1, equation 2: a combination of them holds none of the unknowns x', y', "
                "a hidden constraint"
            ),
            REPEATS,
        ),
    ),
    (
        "a combination without rates, by the parameters",
        ["a*x' + y' = 1", "a^2*x' + a*y' = x", "z' = x'"],
        {"parameters": {"a": 2}},
        (
            "structure.hidden-constraint",
            "equation 1",
            (
                "equation 1, equation 2: a combination of them holds none of the unknowns x', y', "
                "a hidden constraint"
            ),
            REPEATS,
        ),
    ),
    (
        "an output beyond the highest rate",
        ["x' = u"],
        {"inputs": ["u"], "outputs": {"y": "x''"}},
        (
            "structure.improper-output",
            "output y",
            (
                "output y = x'' needs x'', beyond the highest rate x' of the equations: it would "
                "contain the rate of an input (improper)"
            ),
            "take an output of at most x', or give the sensor its own lag",
        ),
    ),
    (
        "an output with the rate of the highest rate",
        ["m*x'' = u"],
        {"inputs": ["u"], "outputs": {"jerk": "(m*x'')'"}, "parameters": {"m": 2}},
        (
            "structure.improper-output",
            "output jerk",
            (
                "output jerk = (m*x'')' needs x''', beyond the highest rate x'' of the equations: "
                "it would contain the rate of an input (improper)"
            ),
            "take an output of at most x'', or give the sensor its own lag",
        ),
    ),
    (
        "a declared state without a rate",
        ["x' = y"],
        {"states": ["x", "y"]},
        (
            "structure.state-without-rate",
            "state y",
            "state y has no rate y' in any equation",
            "add its equation y' = …, or list y under `algebraic`",
        ),
    ),
    (
        "too many states",
        [f"x{k}' = 1" for k in range(2001)],
        {},
        (
            "structure.size",
            "equations",
            "2001 states; at most 2000 are handled",
            "split the plant",
        ),
    ),
]


@pytest.mark.parametrize(
    ("equations", "parts", "error"), [c[1:] for c in CASES], ids=[c[0] for c in CASES]
)
def test_errors_of_structure(
    equations: list[str], parts: Parts, error: tuple[str, str, str, str]
) -> None:
    """The whole error, naming the equations and unknowns concerned."""
    code, where, message, hint = error
    assert refused(lambda: plant(*equations, **parts)) == {
        "class": "StructureError",
        "code": code,
        "where": where,
        "message": message,
        "hint": hint,
    }


RATE_OF_INPUT = (
    "make u a state with an equation of its own (a lag, say), driven by a new input, or shift the "
    "rate into a new state such as z = x - c*u"
)


@pytest.mark.parametrize(
    ("equations", "where"),
    [
        (["x' = u'"], "equation 1, column 6"),
        (["x' = (x*u)'"], "equation 1, column 6"),
        (["x' = d(u)/dt"], "equation 1, column 6"),
        (["q = x*u", "x' = q'"], "equation 2, column 6"),
    ],
)
def test_the_rate_of_an_input_is_refused_with_the_way_out(equations: list[str], where: str) -> None:
    """Directly, in a bracket, as d(u)/dt and through a definition."""
    assert refused(lambda: plant(*equations, inputs=["u"])) == {
        "class": "ExpressionError",
        "code": "expression.rate-of-input",
        "where": where,
        "message": "the rate of input u is not a quantity of the plant",
        "hint": RATE_OF_INPUT,
    }


def test_the_rate_of_an_algebraic_unknown_is_refused() -> None:
    """A declared algebraic unknown has no rate."""
    assert refused(lambda: plant("x' = z'", "z = 2*x", algebraic=["z"])) == {
        "class": "ExpressionError",
        "code": "expression.rate-of-algebraic",
        "where": "equation 1, column 6",
        "message": "z is declared algebraic, so its rate does not occur",
        "hint": "declare z under `states`, or write the equation without z'",
    }


def test_blocks_stand_in_solving_order() -> None:
    """Each block needs only unknowns of earlier ones, whatever order the equations have."""
    found = plant("x' = z + y'", "z = w*x", "y' = z", "w = 2*x + y", algebraic=["z", "w"])
    assert [b.unknowns for b in found.blocks] == [("w",), ("z",), ("y'",), ("x'",)]
    known: set[str] = set()
    for block in found.blocks:
        known |= set(block.unknowns)
        for row in block.equations:
            leaves = found.graph.leaves([found.equations[row].residual])
            assert leaves & set(found.unknowns) <= known
    assert known == set(found.unknowns)


def test_a_mass_matrix_is_one_block_solved_by_elimination() -> None:
    """Coupled accelerations are one linear block; the solved form is Cramer's."""
    found = plant(
        "m*x'' + c*y'' = u",
        "c*x'' + j*y'' = -x",
        inputs=["u"],
        parameters={"m": 3, "c": 1, "j": 2},
    )
    (block,) = found.blocks
    assert (block.equations, block.unknowns, block.linear) == ((0, 1), ("x''", "y''"), True)
    assert block.solved is not None
    numbers = {"m": 3, "c": 1, "j": 2, "x": 5, "u": 7}
    graph = found.graph
    swap = {graph.var(n): graph.const(v) for n, v in numbers.items()}
    # [3 1; 1 2] w = [7, -5] has w = [19/5, -22/5]
    values = [graph.value_of(node) for node in graph.substitute(block.solved, swap)]
    assert [str(v) for v in values] == ["19/5", "-22/5"]


def test_an_implicit_algebraic_unknown_is_a_nonlinear_block() -> None:
    """Z + exp(z) = x is solved for z numerically, before x' that needs it."""
    found = plant("x' = z", "z + exp(z) = x", algebraic=["z"])
    assert [(b.unknowns, b.linear, b.solved is None) for b in found.blocks] == [
        (("z",), False, True),
        (("x'",), True, False),
    ]


def test_a_large_block_has_no_solved_form() -> None:
    """Four coupled rates stay a matrix equation."""
    names = "abcd"
    rows = [
        " + ".join(f"{2 + (i == j)}*{n}'" for j, n in enumerate(names)) + f" = {names[i]}"
        for i in range(4)
    ]
    (block,) = plant(*rows).blocks
    assert block.linear
    assert block.solved is None


@pytest.mark.parametrize("equation", ["(m*V)' = F", "d(m*V)/dt = F", "m*V' + m'*V = F"])
def test_momentum_with_a_changing_mass(equation: str) -> None:
    """(m V)' = F is m V' + m' V = F when the mass has an equation of its own."""
    found = plant(equation, "m' = q", inputs=["F", "q"])
    assert found.states == ("m", "V")
    (block,) = [b for b in found.blocks if b.unknowns == ("V'",)]
    assert block.solved is not None
    graph = found.graph
    values = {"m": 2, "V": 3, "q": 5, "m'": 5, "F": 7}
    swap = {graph.var(n): graph.const(v) for n, v in values.items()}
    (value,) = graph.substitute(block.solved, swap)
    assert str(graph.value_of(value)) == "-4"  # (F - V q)/m = (7 - 3*5)/2


@pytest.mark.parametrize(
    "equations",
    [["p = m*V", "p' = F"], ["p' = F", "p = m*V"], ["(m*V)' = F"], ["m*d(V)/dt = F"]],
)
def test_momentum_through_a_definition(equations: list[str]) -> None:
    """P = m V with p' = F is m V' = F for a constant mass, in any order of the equations."""
    found = plant(*equations, inputs=["F"], parameters={"m": 2})
    assert found.states == ("V",)
    (block,) = found.blocks
    assert block.solved is not None
    assert plain_text(found.graph, block.solved[0]) == "F/m"
