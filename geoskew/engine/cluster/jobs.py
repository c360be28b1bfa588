"""What a worker does: one tile, block by block, with the block function of every other way to compute."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from contextlib import ExitStack
from dataclasses import dataclass
from functools import lru_cache
from importlib import metadata
from typing import Any, Final

from numpy.typing import NDArray

from geoskew import __version__
from geoskew.engine.blocks import compute_block
from geoskew.engine.cluster.tiles import TileFolder, inner_windows, open_layer
from geoskew.errors import GeoskewError
from geoskew.region import Grid, Window
from geoskew.scenario import Scenario
from geoskew.situation import Inputs

# What values depend on. Both ends must have the same of each.
PACKAGES: Final = ("numpy", "scipy", "numba", "rasterio", "pyproj", "shapely", "itur")
CACHE_BYTES: Final = 64 * 1024 * 1024

Store = Callable[[str, NDArray[Any]], NDArray[Any]]


@dataclass(frozen=True)
class Job:
    """All that the tiles of a job have in common; picklable.

    Attributes
    ----------
    scenario, inputs, grid
        As for a block.
    folder : TileFolder
        Where tiles go; its names are the layers.
    store : callable
        From a layer's name and its values to what files hold of them; a function of a module.
    quantised : bool
        Whether what is stored is rounded to a power of two.
    versions : mapping of str to str
        Of the end that asks.
    """

    scenario: Scenario
    inputs: Inputs
    grid: Grid
    folder: TileFolder
    store: Store
    quantised: bool
    versions: Mapping[str, str]


@lru_cache(maxsize=1)
def versions_here() -> dict[str, str]:
    """Versions of what values depend on."""
    found = {"geoskew": __version__}
    for name in PACKAGES:
        try:
            found[name] = metadata.version(name)
        except metadata.PackageNotFoundError:
            found[name] = "none"
    return found


def compute_tile(job: Job, window: Window) -> None:
    """Compute a tile and leave it in the job's folder; nothing is sent back.

    Raises
    ------
    GeoskewError
        This worker has other versions than the end that asks.
    OutputError
        The folder is not seen here.
    """
    import rasterio

    if other := differences(job.versions, versions_here()):
        raise GeoskewError(f"a worker has other versions than this end: {other}")
    job.folder.require_seen()
    if job.folder.is_finished(window):
        return
    with rasterio.Env(GDAL_CACHEMAX=CACHE_BYTES), job.folder.writing(window) as part, ExitStack() as stack:
        files: dict[str, Any] = {}
        for inner in inner_windows(window):
            _, values = compute_block(job.scenario, job.inputs, job.grid, inner, job.folder.names)
            for name in job.folder.names:
                stored = job.store(name, values[name])
                if name not in files:
                    file = open_layer(
                        part / f"{name}.tif", job.grid, window, dtype=stored.dtype, quantised=job.quantised
                    )
                    files[name] = stack.enter_context(file)
                _put(files[name], stored, inner, window)


def _put(file: Any, stored: NDArray[Any], inner: Window, window: Window) -> None:
    from rasterio.windows import Window as RasterWindow

    place = RasterWindow(inner.column - window.column, inner.row - window.row, inner.width, inner.height)
    file.write(stored, 1, window=place)


def differences(here: Mapping[str, str], there: Mapping[str, str]) -> str:
    """What differs between two sets of versions, in words; empty where nothing does."""
    return ", ".join(
        f"{name} {there.get(name)} instead of {version}"
        for name, version in here.items()
        if there.get(name) != version
    )
