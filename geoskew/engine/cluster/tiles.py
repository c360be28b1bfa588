"""The folder of tiles: what is finished, what belongs to which job, and the way back to blocks."""

from __future__ import annotations

import hashlib
import json
import os
import shutil
import socket
import threading
import time
import zlib
from collections.abc import Iterator, Sequence
from contextlib import ExitStack, contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import InputError, OutputError
from geoskew.region import Grid, Window

BLOCK: Final = 512
RECORD: Final = "tile.json"
LABEL: Final = "job.json"
# A tile is one task: small enough for some thirty of them, large enough that dask's own work is nothing.
_FEWEST_TILES: Final = 32
_LARGEST_SIDE: Final = 8 * BLOCK
# Files of another machine may take a moment to be seen through a shared file system.
_SEEN_WITHIN_SECONDS: Final = 30.0
_STALE_SECONDS: Final = 3600.0


def tile_side(grid: Grid) -> int:
    """Side of a tile in cells, a multiple of the block's; by the grid alone, so that a restart agrees.

    >>> tile_side(Grid("EPSG:4326", 0.0, 0.0, 1.0, 40_000, 40_000))
    4096
    """
    side = int((grid.cells / _FEWEST_TILES) ** 0.5) // BLOCK * BLOCK
    return min(max(side, BLOCK), _LARGEST_SIDE)


@dataclass(frozen=True)
class TileFolder:
    """The tiles of one job.

    Attributes
    ----------
    path : Path
        Seen under the same name by every worker.
    label : mapping of str to str
        What tells this job from all others.
    names : tuple of str
        Layers.
    """

    path: Path
    label: dict[str, Any]
    names: tuple[str, ...]

    @classmethod
    def of(
        cls, beside: Path, *, digest: str, software: str, names: Sequence[str], grid: Grid, storage: str
    ) -> TileFolder:
        """The folder of a job beside its final files, named after the scenario and the set of layers."""
        outline = "" if grid.outline is None else hashlib.sha256(grid.outline.wkb).hexdigest()
        label = {
            "scenario_sha256": digest,
            "software": software,
            "layers": list(names),
            "storage": storage,
            "grid": [grid.crs, grid.west, grid.north, grid.step, grid.columns, grid.rows, outline],
            "tile": tile_side(grid),
        }
        return cls(beside.absolute() / f".tiles-{digest[:12]}-{_hash(label)[:12]}", label, tuple(names))

    @property
    def key(self) -> str:
        """Short mark of the job, in every tile's record."""
        return _hash(self.label)

    def prepare(self) -> None:
        """Make the folder, or take over that of an earlier try; parts of an hour ago go.

        Raises
        ------
        InputError
            The folder is that of another job.
        OutputError
            It cannot be made.
        """
        label = self.path / LABEL
        try:
            if label.exists() and _read(label) != self.label:
                raise InputError(
                    f"the folder {self.path} holds tiles of another scenario or other layers; remove it"
                )
            self.path.mkdir(parents=True, exist_ok=True)
            part = label.with_name(f"{LABEL}.part-{os.getpid()}")
            part.write_text(json.dumps(self.label, indent=1) + "\n", encoding="utf-8")
            part.replace(label)
        except OSError as error:
            raise OutputError(f"{self.path}: cannot be written: {error.strerror}") from error
        for part in self.path.glob("*.part-*"):
            if time.time() - part.stat().st_mtime > _STALE_SECONDS:
                shutil.rmtree(part, ignore_errors=True)

    def others(self) -> list[Path]:
        """Folders of tiles of other jobs that lie beside this one."""
        return sorted(path for path in self.path.parent.glob(".tiles-*") if path != self.path)

    def require_seen(self) -> None:
        """Check, on a worker, that this is the folder that the other end made.

        Raises
        ------
        OutputError
            It is not there, or is another one.
        """
        deadline = time.monotonic() + _SEEN_WITHIN_SECONDS
        while _read(self.path / LABEL) != self.label:
            if time.monotonic() > deadline:
                raise OutputError(
                    f"the worker on {socket.gethostname()} does not see the folder {self.path}: workers need "
                    "the folder of results under the same name, on a file system that all share"
                )
            time.sleep(0.2)

    def place(self, window: Window) -> Path:
        """Folder of one tile."""
        return self.path / f"row{window.row}-column{window.column}"

    def is_finished(self, window: Window) -> bool:
        """Whether a tile is there as a whole, and this job's."""
        record = _read(self.place(window) / RECORD)
        if record is None or record.get("job") != self.key:
            return False
        sizes = record.get("bytes", {})
        return set(sizes) == set(self.names) and all(
            _size(self.place(window) / f"{name}.tif") == size for name, size in sizes.items()
        )

    def wait_for(self, window: Window) -> None:
        """Wait until a tile that a worker reports as finished is seen here.

        Raises
        ------
        OutputError
            It does not come.
        """
        deadline = time.monotonic() + _SEEN_WITHIN_SECONDS
        while not self.is_finished(window):
            if time.monotonic() > deadline:
                raise OutputError(
                    f"{self.place(window)}: a worker finished this tile, but it is not seen here: "
                    "the folder of results must lie on a file system that all workers share"
                )
            time.sleep(0.2)

    @contextmanager
    def writing(self, window: Window) -> Iterator[Path]:
        """Give a folder to write a tile's files to; it becomes the tile at the end of the body."""
        final = self.place(window)
        mark = f"{socket.gethostname()}-{os.getpid()}-{threading.get_ident()}"
        part = final.with_name(f"{final.name}.part-{mark}")
        try:
            part.mkdir()
            yield part
            sizes = {name: _size(part / f"{name}.tif") for name in self.names}
            sums = {name: zlib.crc32((part / f"{name}.tif").read_bytes()) for name in self.names}
            record = {"job": self.key, "bytes": sizes, "crc32": sums}
            (part / RECORD).write_text(json.dumps(record, indent=1) + "\n", encoding="utf-8")
            if not self.is_finished(window):  # else a twin of this job was quicker
                shutil.rmtree(final, ignore_errors=True)
                part.rename(final)
        finally:
            shutil.rmtree(part, ignore_errors=True)

    def blocks(self, window: Window) -> Iterator[tuple[Window, dict[str, NDArray[Any]]]]:
        """The blocks of a finished tile: NaN = no value, classes uint8 with 255.

        Raises
        ------
        OutputError
            A file is damaged.
        """
        import rasterio
        from rasterio.errors import RasterioError
        from rasterio.windows import Window as RasterWindow

        place = self.place(window)
        sums = (_read(place / RECORD) or {}).get("crc32", {})
        try:
            if any(zlib.crc32((place / f"{name}.tif").read_bytes()) != sums[name] for name in self.names):
                raise OutputError(
                    f"{place}: a file was changed or is damaged; remove this folder and run again"
                )
            with ExitStack() as stack:
                sources = {
                    name: stack.enter_context(rasterio.open(place / f"{name}.tif")) for name in self.names
                }
                for inner in inner_windows(window):
                    at = RasterWindow(
                        inner.column - window.column, inner.row - window.row, inner.width, inner.height
                    )
                    yield inner, {name: source.read(1, window=at) for name, source in sources.items()}
        except (RasterioError, OSError, KeyError) as error:
            if isinstance(error, OutputError):
                raise
            raise OutputError(
                f"{place}: cannot be read back ({error}); remove this folder and run again"
            ) from error

    def remove(self) -> None:
        """Remove all tiles, parts included."""
        shutil.rmtree(self.path, ignore_errors=True)


