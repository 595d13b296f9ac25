"""A plant as understood: state order, roles, definitions, units of rates, the plant's clock."""

from __future__ import annotations

import pytest
from flint import fmpq

from tangentbook.calculus import plain_text
from tangentbook.plant import DeclaredText, DefinitionText, ParameterText, Plant, parse_unit
from unit.plant.plants import Parts, plant, refused


def printed(found: Plant, expression: str) -> str:
    """An expression over the plant's names, as it is understood."""
    return plain_text(found.graph, found.expression(expression, "test"))


ORDERS: list[tuple[str, list[str], Parts, list[str]]] = [
    ("first appearance", ["y' = x", "x' = y"], {}, ["y", "x"]),
    ("unprimed occurrence counts", ["y' = z + x", "x' = y", "z' = x"], {}, ["y", "z", "x"]),
    ("left before right", ["x + y' = 1", "x' = y"], {}, ["x", "y"]),
    ("x then x'", ["b*x'' + y' = 1", "y' = x"], {"parameters": {"b": 1}}, ["x", "x'", "y"]),
    ("definitions are not scanned", ["q = w*y", "x' = q", "y' = w", "w' = x"], {}, ["x", "y", "w"]),
    ("declared order", ["y' = x", "x' = y"], {"states": ["x", "y"]}, ["x", "y"]),
    ("declared, then the rest", ["z' = y", "y' = x", "x' = y"], {"states": ["x"]}, ["x", "z", "y"]),
    ("rates may be listed", ["x'' = y", "y' = x"], {"states": ["x'", "y", "x"]}, ["x'", "y", "x"]),
    (
        "a rate listed alone",
        ["x''' = y", "y' = x"],
        {"states": ["y", "x'"]},
        ["y", "x", "x'", "x''"],
    ),
]


@pytest.mark.parametrize(
    ("equations", "parts", "states"), [o[1:] for o in ORDERS], ids=[o[0] for o in ORDERS]
)
def test_state_order(equations: list[str], parts: Parts, states: list[str]) -> None:
    """The order of `states`, else of first appearance in the equations; x, then x'."""
    assert list(plant(*equations, **parts).states) == states


def test_no_state_is_lost_or_doubled() -> None:
    """Every order below the highest rate is a state, once."""
    found = plant("x''' + y'' = u", "y'' = x", inputs=["u"])
    assert found.states == ("x", "x'", "x''", "y", "y'")
    assert found.unknowns == ("x'''", "y''")
    assert found.rates == ("x'''", "y''")
    assert found.orders == {"x": 3, "y": 2}


def test_roles_of_all_names() -> None:
    """Every name has its word; what serves nothing is unused."""
    found = plant(
        "J*theta'' = M + Mw - b*theta'",
        "M = k*(Mc - z)",
        "z + z^3 = theta",
        "idle = 3*z",
        states=["theta"],
        inputs=["Mc", "Mw", "Mx"],
        algebraic=["z"],
        outputs={"angle": "theta", "load": "M/J", "theta": "theta"},
        parameters={"J": "c*2", "b": 1, "c": 3, "k": 2, "spare": 1},
        definitions={"also": "theta*2"},
    )
    assert dict(found.roles) == {
        "theta": "state",
        "theta'": "state",
        "z": "algebraic",
        "Mc": "input",
        "Mw": "input",
        "Mx": "unused",
        "J": "parameter",
        "b": "parameter",
        "c": "parameter",
        "k": "parameter",
        "spare": "unused",
        "also": "unused",
        "M": "definition",
        "idle": "unused",
        "angle": "output",
        "load": "output",
    }
    assert found.unused == ("Mx", "spare", "also")
    assert found.undeclared == ()


def test_a_definition_used_only_in_an_output_is_used() -> None:
    """Outputs count as use, through other definitions too."""
    found = plant("x' = -x", "q = k*x", "r = 2*q", parameters={"k": 2}, outputs={"y": "r'"})
    assert found.unused == ()
    assert found.roles["q"] == found.roles["r"] == "definition"
    assert plain_text(found.graph, found.outputs[0].node) == "2*k*x'"


