"""The region: a grid of cells that is handled block by block, with or without an outline."""

from geoskew.region.build import MOST_CELLS, grid_of
from geoskew.region.grid import Grid, Window

__all__ = ["MOST_CELLS", "Grid", "Window", "grid_of"]
