"""The crews' load over the days as bars: colour, lightness and hatching tell the crews apart."""

from __future__ import annotations

from datetime import timedelta
from typing import Any, Final

import numpy as np

from geoskew.outputs.report.canvas import GREY, INK, as_png, figure
from geoskew.outputs.report.content import LoadFigure
from geoskew.outputs.report.glyphs import drawable

_HEIGHT: Final = 52.0
# More crews than these are drawn as one.
_MOST_CREWS: Final = 6
_FILLS: Final = (
    ("#14375e", ""),
    ("#e0a02e", "////"),
    ("#a9c9b4", ""),
    ("#b5402f", "xxxx"),
    ("#f4f2ec", "...."),
    ("#8a4f9e", "----"),
    ("#c9c7c0", "||||"),
)


def draw(content: LoadFigure, width_mm: float) -> bytes:
    """The bars as PNG."""
    names, visits = _gathered(content)
    first = content.days[0]
    at = np.array([(day - first).days for day in content.days], dtype=np.float64)
    with figure(width_mm, _HEIGHT) as drawn:
        axes = drawn.add_axes((9.0 / width_mm, 17.0 / _HEIGHT, (width_mm - 11.0) / width_mm, 31.0 / _HEIGHT))
        below = np.zeros(len(at))
        for (colour, hatch), name, row in zip(_FILLS, names, visits, strict=False):
            axes.bar(
                at,
                row,
                0.8,
                bottom=below,
                label=drawable(name),
                color=colour,
                hatch=hatch,
                edgecolor=INK,
                linewidth=0.4,
            )
            below = below + row
        moment = (content.changeover - first).days
        axes.axvline(moment - 0.5, color=INK, linewidth=1.0, linestyle=(0, (4, 2)))
        axes.annotate("changeover", (moment - 0.5, 1.0), xycoords=("data", "axes fraction"), xytext=(-2, 2),
                      textcoords="offset points", ha="center", va="bottom", fontsize=6.5)  # fmt: skip
        _axes(axes, content, max(float(at.max()), moment), float(below.max()))
        drawn.legend(
            loc="lower center", ncols=min(len(names), 4), frameon=False, borderaxespad=0.1, handlelength=2.4
        )
        return as_png(drawn)


def _gathered(content: LoadFigure) -> tuple[list[str], np.ndarray[Any, Any]]:
    """Crews by the number of their visits; those beyond the most that can be told apart as one."""
    order = np.argsort(-content.visits.sum(axis=1), kind="stable")
    kept = sorted(order[:_MOST_CREWS] if len(order) > _MOST_CREWS + 1 else order)
    rest = sorted(set(order.tolist()) - set(kept))
    names = [content.crews[one] for one in kept]
    rows = [content.visits[one] for one in kept]
    if rest:
        names.append(f"{len(rest)} other crews")
        rows.append(content.visits[rest].sum(axis=0))
    return names, np.asarray(rows)


def _axes(axes: Any, content: LoadFigure, last: float, most: float) -> None:
    from matplotlib.ticker import MaxNLocator

    first = content.days[0]
    axes.set_xlim(-0.7, last + 0.7)
    axes.set_ylim(0.0, most * 1.08 + 0.5)
    axes.set_ylabel("visits a day", labelpad=2.0)
    axes.yaxis.set_major_locator(MaxNLocator(5, integer=True))
    axes.xaxis.set_major_locator(MaxNLocator(9, integer=True))
    axes.xaxis.set_major_formatter(lambda value, _: f"{first + timedelta(days=round(value)):%d %b}")
    axes.set_xlabel(f"day ({first:%Y})", labelpad=1.0)
    axes.grid(visible=True, axis="y", color=GREY, linewidth=0.25, linestyle=":")
    axes.set_axisbelow(True)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
