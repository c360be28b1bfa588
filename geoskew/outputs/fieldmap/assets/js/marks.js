"use strict";
// Sites as marks: shape and colour by action, size by weight, all on one canvas.
(function (fm) {
  const REACH = 22; // half of a 44 px target
  const CELL = 6; // when marks are closer than this, the one with the gravest action stands for all

  const SHAPES = {
    dot(pen, r) {
      pen.arc(0, 0, r, 0, 2 * Math.PI);
    },
    square(pen, r) {
      pen.rect(-r * 0.88, -r * 0.88, r * 1.76, r * 1.76);
    },
    triangle(pen, r) {
      pen.moveTo(0, -r * 1.15);
      pen.lineTo(r * 1.1, r * 0.85);
      pen.lineTo(-r * 1.1, r * 0.85);
      pen.closePath();
    },
    diamond(pen, r) {
      pen.moveTo(0, -r * 1.25);
      pen.lineTo(r * 1.25, 0);
      pen.lineTo(0, r * 1.25);
      pen.lineTo(-r * 1.25, 0);
      pen.closePath();
    },
    cross(pen, r) {
      const [a, b] = [r * 0.42, r * 1.15];
      const corners = [[-a, -b], [a, -b], [a, -a], [b, -a], [b, a], [a, a], [a, b], [-a, b], [-a, a], [-b, a], [-b, -a], [-a, -a]];
      corners.forEach(([x, y], i) => (i ? pen.lineTo(x, y) : pen.moveTo(x, y)));
      pen.closePath();
    },
    bar(pen, r) {
      pen.rect(-r * 1.3, -r * 0.5, r * 2.6, r);
    },
    ring(pen, r) {
      pen.arc(0, 0, r * 0.8, 0, 2 * Math.PI);
    },
  };

  fm.drawShape = function (pen, shape, colour, r) {
    pen.beginPath();
    SHAPES[shape](pen, r);
    pen.lineJoin = "round";
    pen.lineWidth = r < 6 ? 2.4 : 3;
    pen.strokeStyle = "#ffffff";
    pen.stroke();
    pen.fillStyle = colour;
    pen.fill();
    pen.lineWidth = 1;
    pen.strokeStyle = "#15191c";
    pen.stroke();
  };

  // The same shape as an element, for lists and keys.
  fm.shapeElement = function (kind, size) {
    const canvas = fm.element("canvas", { class: "shape", "aria-hidden": "true", width: size * 2, height: size * 2 });
    const pen = canvas.getContext("2d");
    pen.setTransform(2, 0, 0, 2, size, size);
    fm.drawShape(pen, kind.shape, kind.colour, size * 0.32);
    return canvas;
  };

  fm.noAction = { code: 255, name: "no action", colour: "#9a9a94", shape: "ring" };

  class Marks {
    constructor(sites, classes) {
      this.sites = sites;
      this.kinds = new Map(classes.map((kind) => [kind.code, kind]));
      this.x = Float64Array.from(sites.longitude, (longitude) => fm.worldX(fm.nearMiddle(longitude)));
      this.y = Float64Array.from(sites.latitude, (latitude) => fm.worldY(latitude));
      this.chosen = -1;
      this.drawn = 0;
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
        const r = [4.6, 6, 7.8][size];
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
      this.drawn = picked.length;
      for (const i of picked) {
        const { canvas, half } = this.sprite(this.sites.action[i], this.size[i], view.density);
        const x = this.x[i] * view.scale - view.left;
        const y = this.y[i] * view.scale - view.top;
        pen.drawImage(canvas, x - half, y - half, 2 * half, 2 * half);
      }
      if (picked.length <= 40) this.nameThem(pen, view, picked);
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
