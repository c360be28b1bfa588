"""Opening vector files: the one layer that is meant, or one clear message."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from geoskew.errors import InputError, Problem

PARQUET_ENDINGS = (".parquet", ".geoparquet")


def read_vector(path: Path, *, kind: str, layer: str | None = None) -> Any:
    """Read one layer of a vector file.

    Parameters
    ----------
    path : Path
        Anything that GDAL reads as vectors, or (Geo)Parquet.
    kind : str
        ``"Point"`` or ``"Polygon"``: the geometry that is looked for where a file has several layers.
    layer : str, optional
        Name of the layer; needed only where several could be meant.

    Returns
    -------
    geopandas.GeoDataFrame or pandas.DataFrame
        A plain DataFrame when the layer has no geometry at all.

    Raises
    ------
    InputError
        If the file is missing or unreadable, or the layer cannot be told.
    """
    if not path.is_file():
        raise InputError(Problem("no such file", file=path))
    if path.suffix.lower() in PARQUET_ENDINGS:
        return _read_parquet(path)
    import pyogrio
    from pyogrio.errors import CRSError, DataLayerError, DataSourceError

    try:
        name = _layer_of(pyogrio.list_layers(path), path, kind=kind, wanted=layer)
        return pyogrio.read_dataframe(path, layer=name, use_arrow=True)
    except (DataSourceError, DataLayerError, CRSError, OSError) as error:
        reason = str(error).splitlines()[0] if str(error) else type(error).__name__
        raise InputError(Problem(f"cannot be read as a vector file: {reason}", file=path)) from error


def _layer_of(layers: Any, path: Path, *, kind: str, wanted: str | None) -> str:
    names = [str(name) for name, _ in layers]
    if wanted is not None:
        if wanted not in names:
            raise InputError(
                Problem(f"has no layer {wanted!r}; it has {', '.join(names) or 'none'}", file=path)
            )
        return wanted
    fitting = [str(name) for name, found in layers if found and (kind in found or found == "Unknown")]
    candidates = fitting or names
    if not candidates:
        raise InputError(Problem("holds no layer", file=path))
    if len(candidates) > 1:
        told = ", ".join(candidates)
        raise InputError(
            Problem(f"holds several layers that could be meant ({told}); keep or name one", file=path)
        )
    return candidates[0]


def _read_parquet(path: Path) -> Any:
    import geopandas
    import pandas
    import pyarrow
    import pyarrow.parquet

    try:
        with_geometry = b"geo" in (pyarrow.parquet.read_schema(path).metadata or {})
        return geopandas.read_parquet(path) if with_geometry else pandas.read_parquet(path)
    except (pyarrow.ArrowException, OSError, ValueError) as error:
        raise InputError(Problem(f"cannot be read as Parquet: {error}", file=path)) from error
