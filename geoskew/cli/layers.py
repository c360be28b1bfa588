"""``geoskew layers``."""

from __future__ import annotations

import json

import click

from geoskew.cli import options


@click.command("layers", epilog="Example: geoskew layers")
@click.option("--json", "as_json", is_flag=True, help="As a JSON array.")
@options.common
def command(as_json: bool, quiet: bool, verbose: bool, debug: bool) -> None:
    """The list of layers: name, unit, meaning."""
    import geoskew.catalogue  # noqa: F401
    from geoskew.layers import REGISTRY

    if as_json:
        rows = [
            {"name": one.name, "unit": one.unit, "meaning": one.description, "kind": one.kind}
            for one in REGISTRY.values()
        ]
        click.echo(json.dumps(rows, indent=1, ensure_ascii=False))
        return
    width = max(map(len, REGISTRY))
    for one in REGISTRY.values():
        click.echo(f"{one.name:<{width}}  {one.unit or '-':<10}  {one.description}")
