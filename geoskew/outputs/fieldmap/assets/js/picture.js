"use strict";
// Layers as pictures: codes of values on a Mercator grid, coloured here, so that what is read under the
// finger comes from the same numbers as the colour.
(function (fm) {
  const channels = (colour) => [1, 3, 5].map((at) => parseInt(colour.slice(at, at + 2), 16));

  fm.rampColour = function (ramp, position) {
    const held = Math.max(0, Math.min(1, position));
    let i = 1;
    while (i < ramp.length - 1 && ramp[i][0] < held) i++;
    const [low, high] = [ramp[i - 1], ramp[i]];
    const share = (held - low[0]) / (high[0] - low[0] || 1);
    const [from, to] = [channels(low[1]), channels(high[1])];
    return from.map((value, channel) => Math.round(value + share * (to[channel] - value)));
  };

  // First cell and number of cells between two edges of the sheet, and where they are drawn.
  function span(start, end, cells, scale, origin, least, most) {
    const cell = ((end - start) * scale) / cells;
    const from = start * scale - origin;
    const first = Math.max(0, Math.floor((least - from) / cell));
    const last = Math.min(cells, Math.ceil((most - from) / cell));
    return { first, count: last - first, at: from + first * cell, length: (last - first) * cell };
  }

  class Picture {
    constructor(facts, layer) {
      Object.assign(this, facts);
      this.record = layer;
      this.left = fm.worldX(this.west);
      this.right = fm.worldX(this.east);
      this.top = fm.worldY(this.north);
      this.bottom = fm.worldY(this.south);
      this.codes = null;
      this.canvas = null;
    }

    // Unpacks the grid once. The second difference is summed up modulo 65 536.
    async open() {
      if (this.codes !== null) return this;
      const block = await fm.openBlock(this.block);
      if (this.codes !== null) return this;
      const codes = block.array("grid");
      const width = this.columns;
      for (let row = 0, i = 0; row < this.rows; row++) {
        let along = 0;
        for (let column = 0; column < width; column++, i++) {
          along = (along + codes[i]) & 0xffff;
          codes[i] = row === 0 ? along : along + codes[i - width];
        }
      }
      this.codes = codes;
      return this;
    }

    valueOfCode(code) {
      return code === 0 ? NaN : this.offset + (code - 1) * this.step;
    }

    // Value of the cell at world coordinates; NaN outside and where the layer has none.
    valueAt(x, y) {
      if (this.codes === null) return NaN;
      const column = Math.floor(((x - this.left) / (this.right - this.left)) * this.columns);
      const row = Math.floor(((y - this.top) / (this.bottom - this.top)) * this.rows);
      if (column < 0 || column >= this.columns || row < 0 || row >= this.rows) return NaN;
      return this.valueOfCode(this.codes[row * this.columns + column]);
    }

    colourOf(value) {
      const { classes, ramp } = this.record;
      const { limits } = this;
      if (classes.length) {
        const found = classes.find((entry) => entry[0] === Math.round(value));
        return found ? channels(found[2]) : [128, 128, 128];
      }
      return fm.rampColour(ramp, (value - limits[0]) / (limits[1] - limits[0]));
    }

    paint() {
      if (this.canvas !== null || this.codes === null) return;
      const canvas = document.createElement("canvas");
      canvas.width = this.columns;
      canvas.height = this.rows;
      const pen = canvas.getContext("2d");
      const image = pen.createImageData(this.columns, this.rows);
      const pixels = new Uint32Array(image.data.buffer);
      const colours = new Uint32Array(65536);
      const codes = this.codes;
      for (let i = 0; i < codes.length; i++) {
        const code = codes[i];
        if (code === 0) continue;
        if (colours[code] === 0) {
          const [red, green, blue] = this.colourOf(this.valueOfCode(code));
          colours[code] = ((255 << 24) | (blue << 16) | (green << 8) | red) >>> 0;
        }
        pixels[i] = colours[code];
      }
      pen.putImageData(image, 0, 0);
      this.canvas = canvas;
    }

    draw(pen, view, opacity) {
      this.paint();
      if (this.canvas === null) return;
      // Only the cells in view: scaling the whole picture would cost time and exactness.
      const across = span(this.left, this.right, this.columns, view.scale, view.left, view.min.x, view.max.x);
      const down = span(this.top, this.bottom, this.rows, view.scale, view.top, view.min.y, view.max.y);
      if (across.count <= 0 || down.count <= 0) return;
      pen.save();
      // Cells are facts: no blur between them.
      pen.imageSmoothingEnabled = false;
      pen.globalAlpha = opacity;
      pen.drawImage(this.canvas, across.first, down.first, across.count, down.count, across.at, down.at, across.length, down.length);
      pen.restore();
    }
  }

  fm.makePictures = (meta) => meta.pictures.map((facts) => new Picture(facts, meta.layers[facts.layer]));
})(globalThis.FieldMap);
