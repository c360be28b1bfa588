"""Maps of the report: cells in colours, labelled isolines, sites by shape, over coast and borders."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from geoskew.outputs.report.canvas import GREY, HATCHES, INK, MARKERS, as_png, figure
from geoskew.outputs.report.content import Base, Field, MapFigure, Marks
from geoskew.ramps import CLASS_COLOURS, CLASS_SHAPES, colours

# Room beside the map for degrees, below it for the legend, millimetres.
_LEFT, _RIGHT, _TOP, _BELOW = 9.0, 2.0, 2.0, 17.0
# More room below where a scale of colours and a legend of sites stand there together.
_ROW: Final = 8.0
_TALLEST: Final = 83.0
_LAND, _SEA = "#e9e5da", "#ffffff"
# Lines shorter than this share of the map's diagonal stay without a number.
_LABELLED_SHARE: Final = 0.08


def draw(content: MapFigure, width_mm: float) -> bytes:
    """The map as PNG, as wide as asked for and as tall as the region needs."""
    west, south, east, north = content.base.bounds
    stretch = 1.0 / max(np.cos(np.deg2rad(0.5 * (south + north))), 0.05)
    inner = width_mm - _LEFT - _RIGHT
    tall = inner * (north - south) * stretch / (east - west)
    if tall > _TALLEST:
        inner, tall = inner * _TALLEST / tall, _TALLEST
    both = content.shown is not None and not content.shown.layer.is_class and content.marks is not None
    below = _BELOW + (_ROW if both else 0.0)
    height = tall + _TOP + below
    left = _LEFT + 0.5 * (width_mm - _LEFT - _RIGHT - inner)
    with figure(width_mm, height) as drawn:
        axes = drawn.add_axes((left / width_mm, below / height, inner / width_mm, tall / height))
        axes.set_facecolor(_SEA)
        axes.set(xlim=(west, east), ylim=(south, north))
        axes.set_aspect(stretch)
        _ground(axes, content.base)
        if content.shown is not None:
            _cells(axes, content.shown)
        _outlines(axes, content.base)
        if content.shown is not None and not content.shown.layer.is_class:
            _lines(axes, content.shown)
            bar = drawn.add_axes((left / width_mm, (below - 9.0) / height, inner / width_mm, 2.2 / height))
            _scale(bar, content.shown)
        if content.marks is not None:
            _marks(axes, content.marks)
        _legend(drawn, content)
        _degrees(axes, content.base)
        return as_png(drawn)


def _ground(axes: Any, base: Base) -> None:
    from matplotlib.collections import PolyCollection

    axes.add_collection(PolyCollection(list(base.land), facecolor=_LAND, edgecolor="none", zorder=0))


def _outlines(axes: Any, base: Base) -> None:
    from matplotlib.collections import LineCollection

    axes.add_collection(LineCollection(list(base.land), colors=INK, linewidths=0.45, zorder=3))
    dotted = LineCollection(list(base.borders), colors=INK, linewidths=0.4, linestyles=(0, (3, 2)), zorder=3)
    axes.add_collection(dotted)


def _limits(field: Field) -> tuple[float, float]:
    return field.limits or field.layer.limits


def _ramp(name: str) -> Any:
    from matplotlib.colors import ListedColormap

    return ListedColormap(colours(name, np.linspace(0.0, 1.0, 64)) / 255.0)


def _edges(centres: np.ndarray[Any, Any]) -> tuple[float, float]:
    half = 0.5 * (centres[-1] - centres[0]) / max(len(centres) - 1, 1)
    return float(centres[0] - half), float(centres[-1] + half)


def _cells(axes: Any, field: Field) -> None:
    left, right = _edges(field.longitude)
    top, bottom = _edges(field.latitude)
    extent = (left, right, bottom, top)
    if field.layer.is_class:
        values = np.asarray(field.values)
        picture = np.zeros((*values.shape, 4))
        for code, colour in CLASS_COLOURS.items():
            picture[values == code] = [*(int(colour[i : i + 2], 16) / 255.0 for i in (1, 3, 5)), 1.0]
        axes.imshow(picture, extent=extent, interpolation="nearest", zorder=1, aspect=axes.get_aspect())
        for code, hatch in HATCHES.items():
            inside = (values == code).astype(np.float64)
            if hatch and inside.any():
                axes.contourf(
                    field.longitude,
                    field.latitude,
                    inside,
                    levels=[0.5, 1.5],
                    colors="none",
                    hatches=[hatch],
                    zorder=2,
                )
        return
    low, high = _limits(field)
    axes.imshow(
        np.ma.masked_invalid(np.asarray(field.values, dtype=np.float64)),
        extent=extent,
        cmap=_ramp(field.layer.ramp),
        vmin=low,
        vmax=high,
        interpolation="nearest",
        alpha=0.85,
        zorder=1,
        aspect=axes.get_aspect(),
    )


def _lines(axes: Any, field: Field) -> None:
    from matplotlib.collections import LineCollection

    for line in field.lines:
        style = (0, (4, 2)) if line.level < 0.0 else "solid"
        width = 1.3 if any(abs(line.level - one) < 1e-9 for one in field.thick) else 0.7
        axes.add_collection(
            LineCollection([line.points], colors=INK, linewidths=width, linestyles=style, zorder=4)
        )
    _numbers(axes, field)


def _numbers(axes: Any, field: Field) -> None:
    """The level on every line long enough, where the line is farthest from numbers already set."""
    (west, east), (south, north) = axes.get_xlim(), axes.get_ylim()
    size = np.array([east - west, north - south])
    taken: list[Any] = []
    ordered = sorted(field.lines, key=lambda one: -_length(one.points, size))
    for line in ordered:
        if _length(line.points, size) < _LABELLED_SHARE:
            continue
        share = (line.points - [west, south]) / size
        inside = np.all((share > 0.04) & (share < 0.96), axis=1)
        candidates = np.flatnonzero(inside)[:: max(1, int(inside.sum() // 40))]
        if candidates.size == 0:
            continue
        apart = [min((np.hypot(*(share[i] - other)) for other in taken), default=1.0) for i in candidates]
        best = int(candidates[int(np.argmax(apart))])
        if max(apart) < 0.07:
            continue
        taken.append(share[best])
        first, last = max(0, best - 3), min(len(line.points) - 1, best + 3)
        run = (line.points[last] - line.points[first]) * [1.0, axes.get_aspect()]
        angle = (np.rad2deg(np.arctan2(run[1], run[0])) + 90.0) % 180.0 - 90.0
        text = f"{line.level:g}".replace("-", "−")
        axes.text(
            *line.points[best],
            text,
            fontsize=6.0,
            rotation=angle,
            ha="center",
            va="center",
            zorder=5,
            clip_on=True,
            bbox={"facecolor": "#ffffff", "edgecolor": "none", "pad": 0.6, "alpha": 0.85},
        )


def _length(points: Any, size: Any) -> float:
    return float(np.sum(np.hypot(*(np.diff(points, axis=0) / size).T)))


def _scale(bar: Any, field: Field) -> None:
    low, high = _limits(field)
    bar.imshow(
        np.linspace(0.0, 1.0, 256)[np.newaxis, :],
        extent=(low, high, 0.0, 1.0),
        cmap=_ramp(field.layer.ramp),
        aspect="auto",
        alpha=0.85,
    )
    bar.set_yticks([])
    bar.tick_params(axis="x", pad=1.0)
    bar.xaxis.set_major_formatter(lambda value, _: f"{value:g}".replace("-", "−"))
    unit = {"deg": "°"}.get(field.layer.unit, field.layer.unit)
    bar.set_xlabel(f"{field.layer.name}, {unit}" if unit else field.layer.name, labelpad=1.0)


def _marks(axes: Any, marks: Marks) -> None:
    """Each site by the shape of its action, with a light rim that holds against the area's colour."""
    from matplotlib.patheffects import withStroke

    for code, _ in marks.classes:
        here = marks.codes == code
        if here.any():
            axes.plot(
                marks.longitude[here],
                marks.latitude[here],
                linestyle="none",
                zorder=6,
                path_effects=[withStroke(linewidth=1.6, foreground="#ffffff")],
                **_style(code),
            )


