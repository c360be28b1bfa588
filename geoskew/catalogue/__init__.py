"""The layers themselves: importing this package fills the registry of `geoskew.layers`.

The order of the imports is the order of the layers wherever they are listed.
"""

# ruff: noqa: I001
from __future__ import annotations

from geoskew.catalogue import directions
from geoskew.catalogue import settings
from geoskew.catalogue import links
from geoskew.catalogue import margins
from geoskew.catalogue import decisions
from geoskew.catalogue import outages

__all__ = ["decisions", "directions", "links", "margins", "outages", "settings"]
