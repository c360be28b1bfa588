"""The square code (QR, ISO/IEC 18004) that carries a site's id and target as plain text."""

from __future__ import annotations

from collections.abc import Iterator
from functools import lru_cache

import segno

# Light modules that readers need around the code (ISO/IEC 18004 asks for four).
QUIET_ZONE = 4


@lru_cache(maxsize=20_000)
def modules(text: str) -> tuple[bytes, ...]:
    """The rows of dark (1) and light (0) modules; error correction level M."""
    return tuple(bytes(row) for row in segno.make(text, error="m", micro=False).matrix)


def runs(rows: tuple[bytes, ...]) -> Iterator[tuple[int, int, int]]:
    """Dark runs as (column, row, length), the quiet zone counted in."""
    for r, row in enumerate(rows):
        c = 0
        for piece in row.split(b"\x00"):
            if piece:
                yield c + QUIET_ZONE, r + QUIET_ZONE, len(piece)
            c += len(piece) + 1


def svg(text: str, *, label: str) -> str:
    """The code as one SVG path; ``label`` must be inert HTML."""
    rows = modules(text)
    side = len(rows) + 2 * QUIET_ZONE
    path = "".join(f"M{c} {r}h{n}v1h-{n}z" for c, r, n in runs(rows))
    return f"<svg viewBox='0 0 {side} {side}' role='img' aria-label='{label}'><path d='{path}'/></svg>"
