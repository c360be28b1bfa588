"""A smooth surface over a plane: bicubic B-splines on a square lattice, fitted with least bending.

The surface is the finite-element form of the thin plate: among all surfaces on the lattice the one
with the least bending energy ∫(f_xx² + 2·f_xy² + f_yy²) that goes through the data (H. Inoue, "A
least-squares smooth fitting for irregularly spaced data: finite-element approach using the cubic
B-spline basis", Geophysics 51, 1986; the energy is that of I. C. Briggs, "Machine contouring using
minimum curvature", Geophysics 39, 1974). Its first and second derivatives are continuous everywhere,
so that it looks smooth at any resolution.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

# Bending against misfit: the data weigh 1 each, a few to a lattice step. Small enough that levels are
# met to some thousandths of a dB, large enough for a well-conditioned system.
BENDING: Final = 1e-4


@dataclass(frozen=True)
class Lattice:
    """A square lattice of B-spline coefficients: west and south edge, step, numbers of coefficients."""

    west: float
    south: float
    step: float
    columns: int
    rows: int

    @classmethod
    def over(cls, bounds: tuple[float, float, float, float], step: float) -> Lattice:
        """Cover bounds (west, south, east, north) with cells of one step."""
        west, south, east, north = bounds
        cells_x = int(np.ceil((east - west) / step)) + 1
        cells_y = int(np.ceil((north - south) / step)) + 1
        return cls(west, south, step, cells_x + 3, cells_y + 3)

    @property
    def east(self) -> float:
        """East edge of the supported rectangle."""
        return self.west + self.step * (self.columns - 3)

    @property
    def north(self) -> float:
        """North edge of the supported rectangle."""
        return self.south + self.step * (self.rows - 3)

    def nodes(self, *, per_step: int = 1) -> tuple[Array, Array]:
        """Coordinates x (1, W) and y (H, 1) of a regular raster over the supported rectangle."""
        x = self.west + self.step * np.arange((self.columns - 3) * per_step + 1) / per_step
        y = self.south + self.step * np.arange((self.rows - 3) * per_step + 1) / per_step
        return x[None, :], y[:, None]


def cubic_weights(offset: Array) -> Array:
    """The four cubic B-splines that reach into a cell, at offsets 0 to 1 in it: (..., 4)."""
    t = offset[..., None]
    s = 1.0 - t
    return (
        np.concatenate([s**3, 3.0 * t**3 - 6.0 * t**2 + 4.0, 3.0 * s**3 - 6.0 * s**2 + 4.0, t**3], axis=-1)
        / 6.0
    )


def cubic_slopes(offset: Array) -> Array:
    """Slopes of `cubic_weights`, to a lattice step: (..., 4)."""
    t = offset[..., None]
    s = 1.0 - t
    return np.concatenate([-(s**2), 3.0 * t**2 - 4.0 * t, 4.0 * s - 3.0 * s**2, t**2], axis=-1) / 2.0


def _cells(position: Array, count: int) -> tuple[NDArray[np.intp], Array]:
    """Cell number and offset within it of positions in lattice steps; `count` coefficients."""
    cell = np.clip(np.floor(position), 0, count - 4).astype(np.intp)
    return cell, position - cell


def line_basis(position: Array, count: int) -> Array:
    """Values of all `count` B-splines at positions (N,) in lattice steps: dense (N, count)."""
    cell, offset = _cells(position, count)
    basis = np.zeros((position.size, count))
    rows = np.arange(position.size)[:, None]
    basis[rows, cell[:, None] + np.arange(4)] = cubic_weights(offset)
    return basis


def design(lattice: Lattice, x: Array, y: Array, *, slope: str = "") -> Any:
    """Sparse matrix (N, rows·columns) of the B-splines' values at points (N,) inside the rectangle.

    With slope "x" or "y" that of their slopes in this direction, to a lattice step.
    """
    from scipy.sparse import csr_matrix

    column, offset_x = _cells((x - lattice.west) / lattice.step, lattice.columns)
    row, offset_y = _cells((y - lattice.south) / lattice.step, lattice.rows)
    weights_x = cubic_slopes(offset_x) if slope == "x" else cubic_weights(offset_x)
    weights_y = cubic_slopes(offset_y) if slope == "y" else cubic_weights(offset_y)
    weights = weights_y[:, :, None] * weights_x[:, None, :]
    first = row[:, None, None] + np.arange(4)[None, :, None]
    second = column[:, None, None] + np.arange(4)[None, None, :]
    index = first * lattice.columns + second
    points = np.repeat(np.arange(x.size), 16)
    shape = (x.size, lattice.rows * lattice.columns)
    return csr_matrix((weights.ravel(), (points, index.ravel())), shape=shape)


def _overlaps(count: int) -> tuple[Array, Array, Array]:
    """Integrals of products of the B-splines and of their first and second derivatives, (count, count).

    Exact: four Gauss points integrate the degree of 6.
    """
    nodes, gauss = np.polynomial.legendre.leggauss(4)
    t, gauss = 0.5 * (nodes + 1.0), 0.5 * gauss
    s = 1.0 - t
    value = cubic_weights(t)
    slope = cubic_slopes(t)
    bend = np.stack([s, 3 * t - 2, 3 * s - 2, t], axis=-1)
    result = []
    for basis in (value, slope, bend):
        cell = np.einsum("q,qi,qj->ij", gauss, basis, basis)
        whole = np.zeros((count, count))
        for start in range(count - 3):
            whole[start : start + 4, start : start + 4] += cell
        result.append(whole)
    return result[0], result[1], result[2]


def bending_energy(lattice: Lattice) -> Any:
    """Sparse matrix of ∫(f_xx² + 2·f_xy² + f_yy²), coordinates in lattice steps."""
    from scipy.sparse import csr_matrix, kron

    x0, x1, x2 = (csr_matrix(part) for part in _overlaps(lattice.columns))
    y0, y1, y2 = (csr_matrix(part) for part in _overlaps(lattice.rows))
    return kron(y0, x2, "csr") + 2.0 * kron(y1, x1, "csr") + kron(y2, x0, "csr")


@dataclass(frozen=True)
class Surface:
    """A fitted surface: its lattice and its B-spline coefficients (rows, columns)."""

    lattice: Lattice
    coefficients: Array

    def values(self, x: Array, y: Array) -> Array:
        """Evaluate at broadcastable coordinates; NaN outside of the lattice's rectangle and for NaN.

        A row of x (1, W) with a column of y (H, 1) is evaluated as a product of two small matrices.
        """
        return evaluate(self.coefficients, self.lattice, x, y, degree=3)


def evaluate(array: Array, lattice: Lattice, x: Array, y: Array, *, degree: int) -> Array:
    """Evaluate B-spline coefficients (degree 3) or node values (degree 1) of a lattice at x and y."""
    across = (x - lattice.west) / lattice.step
    along = (y - lattice.south) / lattice.step
    with np.errstate(invalid="ignore"):
        across = np.where((across >= 0) & (across <= lattice.columns - 3), across, np.nan)
        along = np.where((along >= 0) & (along <= lattice.rows - 3), along, np.nan)
    if across.ndim == 2 and along.ndim == 2 and across.shape[0] == 1 and along.shape[1] == 1:
        return _outer(array, across[0], along[:, 0], degree)
    return _scattered(array, across, along, degree)


def _outer(array: Array, across: Array, along: Array, degree: int) -> Array:
    """Values on the product of a row and a column of positions, (H, W)."""
    from scipy.sparse import csr_matrix

    matrices = []
    for axis, position in enumerate((along, across)):
        safe = np.nan_to_num(position)
        count = array.shape[axis]
        matrix = line_basis(safe, count) if degree == 3 else _hat_basis(safe, count)
        # A block of a large region touches few of the coefficients.
        touched = slice(int(safe.min()), min(int(safe.max()) + degree + 2, count))
        array = array[touched] if axis == 0 else array[:, touched]
        matrix = matrix[:, touched]
        matrix[np.isnan(position)] = np.nan
        # Four values of a row are not zero: the dense product takes ten times as long, on all processors.
        matrices.append(csr_matrix(matrix))
    return np.asarray((matrices[1] @ (matrices[0] @ array).T).T)


def _hat_basis(position: Array, count: int) -> Array:
    """Weights of linear interpolation between `count` nodes at positions (N,): dense (N, count)."""
    cell = np.clip(np.floor(position), 0, count - 2).astype(np.intp)
    offset = position - cell
    basis = np.zeros((position.size, count))
    rows = np.arange(position.size)
    basis[rows, cell] = 1.0 - offset
    basis[rows, cell + 1] = offset
    return basis


def _scattered(array: Array, across: Array, along: Array, degree: int) -> Array:
    """Values at pairs of positions, broadcast."""
    from scipy.ndimage import map_coordinates

    across, along = np.broadcast_arrays(across, along)
    # A cubic B-spline is centred one step into the coefficients of its cell.
    shift = 1.0 if degree == 3 else 0.0
    missing = np.isnan(across) | np.isnan(along)
    position = np.stack([np.nan_to_num(along), np.nan_to_num(across)]) + shift
    flat = map_coordinates(array, position.reshape(2, -1), order=degree, mode="nearest", prefilter=False)
    return np.where(missing, np.nan, np.asarray(flat).reshape(across.shape))


class ThinPlate:
    """The least-bending fit over one lattice; data points may be added and the fit repeated.

    Parameters
    ----------
    lattice : Lattice
        Where the coefficients are.
    """

    def __init__(self, lattice: Lattice) -> None:
        self.lattice = lattice
        self._energy = BENDING * bending_energy(lattice)

    def stretched(self, x: Array, y: Array, tension: Array) -> ThinPlate:
        """Give the same plate under tension around raster points (N,), two to a lattice step.

        The tension is the weight of |∇f|² against that of the bending, lattice steps as unit of length.
        """
        plate = ThinPlate.__new__(ThinPlate)
        plate.lattice = self.lattice
        weights = 0.25 * BENDING * tension
        plate._energy = self._energy
        for slope in ("x", "y"):
            matrix = design(self.lattice, x, y, slope=slope)
            plate._energy = plate._energy + matrix.T.multiply(weights).tocsr() @ matrix
        return plate

    def solve(self, x: Array, y: Array, values: Array, weights: Array) -> Surface:
        """Find the surface of least bending and weighted misfit to values at points (N,).

        Three points not on one line must be among them.
        """
        from scipy.sparse.linalg import splu

        matrix = design(self.lattice, x, y)
        weighted = matrix.T.multiply(weights).tocsr()
        system = (weighted @ matrix + self._energy).tocsc()
        # Symmetric and positive definite: an order that keeps the factor thin, no pivoting.
        factor = splu(
            system, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True}
        )
        solution = np.asarray(factor.solve(weighted @ values))
        return Surface(self.lattice, solution.reshape(self.lattice.rows, self.lattice.columns))
