"""Units and meanings of the columns that are not layers."""

from __future__ import annotations

from typing import Final

GIVEN: Final[dict[str, tuple[str, str]]] = {
    "id": ("", "identifier of the site"),
    "lat": ("deg", "latitude, WGS 84, positive north"),
    "lon": ("deg", "longitude, WGS 84, positive east"),
    "name": ("", "name of the site"),
    "height_m": ("m", "height above the ellipsoid or mean sea level"),
    "antenna_height_m": ("m", "height of the antenna above the ground, for terrain"),
    "dish_m": ("m", "diameter of the dish"),
    "efficiency": ("", "aperture efficiency of the dish"),
    "noise_figure_db": ("dB", "noise figure of the LNB"),
    "feed_loss_db": ("dB", "loss between dish and LNB"),
    "radome_loss_db": ("dB", "loss of a radome"),
    "ground_noise_k": ("K", "noise that the dish picks up from the ground"),
    "isolation_db": ("dB", "cross-polar isolation of dish and feed"),
    "pointing_error_deg": ("deg", "pointing error of the dish"),
    "setting_spread_deg": ("deg", "standard deviation of how well the feed is set"),
    "scale_step_deg": ("deg", "distance between marks of the feed's scale"),
    "ports": ("", "ports of the feed: 2 where both polarisations are led out"),
    "mount": ("", "kind of mount"),
    "transmits": ("", "whether the site transmits"),
    "setting_deg": ("deg", "present setting of the feed, measured, clockwise looking towards the satellite"),
    "setting_source": ("", "how the present setting was measured"),
    "feed_low_deg": ("deg", "lower stop of the feed, as a setting, clockwise looking towards the satellite"),
    "feed_high_deg": ("deg", "upper stop of the feed, as a setting, clockwise looking towards the satellite"),
    "feed_fixed": ("", "whether the feed cannot be turned"),
    "scale_zero_deg": ("deg", "setting at the zero of the feed's scale"),
    "scale_sense": ("", "which way the scale's numbers grow, seen from behind"),
    "carriers": ("", "carriers that the site receives"),
    "weight": ("", "importance of the site"),
    "district": ("", "district of the site"),
    "access": ("", "what to know of the way there"),
    "last_visit": ("", "date of the last visit"),
    "action_reason": ("", "why this action, and the port to take where that changes"),
    "turn_to_make": (
        "deg",
        "turn that the crew makes, within the feed's stops, positive clockwise seen from behind the dish",
    ),
    "turn_remark": ("", "what goes with the turn to make: leads to exchange, a stop, or why there is none"),
    "weakest_before": (
        "",
        "carrier with the least margin before the changeover, feed and dish perfectly set",
    ),
    "weakest_after": ("", "carrier with the least margin after the changeover, feed and dish perfectly set"),
}
