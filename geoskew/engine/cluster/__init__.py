"""Past one machine: tiles of a region as jobs on dask.distributed, each left as files of its own.

A job runs the block function of every other way to compute, and leaves its tile whole or not at all, in
a folder that is named after the scenario and the layers. So whatever is lost on the way, a worker, the
scheduler or the program that asked, the same command goes on with what is missing.
"""

from geoskew.engine.cluster.clients import require_address, session
from geoskew.engine.cluster.collect import cluster_blocks
from geoskew.engine.cluster.jobs import Job, compute_tile
from geoskew.engine.cluster.tiles import TileFolder, tile_side

__all__ = [
    "Job",
    "TileFolder",
    "cluster_blocks",
    "compute_tile",
    "require_address",
    "session",
    "tile_side",
]
