"""Formulas: values against numpy, slopes against complex steps and closed forms, hostile texts refused."""

from __future__ import annotations

import math
import pickle
import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from wavejob.reading.formula_functions import FUNCTIONS
from wavejob.reading.formulas import FormulaError, first_bad, parse

NAMES = frozenset({"x", "y", "t", "V0"})
X = np.linspace(-1.7, 1.9, 13)  # holds no zero
Y = np.linspace(0.3, 2.1, 13)


def _value(text: str, **values: object) -> object:
    return parse(text, NAMES)(values)


# From the contract of job files, word for word.
CONTRACT = "where sin cos tan arcsin arccos arctan arctan2 sinh cosh tanh exp log sqrt abs sign minimum maximum hypot"


def test_the_functions_are_those_of_the_contract() -> None:
    assert set(FUNCTIONS) == set(CONTRACT.split())


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("2 + 3*4 - 6/4", 12.5),
        ("-2**2", -4.0),  # as in Python and Fortran
        ("2**-1", 0.5),
        ("2**3**2", 512.0),
        ("-2**-2", -0.25),
        ("(-2)**2", 4.0),
        ("8/4/2", 1.0),
        ("7 - 4 - 2", 1.0),
        ("--3", 3.0),
        ("+-+3", -3.0),
        ("2*-3", -6.0),
        ("1.5e-3 + .5 + 2.", 2.5015),
        ("pi", math.pi),
        ("1 < 2", 1.0),
        ("(1 < 2) + (3 > 2)", 2.0),  # floats, not logic
        ("(1 < 2) - (3 > 2)", 0.0),
        ("(1 <= 1) + 2*(1 >= 2) + 4*(1 == 1) + 8*(1 != 1)", 5.0),
        ("1 + 1 < 3", 1.0),
        ("where(2 > 1, 5, 6)", 5.0),
        ("where(0, 5, 6)", 6.0),
        ("arctan2(1, -1)", 0.75 * math.pi),
        ("hypot(3, 4)", 5.0),
        ("minimum(2, maximum(1, 3))", 2.0),
        ("abs(-2) + sign(-3)", 1.0),
        ("\n 1\n +\t2 ", 3.0),
    ],
)
def test_values(text: str, value: float) -> None:
    assert _value(text) == pytest.approx(value, rel=1e-15)
    assert type(_value(text)) is float


@pytest.mark.parametrize("text", [
    "0.5*V0*(x**2 + y**2)*(1 + 0.1*sin(3*t)) + V0*exp(-(x - 1)**2/2)*cos(y)",
    "-x**2 + sqrt(abs(x))/(2 + tanh(x)) - arctan2(y, x)*hypot(x, y)",
    "x - y - t - V0/y/2 + 2**x**2 - -x",
])  # fmt: skip
def test_values_are_those_of_numpy(text: str) -> None:
    """Python itself reads the same text, as common practice has it (operators bind alike)."""
    values = {"x": X[:, None], "y": Y[None, :], "t": 0.7, "V0": 3}
    functions = {name: getattr(np, name) for name in CONTRACT.split()}
    expected = eval(text, {"__builtins__": {}}, functions | values)
    found = parse(text, NAMES)(values)
    assert found.shape == (13, 13)
    np.testing.assert_allclose(found, expected, rtol=1e-14)


def test_shapes_and_names() -> None:
    formula = parse("V0*where(x > 0, y, 1)", NAMES)
    assert formula.used == {"V0", "x", "y"}
    assert formula({"V0": 2, "x": X[:, None], "y": Y}).shape == (13, 13)
    assert formula({"V0": 2, "x": np.int64(1), "y": [3, 4]}).tolist() == [6.0, 8.0]
    assert parse("2*t", NAMES)({"t": np.ones(3, np.float32)}).dtype == np.float32
    assert pickle.loads(pickle.dumps(formula)) == formula