def test_undeclared_states_are_named() -> None:
    """States that occur while others are declared are taken, and listed."""
    found = plant("x' = y", "y' = -x", states=["x"])
    assert found.undeclared == ("y",)
    assert plant("x' = y", "y' = -x").undeclared == ()


def test_without_outputs_all_states_are_outputs() -> None:
    """The default outputs are the states, in their order and units."""
    found = plant("x'' = -x", states={"x": "mm"})
    assert [o.name for o in found.outputs] == ["x", "x'"]
    assert found.outputs[0].unit == parse_unit("mm")


def test_time_in_the_equations() -> None:
    """T is time where nothing declares it, an ordinary name where something does."""
    assert plant("x' = sin(t)").explicit_time
    assert plant("x' = -x", outputs={"y": "x + t"}).explicit_time
    assert not plant("x' = sin(t)", parameters={"t": 1}).explicit_time
    assert printed(plant("x' = q'", "q = 3*t"), "q'") == "3"


def test_expressions_over_the_names_of_a_plant() -> None:
    """Outputs, definitions and rates may be named; anything else is told what is near."""
    found = plant("x' = -x*k", "q = 2*x", outputs={"height": "3*q"}, parameters={"k": 1})
    assert printed(found, "height") == "3*2*x"
    assert printed(found, "q' + k") == "2*x' + k"
    assert refused(lambda: found.expression("2*hight", "point.hold")) == {
        "class": "ExpressionError",
        "code": "expression.undeclared",
        "where": "point.hold",
        "message": "hight is not declared, and no equation defines it or its rate",
        "hint": "did you mean height?",
    }


ROLE_ERRORS: list[tuple[str, list[str], Parts, tuple[str, str, str, str]]] = [
    (
        "two roles",
        ["x' = 1"],
        {"states": ["x"], "inputs": ["x"]},
        (
            "name.two-roles",
            "x",
            "x is declared as state and as input",
            "keep one of the two declarations, or rename one of the quantities",
        ),
    ),
    (
        "a parameter that is defined",
        ["x' = k"],
        {"parameters": {"k": 1}, "definitions": {"k": "2"}},
        (
            "name.two-roles",
            "k",
            "k is declared as parameter and as definition",
            "keep one of the two declarations, or rename one of the quantities",
        ),
    ),
    (
        "an output named like a parameter",
        ["x' = k"],
        {"parameters": {"k": 1}, "outputs": {"k": "2*x"}},
        (
            "name.two-roles",
            "output k",
            "k is a parameter and the name of an output that is something else (2*x)",
            "rename the output",
        ),
    ),
    (
        "an output named like a state",
        ["x' = 1"],
        {"outputs": {"x": "2*x"}},
        (
            "name.two-roles",
            "output x",
            "x is a state and the name of an output that is something else (2*x)",
            "rename the output",
        ),
    ),
    (
        "a circle of definitions",
        ["x' = a", "a = b", "b = c + 1", "c = a*2"],
        {},
        (
            "definition.cycle",
            "equation 2",
            "definitions go round in a circle: a -> b -> c -> a",
            "if a is an unknown of the equations, list it under `algebraic` or `states`",
        ),
    ),
    (
        "a definition of itself",
        ["x' = a", "a = cos(a)"],
        {},
        (
            "definition.cycle",
            "equation 2",
            "definitions go round in a circle: a -> a",
            "if a is an unknown of the equations, list it under `algebraic` or `states`",
        ),
    ),
    (
        "two definitions of one name",
        ["x' = a", "a = 1", "a = 2"],
        {},
        (
            "name.defined-twice",
            "equation 3",
            "a is defined by equation 2 and by equation 3",
            "if a is an unknown, list it under `algebraic` or `states`",
        ),
    ),
    (
        "a definition and an equation",
        ["x' = a", "a = 1"],
        {"definitions": {"b": "2", "c": "b"}, "algebraic": ["b"]},
        (
            "name.two-roles",
            "b",
            "b is declared as algebraic and as definition",
            "keep one of the two declarations, or rename one of the quantities",
        ),
    ),
    (
        "a circle of parameters",
        ["x' = c"],
        {"parameters": {"c": "a", "a": "b", "b": "2*a"}},
        (
            "parameter.cycle",
            "parameter a",
            "parameters are given by each other in a circle: a, b",
            "give one of them a number",
        ),
    ),
    (
        "a highest rate listed as a state",
        ["x'' = 1"],
        {"states": ["x", "x''"]},
        (
            "name.rate",
            "state x''",
            "x'' is the highest rate of x, not a state",
            "list x only up to x'",
        ),
    ),
    (
        "a rate declared as an input",
        ["x' = 1"],
        {"inputs": ["u'"]},
        ("name.rate", "input u'", "u' is a rate; only states may list their rates", "declare u"),
    ),
    (
        "no name",
        ["x' = 1"],
        {"inputs": ["2u"]},
        (
            "name.form",
            "input 2u",
            "'2u' is not a name",
            "a name is letters, digits and _, beginning with a letter",
        ),
    ),
    (
        "no unit of time",
        ["x' = 1"],
        {"time": "furlong"},
        (
            "unit.text",
            "time",
            "time is 'furlong', which is no unit of time",
            'write "s", "min", "h", "d", or "1" where time is dimensionless',
        ),
    ),
    (
        "an angle is no time",
        ["x' = 1"],
        {"time": "rad"},
        (
            "unit.text",
            "time",
            "time is 'rad', which is no unit of time",
            'write "s", "min", "h", "d", or "1" where time is dimensionless',
        ),
    ),
    (
        "a rate in a value",
        ["x' = k"],
        {"parameters": {"k": "d(3)/dt + (k2)'", "k2": 1}},
        (
            "expression.rate",
            "parameter k, column 11",
            "a value has no rate of k2",
            "remove the prime",
        ),
    ),
]


