"""A budget as text: facts, a summary of margins, then one table a moment, sky and carrier."""

from __future__ import annotations

from itertools import groupby
from textwrap import wrap
from typing import Any, Final

from geoskew.study.budget import words
from geoskew.study.budget.text_tables import Row, facts_table, policies_table

_MOMENTS: Final = {"before": "Before the changeover", "after": "After the changeover"}
_WIDTH: Final = 100


def budget_as_text(data: dict[str, Any]) -> str:
    """The data of `budget`, in lines of at most some 100 characters."""
    blocks, tables = [_head(data), _satellites(data), _feed(data), _summary(data)], _tables(data)
    if tables:
        blocks += [_legend(data), *tables]
    if tables and data["weather"]:
        blocks.append("\n".join(["WEATHER", *(line for text in data["weather"] for line in _wrapped(text))]))
    return "\n\n".join(blocks)


def _wrapped(text: str, indent: str = "  ") -> list[str]:
    return wrap(text, _WIDTH, initial_indent=indent, subsequent_indent=indent + "  ")


def _side(value: float, positive: str, negative: str) -> str:
    return f"{abs(value):.4f}° {positive if value >= 0 else negative}"


def _head(data: dict[str, Any]) -> str:
    place = data["place"]
    where = f"{_side(place['latitude_deg'], 'N', 'S')}, {_side(place['longitude_deg'], 'E', 'W')}"
    height = place["height_m"]
    # The topography serves the weather alone.
    unknown = "height not given: 0 m for directions, topography of ITU-R P.1511-2 for weather"
    return f"LINK BUDGET at {where}\n{data['title']}\n" + (
        unknown if height is None else f"height {height:g} m"
    )


def _satellites(data: dict[str, Any]) -> str:
    both = [data["satellites"][moment] for moment in ("before", "after")]
    rows: list[Row] = [
        ("orbital position", [f"{_side(one['longitude_deg'], 'E', 'W')}" for one in both]),
        ("azimuth, clockwise from true north", [_degrees(one["azimuth_deg"]) for one in both]),
        ("elevation, without refraction", [_degrees(one["elevation_deg"]) for one in both]),
        ("range", [f"{one['range_km']:.1f} km" for one in both]),
        ("skew of the V axis, tilt included", [_degrees(one["skew_deg"]) for one in both]),
        ("seen by a dish left on the old slot", ["–", _degrees(data["feed"]["seen_after"])]),
    ]
    headings = [f"{one['name']}, {moment}" for one, moment in zip(both, ("before", "after"), strict=True)]
    lines = facts_table("SATELLITES", headings, rows)
    lines += [f"  {one['serves_nothing']}: no link budget with it." for one in both if one["serves_nothing"]]
    return "\n".join(lines)


def _degrees(value: float | None) -> str:
    return "–" if value is None else f"{value:.2f}°"


def _feed(data: dict[str, Any]) -> str:
    feed, decision = data["feed"], data["decision"]
    lines = [f"FEED, settings clockwise from the upright V port, {words.BEHIND}"]
    lines.append(
        f"  present setting    {_degrees(feed['present_setting'])}, {feed['present_setting_source']}"
    )
    for name in ("shared", "realigned"):
        lines.append(
            f"  {name + ' setting':<18} {_degrees(feed[f'setting_{name}'])}, turn from the present one:"
        )
        lines += _both_places(feed[f"turn_{name}"])
    lines.append("  window of turns that keep what both moments are held to:")
    lines += _window(feed["window_low"], feed["window_high"])
    chance = decision["fail_probability"]
    lines.append(f"  action             {decision['action'] or '–'}, judged in {_sky(data['judged_in'])}")
    if chance is not None:
        lines.append(f"  chance that an untouched feed fails after the changeover: {chance:.1f} %")
    return "\n".join(lines)


def _both_places(turn: float | None) -> list[str]:
    if turn is None or words.is_none(turn):
        return [f"    {words.turn(turn)}"]
    return [f"    {where}: {words.end(turn, behind=behind)}" for where, behind in words.STANDING]


