"""The final file of a layer: one copy of its work file, read back and compared."""

from __future__ import annotations

import math
from pathlib import Path

from geoskew.errors import InputError, OutputError
from geoskew.outputs.raster.overviews import TILE
from geoskew.outputs.raster.scratch import Block, Scratch, checksum

_PREDICTORS = {1: "NO", 2: "STANDARD", 3: "FLOATING_POINT"}
_CODECS = ("DEFLATE", "ZSTD")


def finish(scratch: Scratch, part: Path, *, compress: str = "DEFLATE", threads: int = 1) -> None:
    """Make a layer's cloud-optimised GeoTIFF of its filled work file, and remove that.

    Raises
    ------
    InputError
        The codec is not offered.
    OutputError
        Blocks are missing, or the file reads back differently from what was written.
    """
    from rasterio.shutil import copy

    if compress not in _CODECS:
        raise InputError(f"compression {compress!r} is unknown; give one of {', '.join(_CODECS)}")
    scratch.close()
    copy(
        scratch.joined(),
        part,
        driver="COG",
        compress=compress,
        predictor=_PREDICTORS[scratch.storage.predictor],
        blocksize=TILE,
        overviews="AUTO",  # those of the work files
        statistics="AUTO",  # the exact ones of the work file, where there are any
        bigtiff="IF_SAFER",
        num_threads=str(threads),
    )
    verify(part, scratch)
    scratch.remove()


def verify(path: Path, scratch: Scratch) -> None:
    """Reopen a finished file and compare every block and what describes them with what was meant.

    Validators look at the layout alone; values are compared through their checksums.

    Raises
    ------
    OutputError
        Something differs.
    """
    import rasterio

    layer, grid, storage = scratch.layer, scratch.grid, scratch.storage
    with rasterio.open(path) as dataset:
        nodata = dataset.nodata
        same_nodata = nodata is not None and (
            nodata == storage.nodata or (math.isnan(storage.nodata) and math.isnan(nodata))
        )
        meant = {
            "size": dataset.shape == (grid.rows, grid.columns),
            "type": dataset.dtypes == (storage.dtype,),
            "position": tuple(dataset.transform)[:6] == tuple(grid.transform)[:6],
            "coordinate system": dataset.crs == rasterio.CRS.from_user_input(grid.crs),
            "nodata": same_nodata,
            "description": dataset.descriptions == (layer.title,),
            "unit": (dataset.units[0] or "") == layer.unit,
        }
        wrong = [what for what, right in meant.items() if not right]
        if not wrong and not all(_reads_back(dataset, block) for block in scratch.blocks):
            wrong = ["values"]
    if wrong:
        raise OutputError(
            f"layer {layer.name}: the finished file reads back with another {' and '.join(wrong)} "
            "than was written; check the disk and run again"
        )


def _reads_back(dataset: object, block: Block) -> bool:
    from rasterio.windows import Window as RasterWindow

    window = RasterWindow(block.column, block.row, block.width, block.height)
    return checksum(dataset.read(1, window=window)) == block.checksum  # type: ignore[attr-defined]