def inner_windows(window: Window) -> Iterator[Window]:
    """The blocks of a tile."""
    for row in range(window.row, window.row + window.height, BLOCK):
        for column in range(window.column, window.column + window.width, BLOCK):
            yield Window(
                row,
                column,
                min(BLOCK, window.row + window.height - row),
                min(BLOCK, window.column + window.width - column),
            )


def open_layer(path: Path, grid: Grid, window: Window, *, dtype: np.dtype[Any], quantised: bool) -> Any:
    """A GeoTIFF of one layer of one tile, open for writing; where it lies on Earth is in it."""
    import rasterio

    a, b, c, d, e, f = grid.transform
    here = rasterio.Affine(a, b, c + a * window.column, d, e, f + e * window.row)
    whole = dtype == np.uint8
    return rasterio.open(
        path,
        "w",
        driver="GTiff",
        width=window.width,
        height=window.height,
        count=1,
        dtype=dtype.name,
        crs=grid.crs,
        transform=here,
        nodata=255 if whole else float("nan"),
        tiled=True,
        blockxsize=BLOCK,
        blockysize=BLOCK,
        compress="ZSTD",
        zstd_level=1,
        predictor=1 if whole else 2 if quantised else 3,
    )


def _hash(label: dict[str, Any]) -> str:
    return hashlib.sha256(json.dumps(label, sort_keys=True).encode()).hexdigest()


def _read(path: Path) -> Any:
    """A record; none where there is none, or none that can be read."""
    try:
        return json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None


def _size(path: Path) -> int:
    try:
        return path.stat().st_size
    except OSError:
        return -1
