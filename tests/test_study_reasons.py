"""What an action's reason says of ports, after the conventions' sections on ports and circular polarisation."""

from __future__ import annotations

import numpy as np
import pytest
from scenes import scenario

from geoskew.scenario import Scenario
from geoskew.study.reasons import action_reasons, port_remark, scenario_notes


def scene(before: str, after: str, ports: int = 1) -> Scenario:
    """Carriers a, b, ... with the polarisations of the letters, before and after."""
    rest = {"frequency_ghz": 11.95, "symbol_rate_mbaud": 27.5, "required_es_n0_db": 7.9}
    carriers = [{"name": name, "polarisation": one, **rest} for name, one in zip("ab", before, strict=False)]
    new = [{"name": name, "polarisation": one} for name, one in zip("ab", after, strict=False)]
    return scenario(carrier=carriers, incoming={"carrier": new}, terminal={"ports": ports})


@pytest.mark.parametrize(
    ("before", "after", "ports", "remark"),
    [
        ("V", "V", 1, ""),
        ("V", "V", 2, ""),
        ("V", "H", 1, "; a: the V port takes H, a quarter turn"),
        ("H", "V", 1, "; a: the H port takes V, a quarter turn"),
        ("V", "H", 2, "; a: take the H port, no turn for it"),
        ("VV", "VH", 1, "; b: the V port takes H, a quarter turn"),
        # Both polarisations before: the port of a carrier that changes is switched, and so it is said.
        ("VH", "VH", 1, ""),
        ("VH", "HH", 1, "; a: take the H port, no turn for it"),
        ("VH", "HV", 2, "; a: take the H port, no turn for it; b: take the V port, no turn for it"),
        ("L", "R", 1, "; a: take the other port"),
        ("V", "L", 1, "; a: linear against circular, 3.01 dB at any setting"),
    ],
)
def test_port_remark(before: str, after: str, ports: int, remark: str) -> None:
    assert port_remark(scene(before, after, ports), ports) == remark


def test_a_switched_port_is_said_once() -> None:
    assert len(scenario_notes(scene("VH", "VH", ports=1))) == 1
    assert port_remark(scene("VH", "VH", ports=1), 1) == ""
    # A site with one port where the scenario's terminals have two: nobody else says it.
    assert scenario_notes(scene("VH", "VH", ports=2)) == []
    assert port_remark(scene("VH", "VH", ports=2), 1) == "; one port: a switched port is assumed"
    assert scenario_notes(scene("VV", "VV", ports=1)) == []


@pytest.mark.parametrize(
    ("before", "after", "ports", "needed"),
    [("VV", "VH", 1, True), ("VV", "VH", 2, False), ("VV", "HH", 1, False), ("VH", "HV", 1, False)],
)
def test_an_upgrade_says_where_a_second_port_is_needed(
    before: str, after: str, ports: int, needed: bool
) -> None:
    one = scene(before, after, ports)
    upgrade, leave = action_reasons(one, np.array(["upgrade", "leave"], dtype=object), ports)
    assert ("a second port is needed" in upgrade) == needed
    assert "second port" not in leave
    if needed:
        assert "a quarter turn" not in upgrade
