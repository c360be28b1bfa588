"""``geoskew spot``."""

from __future__ import annotations

import json
from pathlib import Path

import click

from geoskew.cli import options


class Place(click.ParamType):
    """LAT,LON in degrees."""

    name = "LAT,LON"

    def convert(
        self, value: object, param: click.Parameter | None, ctx: click.Context | None
    ) -> tuple[float, float]:
        """Latitude and longitude, checked."""
        if isinstance(value, tuple):
            return value
        parts = str(value).split(",")
        try:
            latitude, longitude = (float(part) for part in parts)
        except ValueError:
            self.fail(f"{value!r} is not LAT,LON in degrees, as in --at=-33.9,18.4", param, ctx)
        if not -90.0 <= latitude <= 90.0:
            self.fail(f"latitude {latitude:g} is not within −90 to 90 (latitude comes first)", param, ctx)
        if not -180.0 <= longitude <= 360.0:
            self.fail(f"longitude {longitude:g} is not within −180 to 360", param, ctx)
        return latitude, longitude


@click.command("spot", epilog="Example: geoskew spot plan.toml --at=-33.9,-60.6 --budget")
@options.scenario
@click.option("--at", "at", type=Place(), required=True, help="Latitude and longitude in degrees.")
@click.option("--height", type=float, default=None, metavar="M", help="Height in metres. [unknown]")
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
    if budget:
        text, data = spot_budget(scenario, latitude, longitude, height)
        click.echo(json.dumps(data, indent=1, ensure_ascii=False, allow_nan=False) if as_json else text)
        return
    values = spot_values(scenario, latitude, longitude, height)
    click.echo(
        json.dumps(values, indent=1, ensure_ascii=False, allow_nan=False)
        if as_json
        else values_as_text(values)
    )
