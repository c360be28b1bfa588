"""What every GeoPackage of ours has: reproducible bytes, and its columns described in the file itself."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator, Mapping, Sequence
from contextlib import closing, contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

# Stands for "no date": the time of writing would give other bytes for the same content.
_NO_DATE: Final = "1970-01-01T00:00:00.000Z"

# OGC 12-128, GeoPackage Encoding Standard 1.2, extension "Schema" (F.9), tables and registration.
_SCHEMA_TABLES: Final = """
CREATE TABLE gpkg_data_columns (
  table_name TEXT NOT NULL,
  column_name TEXT NOT NULL,
  name TEXT,
  title TEXT,
  description TEXT,
  mime_type TEXT,
  constraint_name TEXT,
  CONSTRAINT pk_gdc PRIMARY KEY (table_name, column_name),
  CONSTRAINT gdc_tn UNIQUE (table_name, name)
);
CREATE TABLE gpkg_data_column_constraints (
  constraint_name TEXT NOT NULL,
  constraint_type TEXT NOT NULL,
  value TEXT,
  min NUMERIC,
  min_is_inclusive BOOLEAN,
  max NUMERIC,
  max_is_inclusive BOOLEAN,
  description TEXT,
  CONSTRAINT gdcc_ntv UNIQUE (constraint_name, constraint_type, value)
);
CREATE TABLE IF NOT EXISTS gpkg_extensions (
  table_name TEXT,
  column_name TEXT,
  extension_name TEXT NOT NULL,
  definition TEXT NOT NULL,
  scope TEXT NOT NULL,
  CONSTRAINT ge_tce UNIQUE (table_name, column_name, extension_name)
);
"""
_DEFINITION: Final = "http://www.geopackage.org/spec121/#extension_schema"


@dataclass(frozen=True, slots=True)
class About:
    """A column of a layer: its name, its meaning with the unit, and a short title where one differs."""

    column: str
    description: str
    title: str = ""


@contextmanager
def reproducible() -> Iterator[None]:
    """Within, GeoPackages are written without the time of writing: same content, same bytes."""
    import pyogrio

    name = "OGR_CURRENT_DATE"
    before = pyogrio.get_gdal_config_option(name)
    pyogrio.set_gdal_config_options({name: _NO_DATE})
    try:
        yield
    finally:
        pyogrio.set_gdal_config_options({name: before})


def add_layer(
    path: Path,
    table: Any,
    *,
    layer: str,
    geometry_type: str,
    crs: str,
    title: str,
    description: str,
    fid: str = "fid",
    geometry: str = "geom",
) -> None:
    """Write an Arrow table with a WKB column as a layer of a new or an existing GeoPackage.

    Raises
    ------
    OSError
        The library could not write it; `files.writing` says so of the final name.
    """
    import pyogrio
    from pyogrio.errors import DataLayerError, DataSourceError, FieldError, GeometryError

    try:
        pyogrio.write_arrow(
            table,
            path,
            layer=layer,
            driver="GPKG",
            geometry_name=geometry,
            geometry_type=geometry_type,
            crs=crs,
            # the newest version that GDAL 3.6 (Debian 12) opens without a warning
            dataset_options={"VERSION": "1.2"},
            layer_options={
                "IDENTIFIER": title,
                "DESCRIPTION": description,
                "FID": fid,
                "GEOMETRY_NAME": geometry,
            },
        )
    except (DataLayerError, DataSourceError, FieldError, GeometryError) as error:
        raise OSError(f"layer {layer}: {error}") from error


def describe(path: Path, layers: Mapping[str, Sequence[About]]) -> None:
    """Say in the file itself what each column means (the standard's schema extension).

    Raises
    ------
    OSError
        The database could not be written; `files.writing` says so of the final name.
    """
    rows = [
        (layer, about.column, about.column, about.title or about.column, about.description)
        for layer, columns in layers.items()
        for about in columns
    ]
    try:
        with closing(sqlite3.connect(path)) as database, database:
            database.executescript(_SCHEMA_TABLES)
            database.executemany(
                "INSERT INTO gpkg_extensions VALUES (?, NULL, 'gpkg_schema', ?, 'read-write')",
                [("gpkg_data_columns", _DEFINITION), ("gpkg_data_column_constraints", _DEFINITION)],
            )
            database.executemany(
                "INSERT INTO gpkg_data_columns (table_name, column_name, name, title, description) "
                "VALUES (?, ?, ?, ?, ?)",
                rows,
            )
    except sqlite3.Error as error:
        raise OSError(f"the meaning of its columns: {error}") from error
