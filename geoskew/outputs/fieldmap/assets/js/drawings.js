"use strict";
// Small pictures drawn with lines, for the card on the screen and on paper.
(function (fm) {
  // Margins of the policies on one scale: rows of {label, values: [{value, mark}]}.
  fm.drawMargins = function (rows, reserve) {
    const values = rows.flatMap((row) => row.values.map((entry) => entry.value)).filter(Number.isFinite);
    if (values.length === 0) return null;
    const low = Math.max(-12, Math.min(-1, Math.floor(Math.min(...values) - 0.5)));
    const high = Math.max(reserve + 2, Math.ceil(Math.max(...values) + 0.5));
    const [left, right, line] = [112, 348, 26];
    const height = rows.length * line + 42;
    const x = (value) => left + ((Math.max(low, Math.min(high, value)) - low) / (high - low)) * (right - left);
    const parts = [
      fm.svg("rect", { class: "bad", x: left, y: 8, width: Math.max(0, x(0) - left), height: height - 34 }),
      fm.svg("rect", { class: "thin", x: x(0), y: 8, width: Math.max(0, x(reserve) - x(0)), height: height - 34 }),
      fm.svg("line", { class: "axis", x1: x(0), x2: x(0), y1: 4, y2: height - 22 }),
      fm.svg("line", { class: "limit", x1: x(reserve), x2: x(reserve), y1: 4, y2: height - 22 }),
      ...scaleMarks(low, high, x, height),
      ...rows.flatMap((row, at) => marginRow(row, 22 + at * line, x, low, left)),
    ];
    const words = rows.map((row) => `${row.label} ${row.values.map((entry) => fm.withUnit(entry.value, "dB")).join(" and ")}`);
    return fm.svg(
      "svg",
      { class: "margins", viewBox: `0 0 420 ${height}`, role: "img", "aria-label": `Margins: ${words.join("; ")}. Reserve ${fm.number(reserve, 1)} dB.` },
      parts
    );
  };

  function scaleMarks(low, high, x, height) {
    const span = high - low;
    const step = span > 40 ? 10 : span > 16 ? 5 : span > 8 ? 2 : 1;
    const out = [];
    for (let value = Math.ceil(low / step) * step; value <= high; value += step) {
      out.push(fm.svg("text", { class: "tick", x: x(value), y: height - 6, "text-anchor": "middle" }, fm.number(value, 0)));
    }
    out.push(fm.svg("text", { class: "tick", x: 416, y: height - 6, "text-anchor": "end" }, "dB"));
    return out;
  }

  // Two values of one row (before and after) are joined, so that the lesser one is seen to count.
  function marginRow(row, y, x, low, left) {
    const good = row.values.filter((entry) => Number.isFinite(entry.value));
    const out = [fm.svg("text", { class: "label", x: left - 8, y: y + 4, "text-anchor": "end" }, row.label)];
    if (good.length === 0) {
      out.push(fm.svg("text", { class: "tick", x: left + 6, y: y + 4 }, fm.none));
      return out;
    }
    if (good.length > 1) {
      const ends = good.map((entry) => x(entry.value));
      out.push(fm.svg("line", { class: "tie", x1: Math.min(...ends), x2: Math.max(...ends), y1: y, y2: y }));
    }
    for (const entry of good) {
      const at = x(entry.value);
      const below = entry.value < low;
      if (below) out.push(fm.svg("path", { class: "mark", d: `M${at + 9},${y - 6} L${at},${y} L${at + 9},${y + 6} Z` }));
      else if (entry.mark === "before") out.push(fm.svg("circle", { class: "mark hollow", cx: at, cy: y, r: 5 }));
      else out.push(fm.svg("circle", { class: "mark", cx: at, cy: y, r: 5.5 }));
    }
    const least = Math.min(...good.map((entry) => entry.value));
    out.push(fm.svg("text", { class: "value", x: 416, y: y + 4, "text-anchor": "end" }, fm.number(least, 1)));
    return out;
  }

  // The good turns about the present setting, with the shared turn in them.
  fm.drawWindow = function (low, high, shared) {
    if (![low, high, shared].every(Number.isFinite)) return null;
    const reach = Math.min(90, Math.max(15, Math.ceil(Math.max(Math.abs(low), Math.abs(high), Math.abs(shared)) / 5) * 5 + 5));
    const x = (turn) => 210 + (Math.max(-reach, Math.min(reach, turn)) / reach) * 196;
    const label = (at, y, text, anchor) => fm.svg("text", { class: "tick", x: at, y, "text-anchor": anchor }, text);
    return fm.svg(
      "svg",
      { class: "window", viewBox: "0 0 420 62", role: "img", "aria-label": `Good turns from ${fm.withUnit(low, "deg")} to ${fm.withUnit(high, "deg")}, shared turn ${fm.withUnit(shared, "deg")}` },
      fm.svg("line", { class: "axis", x1: 14, x2: 406, y1: 26, y2: 26 }),
      fm.svg("rect", { class: "good", x: x(low), y: 19, width: Math.max(2, x(high) - x(low)), height: 14 }),
      fm.svg("line", { class: "axis", x1: 210, x2: 210, y1: 14, y2: 38 }),
      fm.svg("path", { class: "mark", d: `M${x(shared)},${18} l-6,-11 h12 Z` }),
      label(210, 54, "present setting", "middle"),
      label(14, 54, `anticlockwise ${reach}°`, "start"),
      label(406, 54, `clockwise ${reach}°`, "end")
    );
  };
})(globalThis.FieldMap);
