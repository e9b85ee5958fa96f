"""Values of a reference case -> laws: numbers, expressions, tables, pieces. Expressions are parsed, never evaluated as code."""

import ast
import operator
from collections.abc import Callable
from typing import Any

import numpy as np

from fem.laws import Break, Law

ZERO_C = 273.15

FUNCTIONS: dict[str, Callable[..., Any]] = {
    "sin": np.sin,
    "cos": np.cos,
    "exp": np.exp,
    "sqrt": np.sqrt,
    "log": np.log,
    "log10": np.log10,
    "atan2": np.arctan2,
}
OPERATORS: dict[type, Callable[..., Any]] = {
    ast.Add: operator.add,
    ast.Sub: operator.sub,
    ast.Mult: operator.mul,
    ast.Div: operator.truediv,
    ast.Pow: operator.pow,
    ast.USub: operator.neg,
    ast.UAdd: operator.pos,
}
VARIABLES = frozenset({"x", "y", "t", "T"})

Expression = Callable[[dict[str, Any]], Any]


def parse(text: str) -> tuple[Expression, frozenset[str]]:
    """Return a function of a dict of variables, and the variables that it needs."""
    tree = ast.parse(text.strip(), mode="eval").body
    needs = frozenset(node.id for node in ast.walk(tree) if isinstance(node, ast.Name)) & VARIABLES
    return _build(tree), needs


def _build(node: ast.expr) -> Expression:
    match node:
        case ast.Constant(value=int() | float() as number):
            return lambda v: float(number)
        case ast.Name(id="pi"):
            return lambda v: np.pi
        case ast.Name(id=name) if name in VARIABLES:
            return lambda v: v[name]
        case ast.BinOp(left=left, op=op, right=right) if type(op) in OPERATORS:
            a, b, do = _build(left), _build(right), OPERATORS[type(op)]
            return lambda v: do(a(v), b(v))
        case ast.UnaryOp(op=op, operand=operand) if type(op) in OPERATORS:
            a, do = _build(operand), OPERATORS[type(op)]
            return lambda v: do(a(v))
        case ast.Call(func=ast.Name(id=name), args=args, keywords=[]) if name in FUNCTIONS:
            parts, do = [_build(arg) for arg in args], FUNCTIONS[name]
            return lambda v: do(*(part(v) for part in parts))
    raise ValueError(f"not an expression of the schema: {ast.unparse(node)}")


def law_of(value: Any, *, celsius: bool, offset: float = 0.0) -> Law:
    """Return a value of the schema as a law in SI and kelvin.

    Parameters
    ----------
    value : float or dict
        As in the case file.
    celsius : bool
        True when T in expressions is in degrees Celsius.
    offset : float
        Added to the value: 273.15 for a temperature given in degrees Celsius.
    """
    if isinstance(value, int | float):
        number = float(value) + offset
        return Law(lambda: number)
    if "expr" in value:
        expression, needs = parse(value["expr"])
        breaks: tuple[Break, ...] = ()
    elif "table" in value:
        expression, needs, breaks = _table(value["table"])
    else:
        expression, needs, breaks = _pieces(value["piecewise"])

    def evaluate(**variables: Any) -> Any:
        if celsius and "T" in variables:
            variables["T"] = variables["T"] - ZERO_C
        with np.errstate(all="ignore"):  # a branch that is not taken may divide by zero
            return expression(variables) + offset

    return Law(evaluate, needs, breaks)


def _table(table: dict[str, Any]) -> tuple[Expression, frozenset[str], tuple[Break, ...]]:
    var, xs, ys = table["var"], np.array(table["x"], dtype=float), np.array(table["y"], dtype=float)
    breaks = tuple(Break(float(x), bool((xs == x).sum() > 1)) for x in np.unique(xs)) if var == "t" else ()
    return lambda v: np.interp(v[var], xs, ys), frozenset({var}), breaks


def _pieces(pieces: dict[str, Any]) -> tuple[Expression, frozenset[str], tuple[Break, ...]]:
    var, edges = pieces["var"], np.array(pieces["breaks"], dtype=float)
    parsed = [parse(str(text)) for text in pieces["exprs"]]
    needs = frozenset({var}).union(*(n for _, n in parsed))

    def evaluate(v: dict[str, Any]) -> Any:
        which = np.searchsorted(edges, v[var], side="right")
        branches = [np.broadcast_to(expression(v), np.shape(which)) for expression, _ in parsed]
        return np.choose(which, branches)

    return evaluate, needs, tuple(Break(float(b), True) for b in edges) if var == "t" else ()
