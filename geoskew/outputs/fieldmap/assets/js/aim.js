"use strict";
// Aiming without a compass: the azimuth as a line on the map, a landmark's bearing, and the sun's.
(function (fm) {
  const DISTANCES = [200, 1000, 5000, 20000, 100000];
  const state = { on: false, from: null, azimuth: NaN, metres: 5000, landmark: null, sun: null };
  let picking = false;
  let show = () => {};

  const metresText = (metres) => (metres < 1000 ? `${Math.round(metres)} m` : `${fm.number(metres / 1000, metres < 10000 ? 1 : 0)} km`);
  // How far a direction lies from another, as a person says it.
  fm.asideWords = function (azimuth, reference) {
    const turn = ((((azimuth - reference + 180) % 360) + 360) % 360) - 180;
    if (Math.abs(turn) < 0.05) return "in line with";
    return `${fm.number(Math.abs(turn), 1)}° to the ${turn > 0 ? "right" : "left"} of`;
  };

  // The section of a card or of a place: from = [longitude, latitude], choices = [[words, azimuth], …].
  fm.aimSection = function (from, choices) {
    const usable = choices.filter(([, azimuth]) => Number.isFinite(azimuth));
    if (usable.length === 0) return null;
    Object.assign(state, { on: false, from, azimuth: usable[0][1], landmark: null, sun: null });
    picking = false;
    const result = fm.element("div", { class: "results", role: "status" });
    const towards = select("Direction of", usable.map(([words], at) => [at, words]), 0, (value) => { state.azimuth = usable[Number(value)][1]; show(); });
    const distance = select("Length of the line", DISTANCES.map((metres) => [metres, metresText(metres)]), state.metres, (value) => { state.metres = Number(value); show(); });
    const clock = fm.element("input", { type: "datetime-local", on: { input: (event) => { setSun(event.target.value); show(); } } });
    const line = fm.button("Draw the line", () => { state.on = !state.on; line.setAttribute("aria-pressed", String(state.on)); show(true); }, { "aria-pressed": "false" });
    const mark = fm.button("Pick a landmark", () => { picking = true; fm.say("Tap the landmark on the map."); });
    const sun = fm.button("Sun now", () => { clock.value = localNow(); setSun(clock.value); show(); });
    show = (fit) => { fm.replace(result, results()); fm.redrawMarks(); if (fit && state.on) fm.fitLine(state); };
    show();
    return fm.element(
      "section", { class: "part" },
      fm.element("h3", {}, "Find the direction"),
      fm.element("div", { class: "finders" }, towards, distance),
      fm.element("div", { class: "row" }, line, mark, sun),
      fm.element("label", { class: "field whole" }, fm.element("span", {}, "Time for the sun, in this device's own zone"), clock),
      result
    );
  };

  function select(words, options, chosen, act) {
    const node = fm.element("select", { on: { change: (event) => act(event.target.value) } }, options.map(([value, text]) => fm.element("option", { value }, text)));
    node.value = String(chosen);
    return fm.element("label", { class: "grow" }, fm.element("span", {}, words), node);
  }

  function localNow() {
    const now = new Date();
    return new Date(now.getTime() - now.getTimezoneOffset() * 60000).toISOString().slice(0, 16);
  }

  function setSun(text) {
    const when = new Date(text).getTime();
    state.sun = Number.isFinite(when) ? when : null;
  }

  function results() {
    const out = [];
    const line = (...words) => out.push(fm.element("p", {}, words));
    const [longitude, latitude] = state.from;
    if (state.on) {
      const [endLongitude, endLatitude] = fm.placeAlong(longitude, latitude, state.azimuth, state.metres);
      line(`The line runs at ${fm.number(state.azimuth, 1)}° from true north and ends after ${metresText(state.metres)} at `, fm.element("b", {}, fm.coordinates(endLatitude, endLongitude, 5)), ".");
    }
    if (state.landmark) {
      const to = fm.between(longitude, latitude, ...state.landmark);
      line(`The landmark is ${metresText(to.metres)} away at ${fm.number(to.azimuth, 1)}°. The satellite is `, fm.element("b", {}, fm.asideWords(state.azimuth, to.azimuth)), " the landmark.");
    }
    if (state.sun !== null) {
      const sun = fm.sunAt(state.sun, longitude, latitude);
      if (sun.elevation > 0) {
        line(`The sun stands at ${fm.number(sun.azimuth, 1)}°, ${fm.number(sun.elevation, 0)}° high. The satellite is `, fm.element("b", {}, fm.asideWords(state.azimuth, sun.azimuth)), " the sun; shadows point the opposite way.");
      } else line("The sun is below the horizon at that time.");
      const day = new Date(state.sun);
      day.setHours(0, 0, 0, 0);
      const moments = fm.sunCrossings(day.getTime(), longitude, latitude, state.azimuth).map((when) => new Date(when).toTimeString().slice(0, 5));
      line(moments.length ? `On that day the sun stands in the satellite's direction at ${moments.join(" and ")}.` : "On that day the sun does not cross the satellite's direction in daylight.");
      line("Use its shadow; never look into the sun.");
    }
    return out;
  }

  // A tap while a landmark is being picked; true when the tap was used.
  fm.takeLandmark = function (longitude, latitude) {
    if (!picking) return false;
    picking = false;
    state.landmark = [longitude, latitude];
    state.on = true;
    show();
    return true;
  };

  fm.stopAiming = function () {
    state.on = false;
    state.landmark = null;
    state.sun = null;
    picking = false;
  };

  const onSheet = (view, longitude, latitude) => [
    fm.worldX(fm.nearMiddle(longitude)) * view.scale - view.left,
    fm.worldY(latitude) * view.scale - view.top,
  ];

  fm.drawAim = function (pen, view) {
    if (state.from === null || (!state.on && state.sun === null)) return;
    const start = onSheet(view, ...state.from);
    const ray = (azimuth, metres, colour, dash, label) => {
      const end = onSheet(view, ...fm.placeAlong(...state.from, azimuth, metres));
      for (const [width, ink] of [[6, fm.inks().paper], [2.6, colour]]) {
        pen.beginPath();
        pen.moveTo(...start);
        pen.lineTo(...end);
        pen.lineWidth = width;
        pen.strokeStyle = ink;
        pen.setLineDash(width < 5 ? dash : []);
        pen.stroke();
      }
      pen.setLineDash([]);
      pen.font = "600 12px system-ui, sans-serif";
      fm.haloText(pen, label, end[0], end[1] - 10, 0);
    };
    const { ink, accent } = fm.inks();
    if (state.on) ray(state.azimuth, state.metres, accent, [], `${fm.number(state.azimuth, 1)}°`);
    if (state.on && state.landmark) {
      const to = fm.between(...state.from, ...state.landmark);
      ray(to.azimuth, to.metres, ink, [2, 4], "landmark");
    }
    if (state.sun !== null) {
      const sun = fm.sunAt(state.sun, ...state.from);
      if (sun.elevation > 0) ray(sun.azimuth, state.metres, ink, [8, 5], "sun");
    }
  };
})(globalThis.FieldMap);