# Each function alone; the slope by complex step, whose error is of rounding: Squire and Trapp, SIAM Review
# 40 (1998) 110. It needs analytic functions; the others have closed forms below.
ANALYTIC_FUNCTIONS = "sin cos tan arcsin arccos arctan sinh cosh tanh exp log sqrt"
ANALYTIC = [
    "sin(x)", "cos(x)", "tan(x)", "arcsin(x/2)", "arccos(x/2)", "arctan(x)", "sinh(x)", "cosh(x)", "tanh(x)",
    "exp(x)", "log(2 + x)", "sqrt(2 + x)", "x**3", "(2 + x)**y", "y**x", "(2 + x)**x", "x*y*x", "y/x",
    "x/y - x",
    "-x + +x*3", "x**-2", "1/(1 + exp(-(x - y)/V0))", "exp(-4*log(2)*(x - y)**2/V0**2)*cos(2*pi*x + 0.3)",
    "V0*(1 - exp(-(x - y)/1.3))**2", "V0/cosh((x - y)/0.7)**2",
]  # fmt: skip


@pytest.mark.parametrize("text", ANALYTIC)
def test_slopes_of_analytic_formulas(text: str) -> None:
    step = 1e-30
    functions = {name: getattr(np, name) for name in ANALYTIC_FUNCTIONS.split()}
    at = {"y": Y, "V0": 1.4, "pi": np.pi}
    expected = np.imag(eval(text, {"__builtins__": {}}, functions | at | {"x": X + 1j * step})) / step
    value, slope = parse(text, NAMES).with_slope({"x": X, "y": Y, "V0": 1.4}, "x")
    np.testing.assert_array_equal(value, parse(text, NAMES)({"x": X, "y": Y, "V0": 1.4}))
    np.testing.assert_allclose(slope, expected, rtol=1e-12, atol=1e-14)


@pytest.mark.parametrize(
    ("text", "of", "expected"),
    [
        ("abs(x)", "x", np.sign(X)),
        ("sign(x)", "x", 0 * X),
        ("x > 0", "x", 0 * X),
        ("minimum(x, y)", "x", 1.0 * (X < Y)),
        ("maximum(x, y)", "x", 1.0 * (X > Y)),
        ("minimum(x, y)", "y", 1.0 * (Y < X)),
        ("maximum(x, 2)*x", "x", 2.0 + 0 * X),
        ("hypot(x, y)", "x", X / np.sqrt(X**2 + Y**2)),
        ("hypot(x, y)", "y", Y / np.sqrt(X**2 + Y**2)),
        ("arctan2(x, y)", "x", Y / (X**2 + Y**2)),
        ("arctan2(x, y)", "y", -X / (X**2 + Y**2)),
        ("where(x > 0, x**2, y)", "x", np.where(X > 0, 2 * X, 0)),
        ("where(x > 0, sqrt(x), 1)", "x", 0.5 / np.sqrt(np.where(X > 0, X, np.inf))),  # nan where not chosen
        ("(x > 0)*x**2", "x", np.where(X > 0, 2 * X, 0)),
        ("x**2", "y", 0 * X),
        ("x**2", "x", 2 * X),  # negative x: no logarithm of it is taken
        ("x**0", "x", 0 * X),
    ],
)
def test_slopes_piece_by_piece(text: str, of: str, expected: np.ndarray) -> None:
    _, slope = parse(text, NAMES).with_slope({"x": X, "y": Y}, of)
    np.testing.assert_allclose(slope, expected, rtol=1e-14)


@pytest.mark.parametrize(
    ("text", "slope"),
    [
        ("abs(x)", 0.0),  # at a kink, the mean of both sides
        ("sqrt(x**2)", 0.0),
        ("hypot(x, 0*x)", 0.0),
        ("minimum(x, 0)", 0.5),
        ("minimum(x, -x)", 0.0),
        ("maximum(x, 3*x)", 2.0),
        ("where(x == 0, 1, sin(x)/x)", 0.0),
        ("x**1", 1.0),
        ("x**0", 0.0),
        ("x*abs(x)", 0.0),
        ("sqrt(x)", math.inf),
    ],
)
def test_slopes_at_zero(text: str, slope: float) -> None:
    found = parse(text, NAMES).with_slope({"x": 0.0}, "x")[1]
    assert found == slope
    assert type(found) is float


def test_slope_shape_and_constants() -> None:
    value, slope = parse("3 + t", NAMES).with_slope({"t": 1.0, "x": X}, "x")
    assert (value, slope) == (4.0, 0.0)
    value, slope = parse("x*t", NAMES).with_slope({"t": 2.0, "x": X}, "t")
    np.testing.assert_array_equal(slope, X)
    value, slope = parse("x + t", NAMES).with_slope({"t": 2.0, "x": X}, "t")
    np.testing.assert_array_equal(slope, np.ones_like(X))


