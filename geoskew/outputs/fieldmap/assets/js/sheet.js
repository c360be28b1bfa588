"use strict";
// A sheet: one canvas over the whole view with a margin, which moves with the map and is drawn again
// when the movement ends. All drawing of this page happens on three sheets.
(function (fm) {
  const TILE = 256;

  // Whole world = 0..1 in both directions, spherical Mercator, y downwards.
  fm.worldX = (longitude) => (longitude + 180) / 360;
  fm.worldY = (latitude) => {
    const held = Math.max(-85.0511287798066, Math.min(85.0511287798066, latitude));
    return 0.5 - Math.asinh(Math.tan((held * Math.PI) / 180)) / (2 * Math.PI);
  };

  fm.Sheet = L.Renderer.extend({
    options: { padding: 0.15, draw: null },

    _initContainer() {
      this._container = document.createElement("canvas");
      this._container.setAttribute("aria-hidden", "true");
      this._pen = this._container.getContext("2d");
    },

    _destroyContainer() {
      cancelAnimationFrame(this._due);
      this._due = 0;
      this._container.remove();
      delete this._container;
      delete this._pen;
    },

    _update() {
      if (this._map._animatingZoom && this._bounds) return;
      L.Renderer.prototype._update.call(this);
      const size = this._bounds.getSize();
      // More than two device pixels a pixel cost memory and show nothing.
      const density = Math.min(window.devicePixelRatio || 1, 2);
      L.DomUtil.setPosition(this._container, this._bounds.min);
      this._container.width = Math.round(size.x * density);
      this._container.height = Math.round(size.y * density);
      this._container.style.width = size.x + "px";
      this._container.style.height = size.y + "px";
      this._density = density;
      this._draw();
    },

    _draw() {
      const { min, max } = this._bounds;
      const origin = this._map.getPixelOrigin();
      const scale = TILE * 2 ** this._map.getZoom();
      const pen = this._pen;
      pen.setTransform(1, 0, 0, 1, 0, 0);
      pen.clearRect(0, 0, this._container.width, this._container.height);
      pen.setTransform(this._density, 0, 0, this._density, -min.x * this._density, -min.y * this._density);
      // x = worldX·scale − left gives the place on the sheet.
      this.options.draw(pen, { scale, left: origin.x, top: origin.y, min, max, density: this._density });
    },

    // Draw again soon, once for any number of requests.
    redraw() {
      if (!this._map || this._due) return;
      this._due = requestAnimationFrame(() => {
        this._due = 0;
        if (this._map && !this._map._animatingZoom) this._draw();
      });
    },
  });

  // Colours of the sheets follow the theme; they are read from the style sheet, once a change.
  let inks = null;
  fm.inks = function () {
    if (inks === null) {
      const style = getComputedStyle(document.documentElement);
      const names = ["sea", "land", "coast", "border", "ink", "paper", "accent", "route"];
      inks = Object.fromEntries(names.map((name) => [name, style.getPropertyValue("--" + name).trim()]));
    }
    return inks;
  };
  fm.when("theme", () => (inks = null));

  // Words with a halo; returns false where another word already stands.
  fm.LabelSpace = class {
    constructor() {
      this.taken = [];
    }
    claim(x, y, width, height) {
      const box = [x - width / 2, y - height / 2, x + width / 2, y + height / 2];
      for (const other of this.taken) {
        if (box[0] < other[2] && box[2] > other[0] && box[1] < other[3] && box[3] > other[1]) return false;
      }
      this.taken.push(box);
      return true;
    }
  };

  fm.haloText = function (pen, text, x, y, angle) {
    const { ink, paper } = fm.inks();
    pen.save();
    pen.translate(x, y);
    if (angle) pen.rotate(angle);
    pen.textAlign = "center";
    pen.textBaseline = "middle";
    pen.lineJoin = "round";
    pen.lineWidth = 3.5;
    pen.strokeStyle = paper;
    pen.strokeText(text, 0, 0);
    pen.fillStyle = ink;
    pen.fillText(text, 0, 0);
    pen.restore();
  };
})(globalThis.FieldMap);
