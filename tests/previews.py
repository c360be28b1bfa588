"""Remake the previews that the README shows, from the demonstration's result in maps/southern-cone.

    .venv/bin/geoskew demo && .venv/bin/python tests/previews.py

Needs Chromium and pdftoppm. Writes maps/preview-*.png and nothing else.
"""

from __future__ import annotations

import html
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
MAPS = ROOT / "maps"
RESULT = MAPS / "southern-cone"
QUIET = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--hide-scrollbars",
)


def screenshot(page: Path, picture: Path, width: int, height: int) -> None:
    """A page as a headless browser shows it; small widths through a frame, which windows do not reach."""
    with tempfile.TemporaryDirectory() as scratch:
        frame = Path(scratch) / "frame.html"
        source = html.escape(page.resolve().as_uri(), quote=True)
        frame.write_text(
            "<!doctype html><style>body{margin:0}iframe{border:0;display:block}</style>"
            f'<iframe src="{source}" width="{width}" height="{height}"></iframe>',
            encoding="utf-8",
        )
        shot = Path(scratch) / "shot.png"
        subprocess.run(
            [
                "chromium",
                *QUIET,
                "--allow-file-access-from-files",
                f"--user-data-dir={scratch}/profile",
                f"--window-size={max(width, 600)},{height}",
                "--virtual-time-budget=15000",
                f"--screenshot={shot}",
                frame.as_uri(),
            ],
            check=True,
            capture_output=True,
        )
        from PIL import Image

        with Image.open(shot) as image:
            cut = image.convert("RGB").crop((0, 0, width, height))
            cut.quantize(128).save(picture, optimize=True)


def first_card(picture: Path) -> None:
    """The first page of the printed cards."""
    with tempfile.TemporaryDirectory() as scratch:
        subprocess.run(
            [
                "pdftoppm",
                "-r",
                "80",
                "-f",
                "1",
                "-l",
                "1",
                "-gray",
                "-png",
                RESULT / "cards.pdf",
                f"{scratch}/card",
            ],
            check=True,
        )
        from PIL import Image

        with Image.open(next(Path(scratch).glob("card*.png"))) as image:
            image.quantize(16).save(picture, optimize=True)


def contours(picture: Path) -> None:
    """Contours of skew and of the deciding margin over the base map."""
    import geopandas as gpd
    import matplotlib as mpl

    mpl.use("Agg")
    from matplotlib import pyplot as plt

    from geoskew.resources import outline

    bounds = (-78.0, -57.0, -51.0, -16.0)
    land = gpd.GeoSeries([outline("land", bounds)], crs="EPSG:4326")
    borders = gpd.GeoSeries([outline("borders", bounds)], crs="EPSG:4326")
    figure, axes = plt.subplots(1, 2, figsize=(9, 7.4), layout="constrained")
    for axis, (layer, title) in zip(
        axes,
        (
            ("skew_after", "Skew of the new satellite (deg)"),
            ("margin_untouched_rain", "Margin after, untouched, in rain (dB)"),
        ),
        strict=True,
    ):
        lines = gpd.read_file(RESULT / "contours.gpkg", layer=layer)
        land.plot(ax=axis, color="#f3efe2", edgecolor="#4a5560", linewidth=0.6)
        borders.plot(ax=axis, color="#9aa1a6", linewidth=0.5, linestyle="--")
        lines.plot(ax=axis, column="level", cmap="cividis", linewidth=1.2)
        for _, row in lines.iterrows():
            longest = max(row.geometry.geoms, key=lambda part: part.length)
            at = longest.interpolate(0.5, normalized=True)
            axis.annotate(
                f"{row.level:g}",
                (at.x, at.y),
                fontsize=7,
                ha="center",
                va="center",
                bbox={"facecolor": "white", "edgecolor": "none", "pad": 0.6, "alpha": 0.8},
            )
        axis.set(xlim=bounds[::2], ylim=bounds[1::2], title=title, facecolor="#dfe7ec")
        axis.set_aspect(1.3)
    figure.savefig(picture, dpi=90)


def main() -> int:
    """Remake all previews."""
    if not (RESULT / "fieldmap.html").is_file():
        sys.stderr.write(f"{RESULT} holds no result; run 'geoskew demo' first\n")
        return 2
    for tool in ("chromium", "pdftoppm"):
        if shutil.which(tool) is None:
            sys.stderr.write(f"{tool} is not installed\n")
            return 1
    screenshot(RESULT / "fieldmap.html", MAPS / "preview-map.png", 1280, 800)
    screenshot(RESULT / "fieldmap.html", MAPS / "preview-phone.png", 390, 844)
    first_card(MAPS / "preview-card.png")
    contours(MAPS / "preview-contours.png")
    return 0


if __name__ == "__main__":
    sys.exit(main())
