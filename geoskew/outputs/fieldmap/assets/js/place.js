"use strict";
// Any place: directions and mismatch worked out here, everything else read from the embedded grids.
(function (fm) {
  let chosen = null;

  fm.buildPlace = function () {
    fm.when("place", render);
    render(null);
  };

  const worldAt = (longitude, latitude) => [fm.worldX(fm.nearMiddle(longitude)), fm.worldY(latitude)];

  function render(place) {
    chosen = place;
    const pane = fm.byId("pane-place");
    if (place === null) {
      fm.replace(pane, title(), form(null), fm.element("p", { class: "quiet" }, "Tap the map where there is no site, or type coordinates, to read azimuth, elevation, skew and mismatch there."));
      return;
    }
    const { longitude, latitude } = place;
    const found = fm.atPlace(fm.meta.geometry, longitude, latitude, 0);
    const { outgoing, incoming } = fm.meta.geometry;
    const pair = (words, name, unit) => fm.element("tr", {}, fm.element("th", { scope: "row" }, words), ["_before", "_after"].map((ending) => fm.element("td", { class: "number", data: { value: name + ending } }, fm.withUnit(found[name + ending], unit, unit === "km" ? 0 : 2))));
    const single = (words, name, unit) => fm.element("tr", {}, fm.element("th", { scope: "row" }, words), fm.element("td", { class: "number", colspan: 2, data: { value: name } }, fm.withUnit(found[name], unit, 2)));
    fm.replace(
      pane,
      title(),
      form(place),
      fm.placeSection(latitude, fm.inRange(longitude)),
      fm.element("section", { class: "part" },
        fm.element("h3", {}, "Worked out here ", fm.element("small", {}, "at height 0")),
        fm.element("table", { class: "facts" },
          fm.element("thead", {}, fm.element("tr", {}, fm.element("td"), [outgoing, incoming].map((satellite) => fm.element("th", { scope: "col", class: "number" }, fm.shortened(satellite.name, 24))))),
          fm.element("tbody", {}, pair("Azimuth", "azimuth", "deg"), pair("Elevation", "elevation", "deg"), pair("Skew", "skew", "deg"), pair("Distance", "range", "km"),
            single("Seen in the old dish", "seen_after", "deg"), single("Turn when realigned", "turn_realigned", "deg"), single("Mismatch untouched", "mismatch_untouched", "dB"))),
        turnLines(found.turn_realigned)),
      gridPart(longitude, latitude),
      fm.aimSection([longitude, latitude], [[`${fm.shortened(incoming.name, 24)} (new)`, found.azimuth_after], [`${fm.shortened(outgoing.name, 24)} (old)`, found.azimuth_before]])
    );
  }

  const title = () => fm.element("h2", { class: "unseen" }, "Any place");

  function turnLines(turn) {
    const words = fm.turnWords(turn);
    if (!words || !words.size) return null;
    return [fm.element("p", {}, "A dish set for the old satellite and moved to the new one:"), fm.element("p", { class: "stand" }, words.behind), fm.element("p", { class: "stand" }, words.front)];
  }

  function gridPart(longitude, latitude) {
    if (fm.pictures.length === 0) return null;
    const body = fm.element("tbody");
    const at = worldAt(longitude, latitude);
    Promise.all(fm.pictures.map((picture) => picture.open())).then(() => {
      fm.replace(body, fm.pictures.map((picture) => fm.element("tr", {}, fm.element("th", { scope: "row" }, picture.record.description), fm.element("td", { class: "number", data: { grid: picture.layer } }, fm.layerValue(picture.record, picture.valueAt(...at))))));
    });
    return fm.element("section", { class: "part" }, fm.element("h3", {}, "From the layers ", fm.element("small", {}, "value of the cell")), fm.element("table", { class: "facts" }, body));
  }

  function form(place) {
    const input = fm.element("input", { type: "text", id: "at", inputmode: "text", autocomplete: "off", placeholder: "latitude, longitude" });
    if (place) input.value = fm.coordinates(place.latitude, place.longitude, 5);
    const go = function (event) {
      event.preventDefault();
      const numbers = input.value.match(/[-+−]?\d+(?:\.\d+)?/g);
      const [latitude, longitude] = (numbers || []).map((text) => Number(text.replace("−", "-")));
      if (!numbers || numbers.length !== 2 || Math.abs(latitude) > 90 || Math.abs(longitude) > 360) {
        fm.say("Write latitude and longitude as decimal degrees, for instance -33.9, 18.4");
        return;
      }
      fm.tell("place", { longitude: fm.nearMiddle(longitude), latitude });
      fm.map.panTo([latitude, fm.nearMiddle(longitude)]);
    };
    return fm.element("form", { class: "finders", on: { submit: go } }, fm.element("label", { class: "grow" }, fm.element("span", {}, "Latitude, longitude"), input), fm.element("button", { type: "submit" }, "Read"));
  }

  fm.drawPlace = function (pen, view) {
    if (chosen === null) return;
    const [x, y] = worldAt(chosen.longitude, chosen.latitude);
    const [at, down] = [x * view.scale - view.left, y * view.scale - view.top];
    const { ink, paper } = fm.inks();
    for (const [width, colour] of [[5, paper], [2, ink]]) {
      pen.beginPath();
      for (const [dx, dy] of [[1, 0], [-1, 0], [0, 1], [0, -1]]) {
        pen.moveTo(at + 4 * dx, down + 4 * dy);
        pen.lineTo(at + 13 * dx, down + 13 * dy);
      }
      pen.lineWidth = width;
      pen.strokeStyle = colour;
      pen.stroke();
    }
  };
  fm.placeOpen = () => chosen;
})(globalThis.FieldMap);
