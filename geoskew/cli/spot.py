"""``geoskew spot``."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import click

from geoskew.cli import options


def place(context: click.Context, option: click.Parameter, text: str) -> tuple[float, float]:
    """Latitude and longitude out of LAT,LON, checked."""
    try:
        latitude, longitude = (float(part) for part in text.split(","))
    except ValueError:
        message = f"{text!r} is not LAT,LON in degrees, as in --at=-33.9,18.4"
        raise click.BadParameter(message, context, option) from None
    if not -90.0 <= latitude <= 90.0:
        message = f"latitude {latitude:g} is not within −90 to 90 (latitude comes first)"
        raise click.BadParameter(message, context, option)
    if not -180.0 <= longitude <= 360.0:
        message = f"longitude {longitude:g} is not within −180 to 360"
        raise click.BadParameter(message, context, option)
    return latitude, longitude


@click.command("spot", epilog="Example: geoskew spot plan.toml --at=-33.9,-60.6 --budget")
@options.scenario
@click.option(
    "--at",
    "at",
    callback=place,
    required=True,
    metavar="LAT,LON",
    help="Latitude and longitude in degrees; --at=-33.9,18.4 where the latitude is negative.",
)
@click.option(
    "--height",
    type=click.FloatRange(min=-500.0, max=9000.0),
    default=None,
    metavar="M",
    help="Height in metres. [unknown]",
)
@click.option("--budget", is_flag=True, help="The link budget line by line.")
@click.option("--json", "as_json", is_flag=True, help="As one JSON object.")
@options.common
def command(
    scenario: Path,
    at: tuple[float, float],
    height: float | None,
    budget: bool,
    as_json: bool,
    quiet: bool,
    verbose: bool,
    debug: bool,
) -> None:
    """Every layer's value at one place."""
    from geoskew.study.spot import spot_budget, spot_values, values_as_text

    latitude, longitude = at
    data: dict[str, Any]
    if budget:
        text, data = spot_budget(scenario, latitude, longitude, height)
    else:
        data = spot_values(scenario, latitude, longitude, height)
        known = "height not known" if height is None else f"height {height:g} m"
        text = f"{latitude:g}, {longitude:g} (latitude, longitude), {known}\n\n{values_as_text(data)}"
    click.echo(json.dumps(data, indent=1, ensure_ascii=False, allow_nan=False) if as_json else text)
