"""How kernels are compiled: without the lock, kept on disk, with numpy's division."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final, TypeVar, cast

import numba
from llvmlite import ir  # type: ignore[import-untyped]
from numba.core import types
from numba.extending import intrinsic

F = TypeVar("F", bound=Callable[..., Any])

# Fused multiply-adds alone: the other liberties would lose NaN, which means "no value" here.
_OPTIONS: Final[dict[str, Any]] = {"nogil": True, "error_model": "numpy", "fastmath": {"contract"}}


def compiled(function: F) -> F:
    """Compile a kernel when it is first called, and keep the machine code on disk where there is room."""
    try:
        return cast(F, numba.njit(cache=True, **_OPTIONS)(function))
    except RuntimeError:
        # Neither beside the module nor in the user's cache may anything be written: compiled every time.
        return cast(F, numba.njit(**_OPTIONS)(function))


def _bitcast(source: Any, target: Any, llvm: Any) -> Any:
    def retyped(typing_context: Any, value: Any) -> Any:
        def generate(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
            return builder.bitcast(arguments[0], llvm)

        return target(source), generate

    return retyped


bits_of: Any = intrinsic(_bitcast(types.float64, types.int64, ir.IntType(64)))
"""The 64 bits of a float as an integer."""

float_of: Any = intrinsic(_bitcast(types.int64, types.float64, ir.DoubleType()))
"""The float of 64 bits."""
