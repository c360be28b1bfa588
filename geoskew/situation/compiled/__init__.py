"""The situation of a block of a large grid, computed by compiled loops where a scenario allows it.

Layers that the loops give come out of them whole; every other layer is computed as always, from a situation
whose shared setting and usable places come from the same loops. Imported only when kernels are ready.
"""

from __future__ import annotations

from geoskew.situation.compiled.core import CompiledSituation, suits
from geoskew.situation.compiled.layers import LAYERS

__all__ = ["LAYERS", "CompiledSituation", "suits"]
