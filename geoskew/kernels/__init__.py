"""Compiled forms of the formulas that every cell of a large grid goes through.

Arrays and floats only. The plain numpy formulas elsewhere are the reference; these loops give the same
values to 1e-4 degrees and 1e-4 dB, and are held to that by tests. Nothing here is imported before a
job is large enough to pay for the compiler: `ready` is the door, and the modules beside it import numba.

Every kernel runs in one thread, outside of the interpreter's lock, over rows of a block. Loops are short
and touch few arrays, since the compiler's vectoriser gives up on long ones without a word.
"""

from __future__ import annotations

from functools import lru_cache
from logging import getLogger

__all__ = ["ready"]

_log = getLogger(__name__)


@lru_cache(maxsize=1)
def ready() -> bool:
    """Whether kernels can be compiled here; says so once where they cannot."""
    try:
        import numba  # noqa: F401
    except ImportError as error:
        _log.warning("numba cannot be used (%s): large grids take the slower plain path", error)
        return False
    return True