@pytest.mark.parametrize(
    ("equations", "parts", "error"), [e[1:] for e in ROLE_ERRORS], ids=[e[0] for e in ROLE_ERRORS]
)
def test_errors_of_roles(
    equations: list[str], parts: Parts, error: tuple[str, str, str, str]
) -> None:
    """The whole error where names, roles and declarations do not fit together."""
    code, where, message, hint = error
    found = refused(lambda: plant(*equations, **parts))
    assert found.pop("class") == "DeclarationError"
    assert found == {"code": code, "where": where, "message": message, "hint": hint}


CLOCKS: list[tuple[str, list[str], Parts, str]] = [
    ("no units", ["x' = -k*x"], {"parameters": {"k": 2}}, "1"),
    ("units without time", ["x' = -k*x"], {"states": {"x": "m"}, "parameters": {"k": 2}}, "1"),
    ("a parameter's unit", ["x' = -k*x"], {"parameters": {"k": "2 1/min"}}, "60"),
    (
        "a declared unit",
        ["x' = -k*x"],
        {"parameters": {"k": ParameterText(name="k", value=2, unit="1/h")}},
        "60",
    ),
    ("a state's unit", ["x' = v", "v' = -x"], {"states": {"x": "m", "v": "m/s"}}, "60"),
    ("a literal in an equation", ["x' = -2[1/s]*x"], {}, "60"),
    ("a literal in a definition", ["x' = -r"], {"definitions": {"r": "2[1/s]*x"}}, "60"),
    ("a literal in an equation's definition", ["x' = -r", "r = 2[1/s]*x"], {}, "60"),
    ("a literal in an output", ["x' = -x"], {"outputs": {"y": "x'/2[1/s]"}}, "60"),
    ("a literal in a value", ["x' = -k*x"], {"parameters": {"k": "2*3[1/s]"}}, "60"),
    ("a literal without time", ["x' = -2[kg]*x"], {}, "1"),
    (
        "a limit's unit",
        ["x' = -x + u"],
        {"inputs": [DeclaredText(name="u", limits=(0, "3 m/s"))]},
        "60",
    ),
    (
        "a definition's unit",
        ["x' = -r"],
        {"definitions": {"r": DefinitionText(name="r", text="x", unit="W")}},
        "60",
    ),
]


