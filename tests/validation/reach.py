"""Which public functions that compute numbers an outside check reached: measured, not listed by hand.

Public: in ``__all__`` of a module of the packages below. A function computes numbers when its stated result holds some
(floats, whole numbers or arrays, also inside a data class or a container); one that answers with words, a yes or no, or
an object that only computes later is none. Reached: called while a check obtained its number. That is less
than "would have noticed an error": the tests of the published rows spoil functions one by one for that.
"""

from __future__ import annotations

import collections.abc
import contextlib
import dataclasses
import importlib
import inspect
import pkgutil
import sys
import types
import typing
from collections.abc import Callable, Iterator, Mapping, Sequence
from types import CodeType
from typing import Any

import numpy as np
import numpy.typing

__all__ = ["PACKAGES", "first_call", "public_functions", "recorded"]

PACKAGES = ("physics", "devices", "circuits", "draws", "decide", "evaluate")


def _modules(package: str) -> Iterator[types.ModuleType]:
    root = importlib.import_module(f"benchmark.{package}")
    yield root
    for info in pkgutil.walk_packages(root.__path__, f"{root.__name__}."):
        yield importlib.import_module(info.name)


def _holds_numbers(hint: Any, seen: frozenset[Any] = frozenset()) -> bool:
    """Whether a type is, or holds, a number."""
    origin = typing.get_origin(hint)
    if origin is np.ndarray:
        return "bool" not in str(hint)
    if origin is Callable:  # a function that is handed out computes later
        return False
    if origin is not None:
        return any(_holds_numbers(part, seen) for part in typing.get_args(hint))
    if not inspect.isclass(hint) or hint in seen or hint in (bool, np.bool_):
        return False
    if issubclass(hint, (int, float, complex, np.number, np.ndarray)):
        return True
    if not hint.__module__.startswith("benchmark.") or not (dataclasses.is_dataclass(hint) or issubclass(hint, tuple)):
        return False
    return any(_holds_numbers(part, seen | {hint}) for part in _hints(hint).values())


def _hints(item: Any) -> dict[str, Any]:
    """Return type hints of a function or class; a name that only a type checker imports counts as any type."""
    names: dict[str, Any] = {"np": np}
    for _ in range(20):
        try:
            return typing.get_type_hints(item, {**names, **vars(sys.modules[item.__module__])})
        except NameError as error:
            name = str(error.name)
            names[name] = getattr(collections.abc, name, getattr(numpy.typing, name, Any))
    message = f"{item.__module__}.{item.__qualname__}: type hints cannot be read"
    raise TypeError(message)


def public_functions() -> dict[str, types.FunctionType]:
    """Return 'package.module:function' -> every public function that computes numbers."""
    found: dict[str, types.FunctionType] = {}
    for package in PACKAGES:
        for module in _modules(package):
            for name in getattr(module, "__all__", ()):
                item = getattr(module, name)
                plain = inspect.unwrap(item) if callable(item) else item
                if not inspect.isfunction(plain) or plain.__module__ != module.__name__:
                    continue
                if _holds_numbers(_hints(plain).get("return")):
                    found[f"{module.__name__.removeprefix('benchmark.')}:{name}"] = plain
    return dict(sorted(found.items()))


#: name -> function and its own code, while it waits for its first call
_waiting: dict[str, tuple[types.FunctionType, CodeType]] = {}


def first_call(name: str, args: Sequence[Any], kwargs: Mapping[str, Any]) -> Any:
    """Give a function its own code back and call it."""
    function, code = _waiting.pop(name)
    function.__code__ = code
    return function(*args, **kwargs)


def _noting(name: str) -> CodeType:
    """Return code that takes any arguments and asks for ``first_call``."""
    text = f"def noted(*args, **kwargs):\n    from {__name__} import first_call\n"
    place: dict[str, Any] = {}
    exec(text + f"    return first_call({name!r}, args, kwargs)\n", place)
    code: CodeType = place["noted"].__code__
    return code


def _forget_results() -> None:
    """Empty every cache of the package: a remembered result is no call."""
    for name, module in list(sys.modules.items()):
        if name.startswith("benchmark."):
            for item in list(vars(module).values()):
                if callable(clear := getattr(item, "cache_clear", None)):
                    clear()


@contextlib.contextmanager
def recorded(functions: Mapping[str, types.FunctionType]) -> Iterator[set[str]]:
    """Collect the names of the functions called inside the block; the set is complete at its end.

    Each function waits with other code, which notes the first call and puts the own code back: a trace of every call
    doubles the time.
    """
    reached: set[str] = set()
    _forget_results()
    for name, function in functions.items():
        _waiting[name] = function, function.__code__
        function.__code__ = _noting(name)
    try:
        yield reached
    finally:
        reached |= set(functions) - set(_waiting)
        for function, code in _waiting.values():
            function.__code__ = code
        _waiting.clear()
