"use strict";
// Numbers, units and instructions in words.
(function (fm) {
  const DECIMALS = { deg: 1, dB: 1, dBW: 1, km: 0, percent: 1, "hours/year": 0 };
  const UNITS = { deg: "°", dB: " dB", dBW: " dBW", km: " km", percent: " %", "hours/year": " h/year" };

  fm.none = "no value";

  // A number with a true minus sign; never "−0.0".
  fm.number = function (value, decimals) {
    const text = Math.abs(value).toFixed(decimals);
    return value < 0 && Number(text) !== 0 ? "−" + text : text;
  };

  fm.withUnit = function (value, unit, decimals) {
    if (!Number.isFinite(value)) return fm.none;
    const places = decimals === undefined ? DECIMALS[unit] : decimals;
    return fm.number(value, places === undefined ? 2 : places) + (UNITS[unit] || (unit ? " " + unit : ""));
  };

  fm.layerValue = function (record, value) {
    if (!Number.isFinite(value)) return fm.none;
    if (record.classes && record.classes.length) {
      const found = record.classes.find((entry) => entry[0] === Math.round(value));
      return found ? found[1] : fm.none;
    }
    return fm.withUnit(value, record.unit);
  };

  // As people copy it: latitude, longitude, decimal degrees.
  fm.coordinates = (latitude, longitude, decimals) =>
    `${latitude.toFixed(decimals)}, ${fm.inRange(longitude).toFixed(decimals)}`;
  fm.inRange = (longitude) => {
    const wrapped = ((((longitude + 180) % 360) + 360) % 360) - 180;
    return Object.is(wrapped, -0) ? 0 : wrapped;
  };
  fm.nearMiddle = (longitude) => longitude + 360 * Math.round((fm.middle - longitude) / 360);

  fm.shortened = function (text, most) {
    const letters = Array.from(String(text).slice(0, 4 * most));
    return letters.length > most ? letters.slice(0, most - 1).join("") + "…" : letters.join("");
  };

  fm.readableName = (layer) => layer.replaceAll("_", " ");

  // A turn, both ways to stand; positive is clockwise for a person who looks towards the satellite.
  fm.turnWords = function (turn) {
    if (!Number.isFinite(turn)) return null;
    const size = Math.abs(turn);
    if (size < 0.05) return { size: 0, behind: "no turn", front: "no turn", sense: 0 };
    const amount = fm.number(size, 1) + "°";
    const [behind, front] = turn > 0 ? ["clockwise", "anticlockwise"] : ["anticlockwise", "clockwise"];
    return {
      size,
      sense: Math.sign(turn),
      behind: `Standing behind the dish, looking towards the satellite: turn ${behind} by ${amount}.`,
      front: `Standing in front, looking into the dish: turn ${front} by ${amount}.`,
    };
  };

  const TASKS = {
    leave: "Leave as it is: an untouched feed keeps the reserve after the changeover.",
    preset: "One visit ahead of time: turn the feed to the shared setting, which serves both satellites.",
    "turn-at-changeover": "Turn the feed when the new satellite takes over; no one setting serves both.",
    "re-aim": "Move the dish to the new satellite at the changeover, then set the feed.",
    upgrade: "Even perfectly set, the reserve is not kept: a larger dish, a better feed or another carrier.",
    "no-sight": "The new satellite is below the lowest usable elevation here, or terrain is in the way.",
  };
  fm.task = (action) => TASKS[action] || "";
  // Which turn belongs to an action; none for those that no turn helps.
  fm.turnLayer = (action) =>
    ({ preset: "turn_shared", "turn-at-changeover": "turn_realigned", "re-aim": "turn_realigned" })[action] || null;
})(globalThis.FieldMap);
