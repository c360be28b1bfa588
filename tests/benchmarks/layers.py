"""All clear-sky layers of a block: compiled loops against the plain numpy path in blocks, one thread."""

from __future__ import annotations

import argparse

import numpy as np
from timing import machine, rounds, table

from geoskew.evaluate import available, evaluate
from geoskew.region import Grid, Window
from geoskew.resources import demo_scenario
from geoskew.scenario import Scenario, load
from geoskew.situation import prepare

# Layers that need more than clear sky, or a chance of failure.
BEYOND = ("fail_", "outage_", "rain_")


def clear_sky(name: str) -> tuple[Scenario, list[str]]:
    """A demo without its weather, and its layers of geometry, mismatch, discrimination and clear-sky margins."""
    scenario = load(demo_scenario(name)).model_copy(update={"weather": None})
    return scenario, [one for one in available(scenario, sites=False) if not one.startswith(BEYOND)]


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--rounds", type=int, default=5)
    parser.add_argument("--rows", type=int, default=128, help="rows of a block of 512 columns [128]")
    given = parser.parse_args()
    print(machine())
    for demo, west, north in (("southern-cone", -76.0, -17.0), ("slot-change", 166.0, -8.0)):
        scenario, names = clear_sky(demo)
        inputs = prepare(scenario)
        places = Grid("EPSG:4326", west, north, 0.0095, 4096, 4096).block(Window(512, 512, given.rows, 512))

        def loops(scenario=scenario, places=places, names=names, inputs=inputs):  # type: ignore[no-untyped-def]
            return evaluate(scenario, places, names, inputs=inputs, compiled=True)

        def plain(scenario=scenario, places=places, names=names, inputs=inputs):  # type: ignore[no-untyped-def]
            return evaluate(scenario, places, names, inputs=inputs)

        def fill(names=names, shape=places.shape):  # type: ignore[no-untyped-def]
            return [np.full(shape, 1.0, dtype=np.float32) for _ in names]

        print(
            f"{demo}: {len(names)} layers of {given.rows} x 512 cells, one thread; x = how many times the loops"
        )
        times = rounds(
            {"loops": loops, "plain numpy in blocks": plain, "filling as many arrays": fill}, given.rounds
        )
        table(times, places.shape[0] * places.shape[1], "loops")


if __name__ == "__main__":
    main()
