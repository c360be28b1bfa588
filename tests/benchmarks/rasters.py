"""A whole raster job against writing the same arrays.

`job` computes and writes; `writing` gives the same writer the arrays ready made; `fastest` is the quickest way
known here to end in equally valid files: each layer whole in memory, overviews by numpy, one copy by the
library's driver for cloud-optimised files, as many layers at a time as there are workers, read back and compared.
"""

from __future__ import annotations

import argparse
import os
import shutil
import tempfile
import zlib
from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any

import numpy as np
import rasterio
from layers import clear_sky
from numpy.typing import NDArray
from rasterio.io import MemoryFile
from rasterio.shutil import copy
from timing import Times, machine, rounds

from geoskew.engine import blocks as engine
from geoskew.layers import REGISTRY
from geoskew.outputs import raster
from geoskew.outputs.raster.overviews import TILE, halvings, levels
from geoskew.outputs.raster.storage import encode, storage_of
from geoskew.region import Grid
from geoskew.situation import prepare

PREDICTORS = {1: "NO", 2: "STANDARD", 3: "FLOATING_POINT"}


def main() -> None:
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--size", type=int, default=4096, help="rows and columns [4096]")
    parser.add_argument("--rounds", type=int, default=5)
    parser.add_argument("--layers", type=int, default=0, help="only the first so many layers [all]")
    parser.add_argument("--compress", default="DEFLATE")
    parser.add_argument("--folder", type=Path, default=Path(tempfile.gettempdir()))
    given = parser.parse_args()
    scenario, names = clear_sky("southern-cone")
    names = names[: given.layers or None]
    inputs = prepare(scenario)
    grid = Grid("EPSG:4326", -76.0, -17.0, 39.0 / 4096, given.size, given.size)
    engine.COMPILED_FROM_CELLS = 0  # type: ignore[misc]
    records = [REGISTRY[name] for name in names]
    folder = Path(tempfile.mkdtemp(prefix="geoskew-benchmark-", dir=given.folder))
    ready = folder / "arrays"
    ready.mkdir()
    # Ready-made arrays lie on disk, in the page cache: memory would not hold them all.
    arrays: dict[str, NDArray[Any]] = {}
    for window, make in engine.pending_blocks(scenario, inputs, grid, names):
        for name, values in make().items():
            if name not in arrays:
                arrays[name] = np.lib.format.open_memmap(
                    ready / f"{name}.npy", "w+", values.dtype, grid.shape
                )
            rows, columns = (
                slice(window.row, window.row + window.height),
                slice(window.column, window.column + window.width),
            )
            arrays[name][rows, columns] = values

    def write(source: Any, workers: int) -> None:
        out = folder / "out"
        out.mkdir()
        raster.write_rasters(
            source, grid=grid, layers=records, folder=out, tags={}, compress=given.compress, workers=workers
        )
        shutil.rmtree(out)

    def stored() -> Iterator[tuple[Any, Any]]:
        for window in grid.windows():
            rows, columns = (
                slice(window.row, window.row + window.height),
                slice(window.column, window.column + window.width),
            )
            yield window, {name: np.asarray(arrays[name][rows, columns]) for name in names}

    def fastest_one(name: str, out: Path) -> None:
        layer = REGISTRY[name]
        storage = storage_of(layer)
        values = encode(np.asarray(arrays[name]), layer, storage)
        profile = {
            "driver": "GTiff",
            "count": 1,
            "dtype": storage.dtype,
            "crs": grid.crs,
            "nodata": storage.nodata,
        }
        factors = halvings(*values.shape)
        with MemoryFile() as base:
            files = []
            for factor, array in zip(
                [1, *factors], [values, *levels(values, storage, len(factors))], strict=True
            ):
                memory = MemoryFile() if factor > 1 else base
                transform = rasterio.Affine(*grid.transform) @ rasterio.Affine.scale(factor)
                tiles = {"tiled": True, "blockxsize": TILE, "blockysize": TILE}
                with memory.open(
                    height=array.shape[0], width=array.shape[1], transform=transform, **profile, **tiles
                ) as file:
                    file.write(array, 1)
                files.append(memory)
            vrt = out / f"{name}.vrt"
            copy(base.name, vrt, driver="VRT")
            pieces = "".join(
                f"<Overview><SourceFilename>{one.name}</SourceFilename><SourceBand>1</SourceBand></Overview>"
                for one in files[1:]
            )
            vrt.write_text(vrt.read_text().replace("</VRTRasterBand>", pieces + "</VRTRasterBand>"))
            copy(
                vrt,
                out / f"{name}.tif",
                driver="COG",
                compress=given.compress,
                predictor=PREDICTORS[storage.predictor],
                blocksize=TILE,
                overviews="AUTO",
                statistics="YES",
                num_threads="1",
            )
            for one in files[1:]:
                one.close()
        with rasterio.open(out / f"{name}.tif") as file:
            if zlib.crc32(file.read(1).view(np.uint8).data) != zlib.crc32(values.view(np.uint8).data):
                raise SystemExit(f"{name} reads back differently")

    def fastest(workers: int) -> None:
        out = folder / "out"
        out.mkdir()
        with ThreadPoolExecutor(workers) as pool:
            list(pool.map(lambda name: fastest_one(name, out), names))
        shutil.rmtree(out)

    both = os.cpu_count() or 1
    print(machine())
    print(
        f"{len(names)} layers of {given.size} x {given.size} cells, {given.compress}, {given.rounds} rounds"
    )
    try:
        times = rounds(
            {
                "job": lambda: write(engine.pending_blocks(scenario, inputs, grid, names), both),
                "writing": lambda: write(stored(), both),
                "fastest": lambda: fastest(both),
                "job, 1 worker": lambda: write(engine.pending_blocks(scenario, inputs, grid, names), 1),
                "computing": lambda: [
                    make() for _, make in engine.pending_blocks(scenario, inputs, grid, names)
                ].clear(),
            },
            given.rounds,
            warm=False,
        )
    finally:
        shutil.rmtree(folder)
    cells = grid.cells * len(names)
    for name, one in times.items():
        print(
            f"  {name:20s} {one.wall / cells * 1e9:8.2f} ns per layer and cell wall {one.cpu / cells * 1e9:8.2f} cpu"
        )

    def tell(what: str, one: Times, other: Times) -> None:
        print(f"  {what:40s} {one.over(other)}")

    tell("job over writing the same arrays", times["job"], times["writing"])
    tell("job over the fastest writing", times["job"], times["fastest"])
    tell("one worker over all", times["job, 1 worker"], times["job"])


if __name__ == "__main__":
    main()
