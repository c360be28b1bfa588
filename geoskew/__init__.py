"""geoskew plans the changeover of a network of fixed dishes from one geostationary satellite to another."""

from __future__ import annotations

__version__ = "0.1.0"
