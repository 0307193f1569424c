"""Lines of arithmetic: symbol = formula = numbers put in = result with unit (layer 10).

Every number is printed with six significant digits in SI, so that a reader with a pocket calculator gets every result
from the line itself, within rounding.
"""

from __future__ import annotations

import ast
import math
import re
from collections.abc import Callable

__all__ = ["Sheet", "shown"]

_NAME = re.compile(r"[A-Za-z_]\w*")
#: a longer line is broken before its second and third equals sign
LONGEST = 100


def _largest(*numbers: float) -> float:
    return math.nan if any(math.isnan(number) for number in numbers) else max(numbers)


def _smallest(*numbers: float) -> float:
    return math.nan if any(math.isnan(number) for number in numbers) else min(numbers)


def _logarithm(number: float) -> float:
    return math.log(number) if number > 0.0 else math.nan


_FUNCTIONS: dict[str, Callable[..., float]] = {"max": _largest, "min": _smallest, "ln": _logarithm}


def shown(value: float, digits: int = 6) -> str:
    """Print a number with significant digits; what is no number is said in words."""
    return "not-a-number" if math.isnan(value) else f"{value:.{digits}g}"


def _with_unit(text: str, unit: str) -> str:
    return text if unit == "1" else f"{text} {unit}"


def _value(node: ast.expr, values: dict[str, float]) -> float:
    if isinstance(node, ast.Constant):
        return float(node.value)  # type: ignore[arg-type]
    if isinstance(node, ast.Name):
        return values[node.id]
    if isinstance(node, ast.Call) and isinstance(node.func, ast.Name):
        return float(_FUNCTIONS[node.func.id](*(_value(item, values) for item in node.args)))
    if isinstance(node, ast.BinOp):
        left, right = _value(node.left, values), _value(node.right, values)
        if isinstance(node.op, ast.Add):
            return left + right
        if isinstance(node.op, ast.Sub):
            return left - right
        if isinstance(node.op, ast.Mult):
            return left * right
        if isinstance(node.op, ast.Div):
            return left / right if right else math.nan
        if isinstance(node.op, ast.Pow):
            return float(left**right)
    message = f"no arithmetic: {ast.dump(node)}"
    raise ValueError(message)


class Sheet:
    """Collects lines; remembers the full-precision value of every symbol and how it was printed."""

    def __init__(self) -> None:
        self.lines: list[str] = []
        self.values: dict[str, float] = {}
        self.printed: dict[str, str] = {}

    def text(self, line: str = "") -> None:
        """Add a line of words."""
        self.lines.append(line)

    def given(self, symbol: str, value: float, unit: str, meaning: str, digits: int = 6) -> None:
        """Add a number that comes from a record, a set or a study."""
        self.values[symbol], self.printed[symbol] = value, shown(value, digits)
        self.lines.append(f"  {symbol} = {_with_unit(self.printed[symbol], unit)}    {meaning}")

    def result(self, symbol: str, formula: str, unit: str, meaning: str = "") -> float:
        """Add a formula over earlier symbols with numbers put in; returns the result in full precision."""
        value = _value(ast.parse(formula, mode="eval").body, self.values)
        numbers = _NAME.sub(lambda found: self._number(found.group()), formula)
        self.values[symbol], self.printed[symbol] = value, shown(value)
        parts = [formula, *([numbers] if numbers != formula else []), _with_unit(shown(value), unit)]
        line = f"  {symbol} = {' = '.join(parts)}"
        if len(line) > LONGEST:
            line = f"  {symbol} = " + f"\n  {' ' * len(symbol)} = ".join(parts)
        self.lines += f"{line}{'    ' if meaning else ''}{meaning}".split("\n")
        return value

    def _number(self, name: str) -> str:
        if name in _FUNCTIONS:
            return name
        text = self.printed[name]
        return f"({text})" if text.startswith("-") else text
