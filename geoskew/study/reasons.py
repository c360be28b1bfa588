"""Why a site's action is what it is, and what a reader must know of the whole scenario."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.situation.ports import is_linear, old_port

if TYPE_CHECKING:
    import pandas as pd

    from geoskew.scenario import Scenario

REASONS: Final = {
    "leave": "untouched, the feed keeps the reserve after the changeover",
    "preset": "one setting, made ahead of time, keeps what both moments are held to",
    "turn-at-changeover": "no setting keeps what both moments are held to",
    "re-aim": "even with the feed set for it, the new satellite is too far from the dish's old aim",
    "upgrade": "even perfectly set for the new satellite the reserve is not kept",
    "no-sight": "the new satellite stands below the lowest usable elevation",
}


_MORE_PORTS: Final = "; one port cannot serve both new polarisations: a second port is needed"


# Identifiers named in one remark.
MOST_NAMED: Final = 10


def action_reasons(scenario: Scenario, actions: NDArray[Any], ports: Any) -> NDArray[Any]:
    """A line a site: the reason of its action, and the port to take where that changes."""
    ports = np.broadcast_to(np.asarray(ports), actions.shape)
    counts = {int(one) for one in np.unique(ports)}
    remarks = {count: port_remark(scenario, count) for count in counts}
    more = {count: _MORE_PORTS for count in counts if needs_second_port(scenario, count)}
    upgrades = remarks | more
    reasons = np.empty(actions.shape, dtype=object)
    for index, name in enumerate(actions):
        remark = (upgrades if name == "upgrade" else remarks)[int(ports[index])]
        reasons[index] = REASONS[name] + ("" if name == "no-sight" else remark)
    return reasons


def needs_second_port(scenario: Scenario, ports: int) -> bool:
    """Whether new carriers of both linear polarisations would have to share one port, 90° apart."""
    new = {one.polarisation for one in scenario.carriers_after if is_linear(one)}
    return ports == 1 and old_port(scenario.carriers_before) is not None and len(new) > 1


def port_remark(scenario: Scenario, ports: int) -> str:
    """What to say of ports where the new carriers' polarisation is not the old one's; empty: nothing."""
    remarks = []
    single = old_port(scenario.carriers_before)
    # What holds for all sites stands in the scenario's notes.
    if ports == 1 and scenario.terminal.ports != 1 and _port_is_switched(scenario):
        remarks.append("one port: a switched port is assumed")
    for old, new in zip(scenario.carriers_before, scenario.carriers_after, strict=True):
        if is_linear(old) and is_linear(new):
            if new.polarisation == old.polarisation:
                continue
            if ports == 2 or single is None:
                remarks.append(f"{new.name}: take the {new.polarisation} port, no turn for it")
            else:
                remarks.append(f"{new.name}: the {single} port takes {new.polarisation}, a quarter turn")
        elif is_linear(old) != is_linear(new):
            remarks.append(f"{new.name}: linear against circular, 3.01 dB at any setting")
        elif old.polarisation != new.polarisation:
            remarks.append(f"{new.name}: take the other port")
    return "".join(f"; {remark}" for remark in remarks)


def _port_is_switched(scenario: Scenario) -> bool:
    """Whether old carriers of both linear polarisations come through one port, if there is but one."""
    before = scenario.carriers_before
    return any(is_linear(one) for one in before) and old_port(before) is None


def scenario_notes(scenario: Scenario) -> list[str]:
    """Assumptions that every output of a scenario must state."""
    notes = []
    if _port_is_switched(scenario) and scenario.terminal.ports == 1:
        notes.append("carriers of both polarisations on one port: a switched port is assumed")
    return notes


def measured_remarks(table: pd.DataFrame) -> list[str]:
    """A warning where a measured setting says that a site receives nothing today: a wrong reading."""
    if "setting_deg" not in table.columns:
        return []
    margins = table["margin_before"]
    doubtful = table.loc[table["setting_deg"].notna() & (margins < 0.0), "id"].tolist()
    if not doubtful:
        return []
    shown = ", ".join(doubtful[:MOST_NAMED]) + (", ..." if len(doubtful) > MOST_NAMED else "")
    return [
        f"{len(doubtful)} measured settings leave no margin in clear sky today; measure them again, "
        f"with the sign as seen from behind the dish: {shown}"
    ]
