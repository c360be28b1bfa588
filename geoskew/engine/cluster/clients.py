"""A connection to a cluster: one that is running, or workers of this machine for the time of the job."""

from __future__ import annotations

import logging
import re
from collections.abc import Iterator, Mapping
from contextlib import ExitStack, contextmanager
from typing import Any, Final

from geoskew.engine.cluster.jobs import PACKAGES, differences
from geoskew.errors import GeoskewError, InputError

_CONNECT_SECONDS: Final = 10
_WORKERS_SECONDS: Final = 30
# One thread a process: several workers share a machine, and libraries would start a thread a core each.
# dask has the C library give freed memory back at once, which makes every array of a block cost twice its
# time: pages are kept up to a size instead.
ENVIRONMENT: Final = {
    "OMP_NUM_THREADS": "1",
    "OPENBLAS_NUM_THREADS": "1",
    "MKL_NUM_THREADS": "1",
    "NUMBA_NUM_THREADS": "1",
    "GDAL_NUM_THREADS": "1",
    "GDAL_CACHEMAX": "64",
    "MALLOC_MMAP_THRESHOLD_": "33554432",
    "MALLOC_TRIM_THRESHOLD_": "268435456",
    # no sampling of what a worker does, a hundred times a second
    "DASK_DISTRIBUTED__WORKER__PROFILE__ENABLED": "False",
}
_START: Final = "start workers with: dask worker ADDRESS --nworkers N --nthreads 1"


def require_address(where: str) -> None:
    """Check what stands behind ``--cluster``.

    Raises
    ------
    InputError
        It is neither the address of a scheduler nor ``local:N``.
    """
    kind, _, rest = where.partition(":")
    if kind == "local" and re.fullmatch(r"[1-9][0-9]{0,3}", rest):
        return
    if kind == "local" or not re.fullmatch(r"((tcp|tls|ws|wss)://)?[^\s/:]+:[0-9]{1,5}", where):
        raise InputError(
            f"--cluster {where!r} is neither the address of a scheduler, such as tcp://10.0.0.5:8786, "
            "nor local:N with a number of processes of this machine"
        )


@contextmanager
def session(where: str) -> Iterator[Any]:
    """Give a client of a cluster whose ends have the same versions.

    Parameters
    ----------
    where : str
        Address of a running scheduler, or ``local:N``: N processes of this machine that end with the body.

    Yields
    ------
    distributed.Client

    Raises
    ------
    InputError
        `where` is no address.
    GeoskewError
        The extra is not installed, no scheduler answers, it has no workers, or versions differ.
    """
    require_address(where)
    try:
        import dask.config
        from distributed import Client, LocalCluster
    except ImportError as error:
        raise GeoskewError(
            f"--cluster needs the library {error.name or 'distributed'}, which is not installed: "
            "pip install 'geoskew[cluster]'"
        ) from None
    # What goes wrong is said once, by us.
    logging.getLogger("distributed").setLevel(logging.CRITICAL)
    with ExitStack() as stack:
        address: Any = where
        if where.startswith("local:"):
            stack.enter_context(dask.config.set({"distributed.nanny.pre-spawn-environ": ENVIRONMENT}))
            address = stack.enter_context(
                LocalCluster(  # type: ignore[no-untyped-call]  # the library has no types
                    n_workers=int(where.partition(":")[2]),
                    threads_per_worker=1,
                    host="127.0.0.1",
                    dashboard_address="127.0.0.1:0",
                    silence_logs=logging.CRITICAL,
                )
            )
        try:
            opened = Client(address, timeout=_CONNECT_SECONDS)  # type: ignore[no-untyped-call]  # as above
            client = stack.enter_context(opened)
            client.wait_for_workers(1, timeout=_WORKERS_SECONDS)
        except TimeoutError as error:
            raise GeoskewError(f"the scheduler at {where} has no workers; {_START}") from error
        except OSError as error:
            raise GeoskewError(
                f"no scheduler answers at {where}; start one with: dask scheduler, then {_START}"
            ) from error
        require_same_versions(client)
        yield client


def require_same_versions(client: Any) -> None:
    """Compare what values and messages depend on at all ends, before any work.

    Raises
    ------
    GeoskewError
        Names each end that differs, and in what.
    """
    found = client.get_versions(check=False, packages=["geoskew", *PACKAGES])
    here = _versions(found["client"])
    spoken = {name: here[name] for name in ("python", "dask", "distributed")}
    told = []
    if other := differences(spoken, _versions(found["scheduler"])):
        told.append(f"the scheduler has {other}")
    for address, worker in found["workers"].items():
        if other := differences(here, _versions(worker)):
            told.append(f"the worker at {address} has {other}")
    if told:
        more = f" (and {len(told) - 3} more ends)" if len(told) > 3 else ""
        raise GeoskewError(
            f"versions differ between the ends of the cluster: {'; '.join(told[:3])}{more}; "
            "install the same everywhere, for example with -c constraints.txt"
        )


def _versions(end: Mapping[str, Any]) -> dict[str, str]:
    packages = end["packages"]
    found = {name: str(packages.get(name)) for name in ("dask", "distributed", "geoskew", *PACKAGES)}
    return {"python": ".".join(str(packages["python"]).split(".")[:2]), **found}
