"use strict";
// What is drawn: one layer as a picture, isolines, coverage, routes, names; and the key on the map.
(function (fm) {
  const state = { picture: "", opacity: 0.8, lines: new Set(), coverage: new Set(), routes: true, tiles: false };
  fm.drawing = state;
  let tileLayer = null;

  fm.buildLayers = function (meta) {
    const pane = fm.byId("pane-layers");
    const pictures = [["", "none"], ...fm.pictures.map((picture) => [picture.layer, picture.record.description])];
    const radios = pictures.map(([value, words]) => {
      const input = fm.element("input", { type: "radio", name: "picture", value, on: { change: () => fm.showPicture(value) } });
      return fm.element("label", { class: "tick" }, input, fm.element("span", {}, words, value ? fm.element("small", {}, `${value}${meta.layers[value].unit ? ", " + unitWord(meta.layers[value].unit) : ""}`) : null));
    });
    const opacity = fm.element("input", { type: "range", min: "20", max: "100", step: "5", value: String(state.opacity * 100), on: { input: (event) => { state.opacity = event.target.value / 100; fm.redrawGround(); } } });
    fm.replace(
      pane,
      group("Layer as a picture", radios, fm.pictures.length ? fm.element("label", { class: "field whole" }, fm.element("span", {}, "Strength of the picture"), opacity) : null),
      lineGroup("Lines of equal value", fm.contours, state.lines, meta),
      lineGroup("Coverage", fm.coverage, state.coverage, meta),
      fm.routes ? group("Routes", toggle("Day routes of the chosen crew", state.routes, (on) => { state.routes = on; fm.redrawLines(); })) : null,
      meta.tiles ? group("Online background", toggle("Load map pictures from the network", false, (on) => showTiles(on, meta)), fm.element("p", { class: "quiet" }, fm.shortened(meta.tiles.thanks, 300))) : null
    );
    if (fm.pictures.length) fm.showPicture(fm.pictures[0].layer);
    else fm.drawKey();
  };

  const unitWord = (unit) => ({ deg: "degrees", percent: "percent" })[unit] || unit;

  const group = (words, ...children) => fm.element("fieldset", { class: "part" }, fm.element("legend", {}, words), children);

  function toggle(words, on, act) {
    const box = fm.element("input", { type: "checkbox", on: { change: (event) => act(event.target.checked) } });
    box.checked = on;
    return fm.element("label", { class: "tick" }, box, fm.element("span", {}, words));
  }

  function lineGroup(words, contours, wanted, meta) {
    if (!contours) return null;
    const boxes = contours.names.map((name) => toggle(meta.layers[name] ? meta.layers[name].description : fm.readableName(name), wanted.has(name), (on) => {
      if (on) wanted.add(name);
      else wanted.delete(name);
      fm.redrawLines();
    }));
    return group(words, boxes);
  }

  fm.shownPicture = () => fm.pictures.find((picture) => picture.layer === state.picture) || null;

  fm.showPicture = async function (layer) {
    state.picture = fm.pictures.some((picture) => picture.layer === layer) ? layer : "";
    const radio = document.querySelector(`#pane-layers input[value="${CSS.escape(state.picture)}"]`);
    if (radio) radio.checked = true;
    fm.drawKey();
    fm.tell("picture", state.picture);
    const picture = fm.shownPicture();
    if (picture) await picture.open();
    fm.redrawGround();
    fm.tell("opened-picture");
  };

  function showTiles(on, meta) {
    state.tiles = on;
    if (!on) {
      if (tileLayer) tileLayer.remove();
      tileLayer = null;
    } else if (navigator.onLine === false) {
      fm.say("There is no connection: the map goes on without the online background.");
    } else {
      let failures = 0;
      tileLayer = L.tileLayer(meta.tiles.url, { maxZoom: 19, pane: "tiles" });
      tileLayer.on("tileerror", () => {
        failures++;
        if (failures === 4) fm.say("The online background does not answer: the map goes on without it.");
      });
      tileLayer.addTo(fm.map);
    }
    fm.redrawGround();
  }

  // The key: what the picture's colours and the marks mean.
  fm.drawKey = function () {
    const box = fm.byId("key");
    const wasOpen = box.firstChild ? box.firstChild.open : window.matchMedia("(min-width: 800px)").matches;
    const picture = fm.shownPicture();
    const painted = picture && picture.layer === "action" ? picture.record.present : [];
    const marks = fm.meta.classes.filter((kind) => painted.includes(kind.code) || (fm.choice && fm.choice.counts.get(kind.code) > 0));
    const parts = [];
    if (picture) parts.push(pictureKey(picture));
    if (marks.length) {
      parts.push(fm.element("ul", { class: "key-marks" }, marks.map((kind) => fm.element("li", {}, fm.shapeElement(kind, 18), kind.name))));
    }
    if (marks.length && painted.length && fm.sites.count) {
      parts.push(fm.element("p", { class: "key-note" }, "Areas: the scenario's own terminal. Marks: each site's own equipment."));
    }
    if (marks.length && fm.marks && fm.marks.thinned) {
      parts.push(fm.element("p", { class: "key-note" }, "Where sites crowd, the gravest stands for all."));
    }
    if (parts.length === 0) {
      box.replaceChildren();
      return;
    }
    const summary = fm.element("summary", {}, picture ? fm.shortened(picture.record.description, 70) : "Key");
    const details = fm.element("details", {}, summary, parts);
    details.open = wasOpen;
    fm.replace(box, details);
  };

  function pictureKey(picture) {
    const { record } = picture;
    const nothing = record.gaps ? fm.element("span", { class: "key-none" }, fm.element("i", { class: "swatch empty" }), fm.none) : "";
    // The marks' own key names the actions already.
    if (picture.layer === "action" && fm.sites.count) return fm.element("div", { class: "key-ramp" }, nothing);
    if (record.classes.length) {
      const rows = record.classes.filter(([code]) => record.present.includes(code)).map(([, name, colour]) => {
        const swatch = fm.element("i", { class: "swatch" });
        swatch.style.background = colour;
        return fm.element("li", {}, swatch, name);
      });
      return fm.element("ul", { class: "key-classes" }, rows, record.gaps ? fm.element("li", {}, nothing) : "");
    }
    const bar = fm.element("div", { class: "bar" });
    bar.style.background = `linear-gradient(to right, ${record.ramp.map(([at, colour]) => `${colour} ${at * 100}%`).join(", ")})`;
    const [low, high] = picture.limits;
    // All the way around there is nothing beyond the ends.
    const marks = record.kind === "circular" && high - low >= record.period ? ["", ""] : ["≤ ", "≥ "];
    const middle = (low + high) / 2;
    return fm.element(
      "div", { class: "key-ramp" }, bar,
      fm.element("div", { class: "ends" }, fm.element("span", {}, marks[0] + fm.withUnit(low, record.unit, 0)), fm.element("span", {}, fm.withUnit(middle, record.unit, Number.isInteger(middle) ? 0 : 1)), fm.element("span", {}, marks[1] + fm.withUnit(high, record.unit, 0))),
      nothing
    );
  }
})(globalThis.FieldMap);
