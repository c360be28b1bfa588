"""Tables of the planner's report: what changes, what is to be done, sensitivity, crews, assumptions."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, Final

import numpy as np

from geoskew.decision import ACTIONS
from geoskew.outputs.report import Grid
from geoskew.study.sensitivity import RISK_PERCENT

if TYPE_CHECKING:
    from geoskew.scenario import Scenario
    from geoskew.study.plan import Planned

MEANINGS: Final[dict[str, str]] = {
    "leave": "an untouched feed keeps the reserve after the changeover",
    "preset": "one visit ahead of time to the setting that serves both satellites",
    "turn-at-changeover": "the feed must be turned when the new satellite takes over",
    "re-aim": "the dish itself must be moved at the changeover",
    "upgrade": "even perfectly set the reserve is not kept: more dish, a better feed or another carrier",
    "no-sight": "the new satellite is too low or hidden by terrain",
}
DASH: Final = "–"


def number(value: float, digits: int = 1) -> str:
    """A number with the true minus sign, or a dash for no value."""
    if not np.isfinite(value):
        return DASH
    rounded = round(float(value), digits) + 0.0
    return f"{rounded:.{digits}f}".replace("-", "−")


def east_west(degrees: float) -> str:
    """A longitude as it is spoken."""
    folded = (degrees + 180.0) % 360.0 - 180.0
    return f"{abs(folded):g}° {'east' if folded > 0 else 'west' if folded < 0 else ''}".strip()


def what_changes(scenario: Scenario) -> Grid:
    """Satellites and carriers, before and after."""
    rows: list[tuple[str, ...]] = [
        ("satellite", scenario.outgoing.name, scenario.incoming.name),
        ("slot", east_west(scenario.outgoing.longitude_deg), east_west(scenario.incoming.longitude_deg)),
    ]
    if scenario.outgoing.latitude_deg or scenario.incoming.latitude_deg:
        rows.append(("sub-satellite latitude", *(f"{one.latitude_deg:g}°" for one in _two(scenario))))
    rows += [
        ("tilt of the polarisation", *(number(one.tilt_deg) + "°" for one in _two(scenario))),
        ("beam axis", *(_aim(one) for one in _two(scenario))),
        ("EIRP from", *(_power(one) for one in _two(scenario))),
        ("cross-polar isolation", *(f"{one.isolation_db:g} dB" for one in _two(scenario))),
    ]
    for before, after in zip(scenario.carriers_before, scenario.carriers_after, strict=True):
        rows.append((f"carrier {before.name}", _carrier(before), _carrier(after)))
        rows.append(("  crossed polarisation", _crossed(before), _crossed(after)))
    return Grid(
        "Satellites and carriers before and after the changeover.",
        ("", "before", "after"),
        tuple(rows),
        "lll",
        (24, 38, 38),
    )


def _two(scenario: Scenario) -> tuple[Any, Any]:
    return scenario.outgoing, scenario.incoming


def _aim(satellite: Any) -> str:
    if satellite.aim is None:
        return "at the sub-satellite point"
    north = satellite.aim.lat_deg
    side = "north" if north > 0 else "south" if north < 0 else ""
    return f"at {abs(north):g}° {side}, {east_west(satellite.aim.lon_deg)}"


def _power(satellite: Any) -> str:
    if satellite.eirp_contours is not None:
        source = f"contours, {satellite.eirp_contours.file.name}"
    elif satellite.eirp_raster is not None:
        source = f"raster, {satellite.eirp_raster.name}"
    elif satellite.beams:
        source = f"{len(satellite.beams)} elliptical beam{'s' if len(satellite.beams) > 1 else ''}"
    else:
        source = f"{satellite.eirp_dbw:g} dBW everywhere"
    parts = [source]
    if satellite.eirp_offset_db:
        parts.append(f"operating point {number(satellite.eirp_offset_db)} dB")
    if satellite.eirp_spread_db:
        parts.append(f"scatter {satellite.eirp_spread_db:g} dB")
    return "; ".join(parts)


def _carrier(one: Any) -> str:
    waveform = f"{one.modcod}, " if one.modcod else ""
    needs = number(one.required_es_n0_db + one.implementation_loss_db, 2)
    return (
        f"{one.polarisation}, {one.frequency_ghz:g} GHz, {one.symbol_rate_mbaud:g} Mbaud, "
        f"{waveform}needs Es/N0 {needs} dB"
    )


def _crossed(one: Any) -> str:
    return f"in use, {one.crossed_offset_db:+g} dB".replace("-", "−") if one.crossed else "empty"


def by_action(counts: dict[str, int], areas: dict[str, dict[str, float]] | None) -> Grid:
    """How many sites and how much of the region there are of each action."""
    total = sum(counts.values())
    rows = []
    for _, name in ACTIONS:
        share = number(100.0 * counts[name] / total, 1) if total else DASH
        row = (name, MEANINGS[name], str(counts[name]), share)
        rows.append(row if areas is None else (*row, number(areas[name]["percent"], 1)))
    heads = ("action", "what it means", "sites", "% of sites")
    if areas is None:
        return Grid("Sites by action.", heads, tuple(rows), "llrr", (20, 60, 10, 10))
    caption = "Sites, and true area of the region, by action; areas hold for the scenario's default terminal."
    return Grid(caption, (*heads, "% of area"), tuple(rows), "llrrr", (19, 52, 8, 10, 11))


def sensitivity_table(rows: list[dict[str, Any]]) -> Grid:
    """How many sites change action when one assumption changes."""
    used = [name for _, name in ACTIONS if any(row["by_action"][name] for row in rows)]
    body = tuple(
        (
            row["assumption"],
            row["value"].replace("-", "−"),
            str(row["sites_that_change"]) if number_ else DASH,
            str(row["at_risk"]),
            *(str(row["by_action"][name]) for name in used),
        )
        for number_, row in enumerate(rows)
    )
    caption = (
        'Sensitivity: the same sites judged with one assumption changed at a time. "change": sites whose '
        'action differs from the plan. "at risk": sites whose own action leaves a chance of failure above '
        f"{RISK_PERCENT:g} %, given the spread of settings and of EIRP. The rest: sites by action."
    )
    heads = ("assumption", "value", "change", "at risk", *used)
    lengths = [max(len(name) + 2, 9) for name in used]
    widths = (24.0, 16.0, 8.0, 8.0, *(44.0 * one / sum(lengths) for one in lengths))
    return Grid(caption, heads, body, "ll" + "r" * (2 + len(used)), widths)


def crew_table(planned: Planned) -> Grid:
    """What each crew does."""
    days = planned.plan.days
    rows = []
    for crew, part in days.groupby("crew", sort=True):
        busiest = int(part["visits"].max())
        spans = f"{part['day'].min():%d %b} to {part['day'].max():%d %b %Y}"
        rows.append(
            (
                str(crew),
                str(int(part["visits"].sum())),
                str(len(part)),
                str(busiest),
                f"{part['km'].sum():,.0f}",
                spans,
            )
        )
    heads = ("crew", "visits", "days at work", "most a day", "km", "from, to")
    return Grid("Load of the crews.", heads, tuple(rows), "lrrrrr", (28, 12, 14, 12, 12, 22))


def worst_table(table: Any, suffix: str, count: int) -> Grid:
    """The sites that lose most when nothing is touched."""
    column = f"margin_untouched{suffix}"
    order = table[column].astype(float).dropna().sort_values(kind="stable").index[:count]
    rows = []
    for index in order:
        row = table.loc[index]
        name = str(row["name"]) if "name" in table and isinstance(row["name"], str) else ""
        best = float(row[f"margin_realigned{suffix}"])
        shared = min(float(row[f"margin_shared_before{suffix}"]), float(row[f"margin_shared_after{suffix}"]))
        rows.append(
            (
                f"{row['id']}  {name}".strip(),
                str(row["action"]),
                number(float(row[column])),
                number(shared),
                number(best),
                number(float(row["turn_shared"])),
            )
        )
    heads = ("site", "action", "untouched, dB", "shared, dB", "realigned, dB", "shared turn, °")
    caption = (
        f"The {len(rows)} sites with the least margin after the changeover when nothing is touched: that "
        "margin, the lesser margin of both moments at the shared setting, the margin of a realigned dish and "
        "feed, and the turn to the shared setting (clockwise positive, looking towards the satellite)."
    )
    return Grid(caption, heads, tuple(rows), "llrrrr", (33, 16, 13, 11, 13, 14))


def assumptions_list(scenario: Scenario, judged: str, notes: tuple[str, ...]) -> tuple[str, ...]:
    """What the numbers rest on, in sentences."""
    terminal, rule = scenario.terminal, scenario.decision
    lines = [
        f"Decision: {judged}; the reserve is {rule.reserve_db:g} dB; a moment whose best margin is below it "
        f"may lose {rule.allowed_loss_db:g} dB; isolations add by {rule.addition}.",
        f"Default terminal: dish {terminal.dish_m:g} m of efficiency {terminal.efficiency:g}, noise figure "
        f"{terminal.noise_figure_db:g} dB, feed loss {terminal.feed_loss_db:g} dB, cross-polar isolation "
        f"{terminal.isolation_db:g} dB, pointing error {terminal.pointing_error_deg:g}°, settings scatter by "
        f"{terminal.setting_spread_deg:g}° (standard deviation). Sites with values of their own keep them.",
        "A feed whose present setting was not measured counts as aligned to the satellite in service.",
        f"Satellites below {scenario.lowest_elevation_deg:g}° of elevation serve nobody.",
        "Skew, settings and turns are clockwise positive for a person who looks towards the satellite; the "
        "E-vector is carried from the beam axis after Ludwig's third definition; angles are modulo 180°.",
        "Thresholds are those of EN 302 307-1 Table 13 or EN 300 421 unless the scenario gives a number.",
    ]
    if scenario.weather is None:
        lines.append("No [weather]: margins hold for clear sky, rain is not part of them.")
    if scenario.terrain is None:
        lines.append("No [terrain]: nothing is taken to be hidden by terrain or buildings.")
    return (*lines, *notes)