def _window(low: float | None, high: float | None) -> list[str]:
    return [f"  {text}" for text in words.window(low, high).split("; ")]


def _sky(sky: str) -> str:
    return "clear sky" if sky == "clear" else "rain at the stated availability"


def _summary(data: dict[str, Any]) -> str:
    """Margins of all policies; the numbers behind them follow."""
    rain = any(entry["sky"] == "rain" for entry in data["budgets"])
    outage = "  outage h/y" if rain else ""
    lines = [f"{'MARGINS, dB':<22}{'clear':>8}" + (f"{'rain':>8}" if rain else "") + f"{outage}  weakest"]
    room = max(7, *(len(entry["weakest_carrier"] or "") for entry in data["budgets"]))
    # One line a moment and policy, over the skies.
    for entries in _by_policy(data):
        first = entries[0]
        values = "".join(f"{_decibels(entry['margin_db']):>8}" for entry in entries)
        hours = f"{first.get('outage') or '–':>12}" if rain else ""
        weakest = ", ".join(dict.fromkeys(entry["weakest_carrier"] or "–" for entry in entries))
        weakest = f"{weakest:<{room}}"
        lines.append(
            f"  {first['moment'] + ', ' + first['policy']:<20}{values}{hours}  {weakest}  {first['meaning']}"
        )
    lines += _reasons(data["budgets"])
    return "\n".join(lines)


def _by_policy(data: dict[str, Any]) -> list[list[dict[str, Any]]]:
    found: dict[tuple[str, str], list[dict[str, Any]]] = {}
    for entry in data["budgets"]:
        found.setdefault((entry["moment"], entry["policy"]), []).append(entry)
    return list(found.values())


def _decibels(value: float | None) -> str:
    return "–" if value is None else f"{value:.2f}"


def _reasons(entries: list[dict[str, Any]]) -> list[str]:
    found: dict[str, dict[str, None]] = {}
    for entry in entries:
        if entry["no_numbers"]:
            found.setdefault(entry["no_numbers"], {})[f"{entry['policy']} {entry['moment']}"] = None
    texts = (f"No numbers for {', '.join(names)}: {reason}." for reason, names in found.items())
    return [line for text in texts for line in _wrapped(text)]


def _legend(data: dict[str, Any]) -> str:
    lines = ["HOW TO READ THE TABLES"]
    texts = (
        "Lines at the margin count with their sign and sum to it; indented lines explain the one above them; "
        "lines with = are results on the way.",
        f"Each interferer is shown as what it takes off, in this order: {data['interference_order']}.",
        "Sources: names with a dot are keys of the scenario, P., S. and BO. numbers recommendations of "
        "ITU-R, EN numbers standards of ETSI.",
    )
    return "\n".join([*lines, *(line for text in texts for line in _wrapped(text))])


def _tables(data: dict[str, Any]) -> list[str]:
    blocks = []
    for (moment, sky), group in groupby(data["budgets"], key=lambda entry: (entry["moment"], entry["sky"])):
        entries = list(group)
        served = [entry for entry in entries if entry["carriers"]]
        if not served:
            continue
        for which, carrier in enumerate(served[0]["carriers"]):
            named = "carrier" if carrier["name"] == "carrier" else f"carrier {carrier['name']}"
            of = f"{named}, {carrier['polarisation']}, {carrier['frequency_ghz']:g} GHz"
            title = f"{_MOMENTS[moment].upper()}, {_sky(sky)}: {of}"
            weakest = [entry["policy"] for entry in served if entry["weakest_carrier"] == carrier["name"]]
            several = len(served[0]["carriers"]) > 1
            note = [f"  The weakest carrier for {', '.join(weakest)}."] if weakest and several else []
            table = policies_table(
                [entry["policy"] for entry in served],
                [entry["carriers"][which]["lines"] for entry in served],
                _WIDTH,
            )
            blocks.append("\n".join([title, *note, *table]))
    return blocks
