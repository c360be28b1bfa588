"""Peak memory of a raster job at 1, 10 and 100 times as many cells: each in a process of its own."""

from __future__ import annotations

import argparse
import subprocess
import sys
import tempfile
from pathlib import Path

from timing import machine

JOB = """
import resource, sys
from pathlib import Path
from layers import clear_sky
from geoskew.engine import blocks
from geoskew.layers import REGISTRY
from geoskew.outputs import raster
from geoskew.region import Grid
from geoskew.situation import prepare
size, folder, names = int(sys.argv[1]), Path(sys.argv[2]), sys.argv[3].split(",")
scenario, _ = clear_sky("southern-cone")
blocks.COMPILED_FROM_CELLS = 0
grid = Grid("EPSG:4326", -76.0, -17.0, 39.0 / size, size, size)
made = raster.write_rasters(
    blocks.pending_blocks(scenario, prepare(scenario), grid, names),
    grid=grid, layers=[REGISTRY[name] for name in names], folder=folder, tags={},
)
for path in made:
    path.unlink()
print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0)
"""


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--size", type=int, default=2048, help="rows and columns of the smallest grid [2048]")
    parser.add_argument("--names", default="skew_after,margin_untouched", help="layers, joined by commas")
    parser.add_argument("--folder", type=Path, default=Path(tempfile.gettempdir()))
    given = parser.parse_args()
    print(machine())
    first = 0.0
    for times in (1, 10, 100):
        size = round(given.size * times**0.5)
        with tempfile.TemporaryDirectory(dir=given.folder) as folder:
            done = subprocess.run(
                [sys.executable, "-c", JOB, str(size), folder, given.names],
                capture_output=True,
                text=True,
                check=True,
                cwd=Path(__file__).parent,
            )
        peak = float(done.stdout)
        first = first or peak
        print(
            f"  {size:6d} x {size:<6d} cells: {peak:7.0f} MiB at most, {peak / first:5.2f} times the smallest"
        )


if __name__ == "__main__":
    main()
