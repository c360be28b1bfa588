"""The font of figures and PDF: DejaVu Sans out of matplotlib's package data, and what it lacks."""

from __future__ import annotations

from functools import cache
from pathlib import Path
from typing import Final

from geoskew.errors import OutputError

BOX: Final = "\N{WHITE SQUARE}"


@cache
def font_files() -> tuple[Path, Path]:
    """The regular and the bold font.

    Raises
    ------
    OutputError
        The installed matplotlib carries no such font.
    """
    import matplotlib

    folder = Path(matplotlib.get_data_path()) / "fonts" / "ttf"
    found = folder / "DejaVuSans.ttf", folder / "DejaVuSans-Bold.ttf"
    for path in found:
        if not path.is_file():
            raise OutputError(f"{path}: the font of the report is not there; install matplotlib again")
    return found


@cache
def _characters() -> frozenset[int]:
    from fontTools.ttLib import TTFont  # type: ignore[import-untyped]

    regular, bold = font_files()
    with TTFont(regular) as one, TTFont(bold) as other:
        return frozenset(one.getBestCmap()) & frozenset(other.getBestCmap())


def drawable(text: str) -> str:
    """The text on one line, with a box for each character that the font cannot draw."""
    known = _characters()
    shown = (" " if char in "\r\n\t" else char for char in text)
    return "".join(char if char.isprintable() and ord(char) in known else BOX for char in shown)


def undrawable(texts: str) -> list[str]:
    """Characters that become boxes, as U+ numbers, each once."""
    known = _characters()
    lost = dict.fromkeys(char for char in texts if char not in "\r\n\t" and ord(char) not in known)
    return [f"U+{ord(char):04X}" for char in lost]
