"use strict";
// Isolines with their values along the line, and day routes of crews.
(function (fm) {
  const APART = 340; // pixels between two values on one line

  fm.makeContours = function (block) {
    const lines = fm.linesOf(block);
    return {
      lines,
      layer: block.array("layer"),
      names: block.texts.layers,
      units: block.texts.units,
      levels: block.facts.levels,
    };
  };

  fm.drawContours = function (pen, view, contours, wanted, space) {
    const { lines } = contours;
    const shown = [];
    for (let line = 0; line < lines.count; line++) {
      if (wanted.has(contours.names[contours.layer[line]]) && fm.onSheet(lines, line, view)) shown.push(line);
    }
    const { ink, paper } = fm.inks();
    pen.lineJoin = "round";
    for (const [width, colour] of [[3, paper], [1.3, ink]]) {
      pen.beginPath();
      for (const line of shown) fm.trace(pen, lines, line, view, null);
      pen.globalAlpha = width > 2 ? 0.55 : 1;
      pen.lineWidth = width;
      pen.strokeStyle = colour;
      pen.stroke();
    }
    pen.globalAlpha = 1;
    pen.font = "600 11px system-ui, sans-serif";
    for (const line of shown) labelAlong(pen, view, contours, line, space);
  };

  function levelText(contours, line) {
    const level = contours.levels[line];
    const text = fm.number(level, Number.isInteger(level) ? 0 : Number.isInteger(level * 10) ? 1 : 2);
    return text + (contours.units[contours.layer[line]] === "deg" ? "°" : "");
  }

  // Walks along the line on the screen and writes the value where there is room and the line is calm.
  function labelAlong(pen, view, { lines, levels, units, layer }, line, space) {
    const text = levelText({ levels, units, layer }, line);
    const width = pen.measureText(text).width + 10;
    let waited = APART * 0.65;
    for (let i = lines.from[line] + 1; i < lines.from[line + 1]; i++) {
      const x0 = lines.x[i - 1] * view.scale - view.left;
      const y0 = lines.y[i - 1] * view.scale - view.top;
      const x1 = lines.x[i] * view.scale - view.left;
      const y1 = lines.y[i] * view.scale - view.top;
      const length = Math.hypot(x1 - x0, y1 - y0);
      const inside = x1 > view.min.x && x1 < view.max.x && y1 > view.min.y && y1 < view.max.y;
      if (!inside) {
        waited += Math.min(length, APART);
        continue;
      }
      waited += length;
      if (waited < APART || length === 0) continue;
      let angle = Math.atan2(y1 - y0, x1 - x0);
      if (angle > Math.PI / 2) angle -= Math.PI;
      if (angle <= -Math.PI / 2) angle += Math.PI;
      const [x, y] = [(x0 + x1) / 2, (y0 + y1) / 2];
      const wide = Math.abs(width * Math.cos(angle)) + Math.abs(16 * Math.sin(angle));
      const high = Math.abs(width * Math.sin(angle)) + Math.abs(16 * Math.cos(angle));
      if (length < 4000 && space.claim(x, y, wide, high)) {
        fm.haloText(pen, text, x, y, angle);
        waited = 0;
      } else {
        waited = APART * 0.8;
      }
    }
  }

  fm.makeRoutes = (block) => ({ lines: fm.linesOf(block), crews: block.texts.crews, days: block.texts.days });

  // The routes of the crew and day that are chosen; all of a crew's when no day is.
  fm.drawRoutes = function (pen, view, routes, crew, day) {
    const { lines } = routes;
    const { route, paper } = fm.inks();
    for (const [width, colour] of [[6, paper], [3, route]]) {
      pen.beginPath();
      for (let line = 0; line < lines.count; line++) {
        if ((crew && routes.crews[line] !== crew) || (day && routes.days[line] !== day)) continue;
        if (fm.onSheet(lines, line, view)) fm.trace(pen, lines, line, view, null);
      }
      pen.lineWidth = width;
      pen.strokeStyle = colour;
      pen.setLineDash(width === 3 ? [10, 6] : []);
      pen.lineJoin = "round";
      pen.stroke();
    }
    pen.setLineDash([]);
  };
})(globalThis.FieldMap);
