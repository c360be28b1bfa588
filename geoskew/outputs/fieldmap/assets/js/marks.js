"use strict";
// Sites as marks: shape and colour by action, size by weight, all on one canvas.
(function (fm) {
  const REACH = 22; // half of a 44 px target
  const CELL = 6; // when marks are closer than this, the one with the gravest action stands for all
  const RADII = [4.6, 6, 7.8, 3.2];
  const SMALL = 3; // the size of all marks in a crowd
  const CROWD = 1200;

  // Outlines about the middle, for a radius; the same for the map and for lists.
  const round = (value) => Math.round(value * 100) / 100;
  const polygon = (points) => "M" + points.map((point) => point.map(round).join(",")).join("L") + "Z";
  const circle = (r) => `M${r},0A${r},${r} 0 1 1 ${-r},0A${r},${r} 0 1 1 ${r},0Z`;
  const box = (x, y) => polygon([[-x, -y], [x, -y], [x, y], [-x, y]]);
  const SHAPES = {
    dot: (r) => circle(round(r)),
    square: (r) => box(r * 0.88, r * 0.88),
    triangle: (r) => polygon([[0, -r * 1.15], [r * 1.1, r * 0.85], [-r * 1.1, r * 0.85]]),
    diamond: (r) => polygon([[0, -r * 1.25], [r * 1.25, 0], [0, r * 1.25], [-r * 1.25, 0]]),
    cross(r) {
      const [a, b] = [r * 0.42, r * 1.15];
      return polygon([[-a, -b], [a, -b], [a, -a], [b, -a], [b, a], [a, a], [a, b], [-a, b], [-a, a], [-b, a], [-b, -a], [-a, -a]]);
    },
    bar: (r) => box(r * 1.3, r * 0.5),
    ring: (r) => circle(round(r * 0.8)),
  };

  // Dark line, light halo: seen on any colour below.
  fm.drawShape = function (pen, shape, colour, r) {
    const outline = new Path2D(SHAPES[shape](r));
    pen.lineJoin = "round";
    pen.lineWidth = r < 4 ? 1.6 : r < 6 ? 2.4 : 3;
    pen.strokeStyle = "#ffffff";
    pen.stroke(outline);
    pen.fillStyle = colour;
    pen.fill(outline);
    pen.lineWidth = r < 4 ? 0.6 : 1;
    pen.strokeStyle = "#15191c";
    pen.stroke(outline);
  };

  // The same shape as an element, for lists and keys.
  fm.shapeElement = function (kind, size) {
    const d = SHAPES[kind.shape](size * 0.32);
    const half = size / 2;
    return fm.svg(
      "svg", { class: "shape", "aria-hidden": "true", width: size, height: size, viewBox: `${-half} ${-half} ${size} ${size}` },
      fm.svg("path", { d, fill: "none", stroke: "#ffffff", "stroke-width": 3, "stroke-linejoin": "round" }),
      fm.svg("path", { d, fill: kind.colour, stroke: "#15191c", "stroke-linejoin": "round" })
    );
  };

  fm.noAction = { code: 255, name: "no action", colour: "#9a9a94", shape: "ring" };

  class Marks {
    constructor(sites, classes) {
      this.sites = sites;
      this.kinds = new Map(classes.map((kind) => [kind.code, kind]));
      this.x = Float64Array.from(sites.longitude, (longitude) => fm.worldX(fm.nearMiddle(longitude)));
      this.y = Float64Array.from(sites.latitude, (latitude) => fm.worldY(latitude));
      this.chosen = -1;
      this.thinned = false;
      this.within = 0;
      this.sprites = new Map();
      this.size = sizesByWeight(sites.weight, sites.count);
    }

    kind(i) {
      return this.kinds.get(this.sites.action[i]) || fm.noAction;
    }

    sprite(code, size, density) {
      const key = code + ":" + size + ":" + density;
      if (!this.sprites.has(key)) {
        const r = RADII[size];
        const half = Math.ceil(r * 1.3 + 3);
        const canvas = document.createElement("canvas");
        canvas.width = canvas.height = 2 * half * density;
        const pen = canvas.getContext("2d");
        pen.setTransform(density, 0, 0, density, half * density, half * density);
        const kind = this.kinds.get(code) || fm.noAction;
        fm.drawShape(pen, kind.shape, kind.colour, r);
        this.sprites.set(key, { canvas, half });
      }
      return this.sprites.get(key);
    }

    // Gravest actions last, so that they lie on top; one mark a cell.
    pick(view) {
      const { action, count } = this.sites;
      const wide = Math.ceil((view.max.x - view.min.x) / CELL) + 1;
      const high = Math.ceil((view.max.y - view.min.y) / CELL) + 1;
      const cells = new Int32Array(wide * high).fill(-1);
      this.within = 0;
      for (let i = 0; i < count; i++) {
        if (!fm.choice.shown[i]) continue;
        const x = this.x[i] * view.scale - view.left - view.min.x;
        const y = this.y[i] * view.scale - view.top - view.min.y;
        if (x < 0 || y < 0 || x >= wide * CELL || y >= high * CELL) continue;
        this.within++;
        const cell = Math.floor(y / CELL) * wide + Math.floor(x / CELL);
        const other = cells[cell];
        if (other < 0 || grave(action[i]) > grave(action[other])) cells[cell] = i;
      }
      return cells.filter((i) => i >= 0).sort((a, b) => grave(action[a]) - grave(action[b]) || a - b);
    }

    draw(pen, view) {
      const picked = this.pick(view);
      const crowded = picked.length > CROWD;
      const thinned = this.within > 1.05 * picked.length;
      if (thinned !== this.thinned) {
        this.thinned = thinned;
        fm.tell("thinned");
      }
      for (const i of picked) {
        const { canvas, half } = this.sprite(this.sites.action[i], crowded ? SMALL : this.size[i], view.density);
        const x = this.x[i] * view.scale - view.left;
        const y = this.y[i] * view.scale - view.top;
        pen.drawImage(canvas, x - half, y - half, 2 * half, 2 * half);
      }
      const near = view.scale >= 256 * 2 ** 8;
      if (picked.length <= (near ? 40 : 14)) this.nameThem(pen, view, picked);
      if (this.chosen >= 0) this.halo(pen, view, this.chosen);
    }

    nameThem(pen, view, picked) {
      const space = new fm.LabelSpace();
      pen.font = "500 12px system-ui, sans-serif";
      for (let at = picked.length - 1; at >= 0; at--) {
        const i = picked[at];
        const text = fm.shortened(fm.siteTitle(i), 28);
        const x = this.x[i] * view.scale - view.left;
        const y = this.y[i] * view.scale - view.top + 18;
        if (space.claim(x, y, pen.measureText(text).width + 6, 15)) fm.haloText(pen, text, x, y, 0);
      }
    }

    halo(pen, view, i) {
      const x = this.x[i] * view.scale - view.left;
      const y = this.y[i] * view.scale - view.top;
      const { ink, paper } = fm.inks();
      for (const [width, colour] of [[6, paper], [3, ink]]) {
        pen.beginPath();
        pen.arc(x, y, 14, 0, 2 * Math.PI);
        pen.lineWidth = width;
        pen.strokeStyle = colour;
        pen.stroke();
      }
      const { canvas, half } = this.sprite(this.sites.action[i], 2, view.density);
      pen.drawImage(canvas, x - half, y - half, 2 * half, 2 * half);
    }

    // The shown site nearest to a point of the world, within `reach` pixels; −1 for none.
    nearest(x, y, scale, reach) {
      let best = -1;
      let least = ((reach === undefined ? REACH : reach) / scale) ** 2;
      for (let i = 0; i < this.sites.count; i++) {
        if (!fm.choice.shown[i]) continue;
        const distance = (this.x[i] - x) ** 2 + (this.y[i] - y) ** 2;
        if (distance < least) {
          least = distance;
          best = i;
        }
      }
      return best;
    }
  }

  const grave = (code) => (code === 255 ? -1 : code);

  // Three sizes: the lightest third, the middle, the heaviest tenth. Without weights all are middling.
  function sizesByWeight(weight, count) {
    const out = new Uint8Array(count).fill(1);
    if (!weight) return out;
    const good = Float64Array.from(weight.filter((value) => Number.isFinite(value))).sort();
    if (good.length === 0 || good[0] === good[good.length - 1]) return out;
    const [light, heavy] = [good[Math.floor(good.length / 3)], good[Math.floor(good.length * 0.9)]];
    for (let i = 0; i < count; i++) out[i] = weight[i] > heavy ? 2 : weight[i] <= light ? 0 : 1;
    return out;
  }

  fm.Marks = Marks;
})(globalThis.FieldMap);
