"""One matplotlib figure as PNG: fixed fonts, no window, the same bytes for the same content."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from io import BytesIO
from typing import Any, Final

from geoskew.outputs.report.glyphs import font_files

DOTS_PER_INCH: Final = 180
MM: Final = 1.0 / 25.4
INK, GREY = "#1b1b1f", "#6b6a66"
# Hatching a class code, so that areas tell apart without colour; doubled letters are denser.
HATCHES: Final[dict[int, str]] = {0: "", 1: "....", 2: "////", 3: "xxxx", 4: "----", 5: "||||"}
# Markers of matplotlib for the shapes of `geoskew.ramps.CLASS_SHAPES`.
MARKERS: Final[dict[str, str]] = {
    "dot": "o",
    "square": "s",
    "triangle": "^",
    "diamond": "D",
    "cross": "X",
    "bar": "|",
}

_SETTINGS: Final[dict[str, Any]] = {
    "font.family": "DejaVu Sans",
    "font.size": 7.0,
    "axes.linewidth": 0.5,
    "xtick.major.width": 0.5,
    "ytick.major.width": 0.5,
    "xtick.major.size": 2.5,
    "ytick.major.size": 2.5,
    "xtick.labelsize": 6.5,
    "ytick.labelsize": 6.5,
    "legend.fontsize": 6.5,
    "hatch.linewidth": 0.45,
    # a dollar sign in the name of a crew is no formula
    "text.parse_math": False,
    "text.color": INK,
    "axes.edgecolor": INK,
    "axes.labelcolor": INK,
}


@contextmanager
def figure(width_mm: float, height_mm: float) -> Iterator[Any]:
    """Give an empty figure of a size in millimetres; settings of the user's own matplotlib do not count."""
    import matplotlib
    from matplotlib import font_manager
    from matplotlib.figure import Figure

    with matplotlib.rc_context():
        matplotlib.rcdefaults()
        parameters: Any = matplotlib.rcParams  # its keys are typed as a list of hundreds of words
        parameters.update(_SETTINGS)
        for path in font_files():
            font_manager.fontManager.addfont(path)
        yield Figure(figsize=(width_mm * MM, height_mm * MM), dpi=DOTS_PER_INCH)


def as_png(drawn: Any) -> bytes:
    """The figure as PNG, without a word on who made it or when."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from PIL import Image

    canvas: Any = FigureCanvasAgg(drawn)
    canvas.draw()
    width, height = canvas.get_width_height()
    picture = Image.frombytes("RGBA", (width, height), bytes(canvas.buffer_rgba())).convert("RGB")
    packed = BytesIO()
    picture.save(packed, "PNG", compress_level=9, dpi=(DOTS_PER_INCH, DOTS_PER_INCH))
    return packed.getvalue()