def test_results_may_be_changed_in_place() -> None:
    x = np.ones(3)
    value, slope = parse("x", NAMES).with_slope({"x": x}, "x")
    for result in (value, slope, parse("x", NAMES)({"x": x})):
        result += 1.0
        np.testing.assert_array_equal(result, 2.0)
    np.testing.assert_array_equal(x, 1.0)


def test_first_bad() -> None:
    assert first_bad(np.array([[1.0, 2.0], [np.nan, np.inf]])) == (1, 0)
    assert first_bad(np.array([1.0])) is None
    assert first_bad(math.inf) == ()
    assert first_bad(1.0) is None


@pytest.mark.parametrize(
    ("text", "column", "message", "fix"),
    [
        ("x^2", 1, "`^` has no meaning in a formula", "write `**` for a power"),
        ("1,5*x", 1, "a comma may not stand here", "write a decimal point, as in `1.5`; commas stand between "
         "the arguments of a function"),
        ("2x", 0, "`2x` is neither a number nor a name", "write `2*x` for a product; numbers are decimal"),
        ("0x10", 0, "`0x10` is neither a number nor a name",
        "write `0*x10` for a product; numbers are decimal"),
        ("1j*x", 0, "`1j` is neither a number nor a name", "write `1*j` for a product; numbers are decimal"),
        ("2 x", 2, "an operator is missing before `x`", "write `*` for a product"),
        ("x y", 2, "an operator is missing before `y`", "write `*` for a product"),
        ("(x)(y)", 3, "`(` may not stand here", "check operators and brackets"),
        ("sin", 0, "`sin` is a function", "give it its arguments: `sin(...)`"),
        ("sin(x, y)", 0, "`sin` takes 1 argument, not 2", "give it 1"),
        ("where(x)", 0, "`where` takes 3 arguments, not 1", "give it 3: condition, value, other value"),
        ("x(3)", 0, "`x` is a value, not a function", "write `x*(...)` for a product"),
        ("ln(x)", 0, "`ln` is not known in this formula", "write `log`, the natural logarithm"),
        ("1 + arcsine(x)", 4, "`arcsine` is not known in this formula", "did you mean `arcsin`?"),
        ("v0*x", 0, "`v0` is not known in this formula", "did you mean `V0`?"),
        ("qqqq", 0, "`qqqq` is not known in this formula", "the values it may use are V0, pi, t, x, y"),
        ("0 < x < 1", 6, "a second comparison may not stand here", "compare two values only, and multiply "
         "comparisons: `(0 < x) * (x < 1)`"),
        ("where(x>0 and x<1,1,0)", 10, "`and` may not stand here",
        "multiply comparisons: `(x > 0) * (x < 1)`"),
        ("1 if x else 0", 2, "`if` may not stand here", "write `where(condition, value, other value)`"),
        ("x = 3", 2, "`=` has no meaning in a formula", "a formula has no `=`; a comparison is written `==`"),
        ("x[0]", 1, "`[` has no meaning in a formula", "use round brackets"),
        ("x.real", 1, "`.` has no meaning in a formula", "a point belongs inside a number, as in `0.5`"),
        ("", 0, "the formula is empty", "write a number or an expression such as `2*x**2`"),
        ("(x", 2, "the formula ends too early", "complete it, or close its brackets"),
        ("x +", 3, "the formula ends too early", "complete it, or close its brackets"),
        ("x)", 1, "`)` may not stand here", "check operators and brackets"),
        ("x//2", 2, "`/` may not stand here", "check operators and brackets"),
        ("sin(x,)", 6, "`)` may not stand here", "check operators and brackets"),
        ("x + 1e999", 4, "the number `1e999` is out of range", "write a smaller one"),
    ],
)  # fmt: skip
def test_refused_in_words(text: str, column: int, message: str, fix: str) -> None:
    with pytest.raises(FormulaError) as caught:
        parse(text, NAMES)
    error = caught.value
    assert (error.column, error.message, error.fix) == (column, message, fix)
    assert str(pickle.loads(pickle.dumps(error))) == f"{message}; {fix}"


