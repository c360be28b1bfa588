"""The blocks of a study's region from a cluster."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from logging import getLogger
from pathlib import Path
from typing import TYPE_CHECKING, Any

from numpy.typing import NDArray

from geoskew import __version__
from geoskew.engine.blocks import Block
from geoskew.engine.cluster import Job, TileFolder, cluster_blocks, session
from geoskew.engine.cluster.jobs import versions_here
from geoskew.layers import REGISTRY
from geoskew.outputs.raster.storage import Precision, encode, storage_of

if TYPE_CHECKING:
    from geoskew.study.core import Study

_log = getLogger(__name__)


@dataclass(frozen=True)
class Encoded:
    """Values as the final files hold them: encoding them once more changes nothing."""

    precision: Precision

    def __call__(self, name: str, values: NDArray[Any]) -> NDArray[Any]:
        """What is stored of a layer's values, NaN (255 for classes) where there is none."""
        layer = REGISTRY[name]
        return encode(values, layer, storage_of(layer, precision=self.precision))


def tile_folder(study: Study, beside: Path, names: Sequence[str], precision: Precision) -> TileFolder:
    """The folder in which a cluster leaves the tiles of a study's layers."""
    return TileFolder.of(
        beside,
        digest=study.scenario.digest,
        software=f"geoskew {__version__}",
        names=names,
        grid=study.grid,
        storage=precision,
    )


@contextmanager
def blocks_of_cluster(
    study: Study,
    beside: Path,
    names: Sequence[str],
    *,
    where: str,
    precision: Precision,
    report: Callable[[str, int, int], None],
) -> Iterator[Iterator[Block]]:
    """Give the blocks of a study's region, computed on a cluster.

    The tiles go at the end of a body that raises nothing, which has made the final files of them; else
    they stay for the next try.

    Raises
    ------
    InputError
        The address is wrong, or the folder of tiles is another job's.
    GeoskewError
        The cluster cannot be reached, does not fit, fails or is lost.
    """
    folder = tile_folder(study, beside, names, precision)
    with session(where) as client:
        folder.prepare()
        for other in folder.others():
            _log.warning(
                "%s holds tiles of another scenario or other layers; remove it when not needed", other
            )
        job = Job(
            scenario=study.scenario,
            inputs=study.inputs,
            grid=study.grid,
            folder=folder,
            store=Encoded(precision),
            quantised=precision == "standard",
            versions=versions_here(),
        )
        yield cluster_blocks(client, job, on_tiles=lambda done, total: report("tiles", done, total))
    folder.remove()
