"use strict";
// Land, coast and borders from the packed outlines.
(function (fm) {
  // Lines of a packed block in world coordinates: from[i] to from[i + 1] is line i.
  fm.linesOf = function (block) {
    const scale = 10 ** block.facts.decimals;
    const lengths = block.array("lengths");
    const from = new Uint32Array(lengths.length + 1);
    for (let i = 0; i < lengths.length; i++) from[i + 1] = from[i] + lengths[i];
    const raw = ["x", "y"].map((name) => {
      const steps = block.array(name);
      const whole = new Int32Array(steps.length);
      let sum = 0;
      for (let i = 0; i < steps.length; i++) {
        sum = (sum + ((steps[i] >>> 1) ^ -(steps[i] & 1))) | 0;
        whole[i] = sum;
      }
      return whole;
    });
    const x = Float64Array.from(raw[0], (value) => fm.worldX(value / scale - 720));
    const y = Float64Array.from(raw[1], (value) => fm.worldY(value / scale - 720));
    const boxes = [];
    for (let line = 0; line < lengths.length; line++) {
      const box = [Infinity, Infinity, -Infinity, -Infinity];
      for (let i = from[line]; i < from[line + 1]; i++) {
        box[0] = Math.min(box[0], x[i]);
        box[1] = Math.min(box[1], y[i]);
        box[2] = Math.max(box[2], x[i]);
        box[3] = Math.max(box[3], y[i]);
      }
      boxes.push(box);
    }
    return { count: lengths.length, from, x, y, boxes, raw, facts: block.facts };
  };

  fm.onSheet = function (lines, line, view) {
    const box = lines.boxes[line];
    return (
      box[2] * view.scale - view.left >= view.min.x &&
      box[0] * view.scale - view.left <= view.max.x &&
      box[3] * view.scale - view.top >= view.min.y &&
      box[1] * view.scale - view.top <= view.max.y
    );
  };

  fm.trace = function (pen, lines, line, view, skip) {
    let lifted = true;
    for (let i = lines.from[line]; i < lines.from[line + 1]; i++) {
      const x = lines.x[i] * view.scale - view.left;
      const y = lines.y[i] * view.scale - view.top;
      if (lifted || (skip && skip[i])) pen.moveTo(x, y);
      else pen.lineTo(x, y);
      lifted = false;
    }
  };

  // Where land was cut (at the box and where the source is cut, on ±180°) there is no coast to draw.
  function cuts(lines) {
    const [west, south, east, north] = lines.facts.edges;
    const [x, y] = lines.raw;
    const meridians = new Set([west, east, 540000, 900000, 1260000, 180000]);
    const parallels = new Set([south, north, 630000]);
    const out = new Uint8Array(x.length);
    for (let i = 1; i < x.length; i++) {
      const upright = x[i] === x[i - 1] && meridians.has(x[i]);
      const level = y[i] === y[i - 1] && parallels.has(y[i]);
      out[i] = upright || level ? 1 : 0;
    }
    return out;
  }

  fm.makeBasemap = function (block) {
    const lines = fm.linesOf(block);
    const skip = cuts(lines);
    const land = lines.facts.land;
    const stroke = function (pen, view, first, last, width, colour, dash) {
      pen.beginPath();
      for (let line = first; line < last; line++) {
        if (fm.onSheet(lines, line, view)) fm.trace(pen, lines, line, view, first === 0 ? skip : null);
      }
      pen.setLineDash(dash);
      pen.lineWidth = width;
      pen.strokeStyle = colour;
      pen.stroke();
      pen.setLineDash([]);
    };
    return {
      lines,
      fill(pen, view) {
        pen.beginPath();
        for (let line = 0; line < land; line++) {
          if (fm.onSheet(lines, line, view)) fm.trace(pen, lines, line, view, null);
        }
        pen.fillStyle = fm.inks().land;
        pen.fill("evenodd");
      },
      outline(pen, view) {
        pen.lineJoin = "round";
        stroke(pen, view, 0, land, 1.2, fm.inks().coast, []);
        stroke(pen, view, land, lines.count, 1, fm.inks().border, [5, 3]);
      },
    };
  };

  // Names of places that the caller gave, most of them wherever there is room.
  fm.drawNames = function (pen, view, names, space) {
    pen.font = "500 12px system-ui, sans-serif";
    for (const [name, longitude, latitude] of names) {
      const x = fm.worldX(fm.nearMiddle(longitude)) * view.scale - view.left;
      const y = fm.worldY(latitude) * view.scale - view.top;
      if (x < view.min.x || x > view.max.x || y < view.min.y || y > view.max.y) continue;
      const short = fm.shortened(name, 32);
      if (space.claim(x, y - 10, pen.measureText(short).width + 8, 16)) fm.haloText(pen, short, x, y - 10, 0);
    }
  };
})(globalThis.FieldMap);
