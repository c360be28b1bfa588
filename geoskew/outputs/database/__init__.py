"""Results as rows of a PostGIS database, each study's apart, written as a whole or not at all."""

from geoskew.outputs.database.ready import create, faults
from geoskew.outputs.database.rows import Counts, Lines, contour_lines, replace_rows
from geoskew.outputs.database.tables import (
    CONTOURS_ENDING,
    Stamp,
    contour_table,
    schema_sql,
    site_table,
    stored_names,
)

__all__ = [
    "CONTOURS_ENDING",
    "Counts",
    "Lines",
    "Stamp",
    "contour_lines",
    "contour_table",
    "create",
    "faults",
    "replace_rows",
    "schema_sql",
    "site_table",
    "stored_names",
]
