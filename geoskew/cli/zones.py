"""``geoskew zones``."""

from __future__ import annotations

from pathlib import Path
from typing import Literal

import click

from geoskew.cli import console, options


@click.command(
    "zones", epilog="Example: geoskew zones plan.toml --tolerance 2.5 --of shared --out zones.gpkg"
)
@options.scenario
@click.option(
    "--tolerance",
    type=float,
    required=True,
    metavar="DEG",
    help="How far a place's own setting may lie from its zone's.",
)
@options.out_file(".gpkg or .geojson")
@click.option(
    "--of",
    type=click.Choice(["before", "after", "shared"]),
    default="shared",
    show_default=True,
    help="Setting for the satellite in service, for the new one, or for both.",
)
@click.option(
    "--districts",
    type=click.Path(path_type=Path),
    default=None,
    metavar="FILE",
    help="Polygons that zones keep whole where the tolerance allows it.",
)
@options.overwrite
@options.common
def command(
    scenario: Path,
    tolerance: float,
    out: Path,
    of: Literal["before", "after", "shared"],
    districts: Path | None,
    overwrite: bool,
    quiet: bool,
    verbose: bool,
    debug: bool,
) -> None:
    """The fewest zones within which one setting serves every place, as polygons.

    A zone is one setting; it may lie in several pieces. The table of each zone says what its one
    number costs against each place's own, in dB.
    """
    from geoskew.outputs.zones import require_known_ending
    from geoskew.study.core import Study
    from geoskew.study.outfiles import require_folder, require_free
    from geoskew.study.zones import write, zones_of

    require_known_ending(out)
    require_folder(out.parent)
    study = Study(scenario, needs_sites=False)
    require_free(study, [out], overwrite=overwrite)
    with console.progress(quiet=quiet) as progress:
        zones = zones_of(study, tolerance, of=of, districts=districts, progress=progress)
    write(zones, study, out)
    for name in zones.split:
        console.say(f"district {name} spans more than twice the tolerance and is split", quiet=quiet)
    cost = "no margins" if zones.worst_cost is None else f"at most {zones.worst_cost:.2f} dB lost"
    console.say(
        f"wrote {out}: {len(zones.rows)} zones (fewer than {zones.parted.needed_at_least} are impossible), "
        f"places within {zones.worst_deviation:.2f}° of their zone's setting, {cost}; {study.judged}",
        quiet=quiet,
    )
