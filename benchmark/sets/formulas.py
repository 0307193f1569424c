"""Formulas of derived values: + - * / ** and names of the same set, never evaluated as code (layer 2)."""

from __future__ import annotations

import ast
import warnings
from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

__all__ = ["FormulaError", "evaluate_formula", "names_in"]

_MAX_LENGTH = 400


class FormulaError(ValueError):
    """The formula uses something that is not allowed, or a name the set does not have."""


def evaluate_formula(text: str, values: Mapping[str, NDArray[np.float64]]) -> NDArray[np.float64]:
    """Evaluate a formula over SI values.

    Raises
    ------
    FormulaError
        With the reason, in words.
    """
    if len(text) > _MAX_LENGTH:
        message = f"is longer than {_MAX_LENGTH} characters"
        raise FormulaError(message)
    try:
        tree = _parsed(text)
        with np.errstate(all="raise"):
            found = np.atleast_1d(np.asarray(_walk(tree.body, values), dtype=np.float64))
    except (SyntaxError, ValueError, RecursionError, MemoryError) as error:
        if isinstance(error, FormulaError):
            raise
        message = "is not an arithmetic expression"
        raise FormulaError(message) from error
    except (ArithmeticError, FloatingPointError) as error:
        message = "cannot be computed with these values"
        raise FormulaError(message) from error
    if not np.all(np.isfinite(found)):  # a number too large to be one
        message = "cannot be computed with these values"
        raise FormulaError(message)
    return found


def _parsed(text: str) -> ast.Expression:
    """Read an expression; what Python only warns about is no arithmetic either."""
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        return ast.parse(text, mode="eval")


def names_in(text: str) -> frozenset[str]:
    """Return the names a formula uses; none when it cannot be read."""
    try:
        tree = _parsed(text[:_MAX_LENGTH])
    except (SyntaxError, ValueError, RecursionError, MemoryError):
        return frozenset()
    return frozenset(node.id for node in ast.walk(tree) if isinstance(node, ast.Name))


def _walk(node: ast.AST, values: Mapping[str, NDArray[np.float64]]) -> NDArray[np.float64]:
    if isinstance(node, ast.Constant) and isinstance(node.value, (int, float)) and not isinstance(node.value, bool):
        return np.asarray(float(node.value))
    if isinstance(node, ast.Name):
        if node.id not in values:
            message = f"uses {node.id!r}, which the set does not have"
            raise FormulaError(message)
        return values[node.id]
    if isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.USub):
        return -_walk(node.operand, values)
    if isinstance(node, ast.BinOp):
        left, right = _walk(node.left, values), _walk(node.right, values)
        if isinstance(node.op, ast.Add):
            return left + right
        if isinstance(node.op, ast.Sub):
            return left - right
        if isinstance(node.op, ast.Mult):
            return left * right
        if isinstance(node.op, ast.Div):
            return left / right
        if isinstance(node.op, ast.Pow):
            return np.asarray(left**right)
    message = "may use only names, numbers and + - * / **"
    raise FormulaError(message)