def _style(code: int) -> dict[str, Any]:
    marker = MARKERS[CLASS_SHAPES[code]]
    return {
        "marker": marker,
        "markersize": 3.7 if marker in "X^" else 3.0,
        "markerfacecolor": CLASS_COLOURS[code],
        "markeredgecolor": INK if marker == "|" else "#000000",
        "markeredgewidth": 1.1 if marker == "|" else 0.45,
    }


def _legend(drawn: Any, content: MapFigure) -> None:
    """Areas and sites of each class in one row of patches and shapes."""
    from matplotlib.lines import Line2D
    from matplotlib.patches import Patch

    field, marks = content.shown, content.marks
    areas = field is not None and field.layer.is_class
    classes = (
        marks.classes if marks is not None else field.layer.classes if field is not None and areas else ()
    )
    handles: list[Any] = []
    for code, name in classes:
        in_area = areas and field is not None and bool(np.any(field.values == code))
        in_marks = marks is not None and bool(np.any(marks.codes == code))
        if not (in_area or in_marks):
            continue
        parts: list[Any] = []
        if areas:
            parts.append(
                Patch(facecolor=CLASS_COLOURS[code], hatch=HATCHES[code], edgecolor=INK, linewidth=0.4)
            )
        if marks is not None:
            parts.append(Line2D([], [], linestyle="none", **_style(code)))
        handles.append((tuple(parts), name))
    if not handles:
        return
    from matplotlib.legend_handler import HandlerTuple

    drawn.legend(
        [parts for parts, _ in handles],
        [name for _, name in handles],
        loc="lower center",
        ncols=3,
        frameon=False,
        handlelength=3.4,
        handleheight=1.3,
        columnspacing=1.2,
        handletextpad=0.5,
        borderaxespad=0.1,
        handler_map={tuple: HandlerTuple(ndivide=None, pad=0.6)},
    )


def _degrees(axes: Any, base: Base) -> None:
    from matplotlib.ticker import MaxNLocator

    steps = [1, 2, 2.5, 5, 10]
    axes.xaxis.set_major_locator(MaxNLocator(4, steps=steps))
    axes.yaxis.set_major_locator(MaxNLocator(7, steps=steps))
    axes.xaxis.set_major_formatter(lambda value, _: _side((value + 180.0) % 360.0 - 180.0, "E", "W"))
    axes.yaxis.set_major_formatter(lambda value, _: _side(value, "N", "S"))
    axes.grid(visible=True, color=GREY, linewidth=0.25, linestyle=":", zorder=2.5)
    axes.tick_params(pad=1.5)


def _side(value: float, positive: str, negative: str) -> str:
    return f"{abs(value):g}°{positive if value > 0 else negative if value < 0 else ''}"