@pytest.mark.parametrize("text", [
    "__import__('os').system('true')", "().__class__", "lambda: 1", "[x for x in (1,)]", "x if x else y",
    "x; y",
    "x # c", "f'{x}'", "'x'", "True", "None", "x @ y", "x := 1", "sin(*x)", "sin(x=1)", "x\0", "é",
    "\uff11", "x!", "~x", "x % 2",
    "print(x)", "x and y", "not x", "exp", "x\u2028", "1_000", "0b1", "1..2", "1e", "1e+", "$x", "\\x",
    "...", "x is y",
])  # fmt: skip
def test_nothing_of_python_is_reachable(text: str) -> None:
    with pytest.raises(FormulaError) as caught:
        parse(text, NAMES)
    assert 0 <= caught.value.column <= len(text)


@pytest.mark.parametrize("text", [
    "(" * 3000, "(" * 1999, "-" * 1999 + "(", "x**" * 600 + "x",
    "+".join(["x"] * 900), "sin(" * 400 + "x" + ")" * 400,
    "1" * 5000, "9" * 1999, "where(" * 300,
])  # fmt: skip
def test_bounds(text: str) -> None:
    with pytest.raises(FormulaError):
        parse(text, NAMES)


def test_bounds_leave_room() -> None:
    assert _value("(" * 40 + "x" + ")" * 40, x=2.0) == 2.0
    assert _value("-" * 1001 + "x", x=2.0) == -2.0
    assert _value("+".join(["x"] * 200), x=1.0) == 200.0


def test_powers_of_powers_take_no_time() -> None:
    """Integers of Python would take for ever here; floats overflow at once. A second is far above both."""
    start = time.perf_counter()
    assert _value("9**9**9**9**9") == math.inf
    assert time.perf_counter() - start < 1.0


_PIECES = st.sampled_from(
    ["x", "y", "1", "2.5", "1e3", "e", "pi", "+", "-", "*", "/", "**", "(", ")", ",", "<", ">=", "==", " ",
     "sin(", "where(",
     "hypot(", "sqrt(", "^", ".", "[", "é", "\n"]
)  # fmt: skip


@settings(max_examples=400, deadline=None)
@given(text=st.one_of(st.lists(_PIECES, max_size=20).map("".join), st.text(max_size=40)))
def test_any_text_is_read_or_refused(text: str) -> None:
    """And what is read has a value and slope of the right shape; numpy warnings would be errors here."""
    try:
        formula = parse(text, NAMES)
    except FormulaError:
        return
    values = {"x": np.array([-1.0, 0.0, 2.0]), "y": 0.5}
    value, slope = formula.with_slope(values, "x")
    np.testing.assert_array_equal(value, formula(values))
    assert np.shape(slope) == np.shape(value) == ((3,) if "x" in formula.used else ())


_LEAVES = st.sampled_from(["x", "y", "0.7", "2"])
_TREES = st.recursive(_LEAVES, lambda inner: st.one_of(
    st.tuples(inner, st.sampled_from(["+", "-", "*"]), inner).map(lambda p: f"({p[0]}{p[1]}{p[2]})"),
    st.tuples(st.sampled_from(["sin", "tanh", "arctan", "cos"]), inner).map(lambda p: f"{p[0]}({p[1]})"),
    inner.map(lambda a: f"exp(-({a})**2)"),
    inner.map(lambda a: f"1/(1+({a})**2)"),
    st.tuples(inner, inner).map(lambda p: f"(1+({p[0]})**2)**({p[1]})"),
), max_leaves=8)  # fmt: skip


@settings(max_examples=200, deadline=None)
@given(text=_TREES, x=st.floats(-1.5, 1.5), y=st.floats(-1.5, 1.5))
def test_slopes_of_random_formulas(text: str, x: float, y: float) -> None:
    """By complex step (Squire and Trapp 1998), for formulas that Python reads alike."""
    formula = parse(text, NAMES)
    value, slope = formula.with_slope({"x": x, "y": y}, "x")
    functions = {name: getattr(np, name) for name in ANALYTIC_FUNCTIONS.split()}
    with np.errstate(all="ignore"):
        at = np.complex128(complex(x, 1e-30))
        expected = np.imag(eval(text, {"__builtins__": {}}, functions | {"x": at, "y": np.float64(y)})) / 1e-30
    if np.isfinite(slope) and np.isfinite(expected) and abs(value) < 1e100:
        assert slope == pytest.approx(expected, rel=1e-7, abs=1e-12)