@pytest.mark.parametrize(
    ("equations", "parts", "clock"), [c[1:] for c in CLOCKS], ids=[c[0] for c in CLOCKS]
)
def test_what_one_unit_of_time_is(equations: list[str], parts: Parts, clock: str) -> None:
    """Where any unit contains time, a minute is 60 s; else rates are per minute as written."""
    parts["time"] = "min"
    found = plant(*equations, **parts)
    assert found.time == parse_unit("min")
    assert found.clock.factor == fmpq(int(clock))


def test_dimensionless_time() -> None:
    """Time = "1" is allowed and is 1."""
    assert plant("x' = -x", time="1").clock.factor == 1


@pytest.mark.parametrize(
    ("unit", "time", "order", "text", "factor", "dimension"),
    [
        ("m", "s", 1, "m/s", "1", {"m": 1, "s": -1}),
        ("mm", "s", 2, "mm/s^2", "1/1000", {"m": 1, "s": -2}),
        ("m", "min", 1, "m/min", "1/60", {"m": 1, "s": -1}),
        ("m/s", "min", 1, "m/(s min)", "1/60", {"m": 1, "s": -2}),
        ("W/(m^2 K)", "s", 1, "W/(m^2 K s)", "1", {"kg": 1, "s": -4, "K": -1}),
        ("1", "h", 1, "1/h", "1/3600", {"s": -1}),
        ("degC", "s", 1, "degC/s", "1", {"K": 1, "s": -1}),
    ],
)
def test_units_of_rates(
    unit: str, time: str, order: int, text: str, factor: str, dimension: dict[str, int]
) -> None:
    """X' has unit(x) per time, and that text is a unit again, of the same size."""
    equation = "x" + "'" * order + " = k"
    found = plant(equation, states={"x": unit}, parameters={"k": "2 1/s"}, time=time)
    rate = found.unit_of("x" + "'" * order)
    assert rate is not None
    p, _, q = factor.partition("/")
    assert (rate.text, rate.factor) == (text, fmpq(int(p), int(q or 1)))
    assert dict(rate.dimension) == dimension
    assert rate.offset == 0
    again = parse_unit(rate.text)
    assert (again.factor, again.dimension) == (rate.factor, rate.dimension)


def test_what_was_declared_is_kept() -> None:
    """Limits, rest, typical size and period are exact SI quantities."""
    declared = DeclaredText(
        name="theta",
        unit="deg",
        about="angle",
        positive="opening",
        typical=30,
        period="360 deg",
        limits=(-5, "pi/2"),
    )
    found = plant("theta' = w", "w' = -theta", states=[declared])
    variable = found.variables["theta"]
    shown = [
        None if node is None else plain_text(found.graph, node)
        for node in (variable.typical, variable.period, variable.lower, variable.upper)
    ]
    # a purely numeric expression counts in the declared unit
    assert shown == ["30*1/180*pi", "360*1/180*pi", "-5*1/180*pi", "pi/2*1/180*pi"]
    assert (variable.about, variable.positive, variable.role) == ("angle", "opening", "state")


def test_declared_parameters_are_kept_with_text_and_unit() -> None:
    """A parameter is shown as it was written."""
    item = ParameterText(name="k", value=2, unit="kN/m", tolerance="5 %", about="stiffness")
    found = plant("x'' = -k*x", parameters={"k": item})
    parameter = found.parameters["k"]
    assert (parameter.text, parameter.tolerance, parameter.about) == ("2 kN/m", "5 %", "stiffness")
    assert found.graph.value_of(parameter.value) == 2000
    assert tuple(found.parameters) == ("k",)
    assert found.unit_of("k") == parse_unit("kN/m")
    assert found.unit_of("nobody") is None
