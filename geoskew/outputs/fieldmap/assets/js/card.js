"use strict";
// The card of a site: what to do, how far and which way to turn, what to expect, and a sheet to print.
(function (fm) {
  let details = null;
  let open = -1;
  const LINES = [["azimuth", "Azimuth"], ["elevation", "Elevation"], ["skew", "Skew"], ["range", "Distance"]];

  // Values of one site by column name, from both blocks.
  async function cells() {
    if (details === null) {
      const block = await fm.openBlock("details");
      details = new Map();
      for (const facts of block.facts.columns) {
        const read = facts.kind === "number" ? fm.numberColumn(block, facts) : fm.textColumn(block, facts.name);
        details.set(facts.name, { facts, read });
      }
      for (const facts of fm.sites.known.values()) {
        const read = facts.kind === "number" ? fm.sites.number(facts.name) : fm.sites.text(facts.name);
        details.set(facts.name, { facts, read });
      }
    }
    return details;
  }

  fm.siteTitle = (i) => fm.sites.name(i) || fm.sites.id(i);

  fm.buildCards = function () {
    fm.when("cleared", () => { if (open >= 0) fm.showCard(open, {}); });
  };

  fm.showCard = async function (i, { focus }) {
    open = i;
    const columns = await cells();
    if (open !== i) return;
    const number = (name) => (columns.has(name) && columns.get(name).facts.kind === "number" ? columns.get(name).read(i) : NaN);
    const card = fm.byId("card");
    const parts = sections(i, number, columns);
    fm.replace(card, header(i), parts.task, parts.turn, parts.margins, parts.directions, coordinates(i), aim(i, number), fm.notesSection(i), everything(i, columns), safety());
    card.hidden = false;
    fm.byId("roll").hidden = true;
    fm.byId("panes").scrollTop = 0;
    if (focus) card.focus({ preventScroll: true });
    fm.tell("opened", i);
  };

  fm.hideCard = function () {
    const i = open;
    open = -1;
    fm.byId("card").hidden = true;
    fm.byId("roll").hidden = false;
    fm.stopAiming();
    return i;
  };

  fm.cardOpen = () => open;

  function header(i) {
    const kind = fm.marks.kind(i);
    const id = fm.sites.id(i);
    const about = [fm.sites.name(i) ? id : "", fm.sites.district(i)].filter(Boolean).map((text) => fm.shortened(text, 80)).join(" · ");
    return [
      fm.element("div", { class: "row card-bar" },
        fm.button("← Sites", () => fm.close(), { id: "back" }),
        fm.button("On map", () => fm.centreOn(i)),
        fm.button("Print", () => fm.printCard(i), { id: "print-card" })),
      fm.element("h2", {}, fm.shapeElement(kind, 24), fm.element("span", {}, fm.shortened(fm.siteTitle(i), 160))),
      about ? fm.element("p", { class: "quiet" }, about) : null,
      visits(i),
    ];
  }

  function visits(i) {
    const lines = fm.choice.visitsOf(i).map(({ crew, day, stop }) => [crew, day, stop ? `stop ${stop}` : ""].filter(Boolean).join(", "));
    return lines.length ? fm.element("p", {}, lines.map((line) => fm.element("span", { class: "tag" }, line))) : null;
  }

  // Why the action is what it is, where the table says so: it may name the port to take.
  const reason = (i, columns) => textOf(i, columns, "action_reason");
  const textOf = (i, columns, name) => (columns.has(name) && columns.get(name).facts.kind === "text" ? columns.get(name).read(i) : "");

  function sections(i, number, columns) {
    const kind = fm.marks.kind(i);
    const why = reason(i, columns);
    // The turn within the feed's stops, where the table holds it: that of the job card.
    const layer = columns.has("turn_to_make") ? "turn_to_make" : fm.turnLayer(kind.name);
    const turn = layer ? number(layer) : NaN;
    return {
      task: fm.element("section", { class: "part task" }, fm.element("h3", {}, kind.name), fm.element("p", {}, fm.task(kind.name)), goal(kind, number), why ? fm.element("p", { class: "quiet" }, `Why: ${why}.`) : null),
      turn: turnPart(turn, textOf(i, columns, "turn_remark"), number),
      margins: marginPart(number),
      directions: directionPart(number),
    };
  }

  function goal(kind, number) {
    if (kind.name !== "re-aim") return null;
    return fm.element("p", {}, `New direction: azimuth ${fm.withUnit(number("azimuth_after"), "deg")}, elevation ${fm.withUnit(number("elevation_after"), "deg")}.`);
  }

  function turnPart(turn, remark, number) {
    const words = fm.turnWords(turn);
    const picture = fm.drawWindow(number("window_low"), number("window_high"), number("turn_shared"));
    if (words === null && picture === null && !remark) return null;
    const part = fm.element("section", { class: "part turn" }, fm.element("h3", {}, "Turn of the feed"));
    if (words && words.size) {
      part.append(fm.element("p", { class: "stand" }, words.behind), fm.element("p", { class: "stand" }, words.front));
    } else if (words) part.append(fm.element("p", {}, remark ? "The feed is not turned." : "No turn is needed: the present setting is the right one."));
    if (remark) part.append(fm.element("p", { class: "stand" }, remark[0].toUpperCase() + remark.slice(1) + "."));
    if (picture) {
      part.append(picture, fm.element("p", { class: "quiet" }, "Band: turns that serve both satellites, from the present setting, seen from behind the dish. Pointer: the shared setting."));
    } else part.append(fm.element("p", { class: "quiet" }, "No one setting serves both satellites here."));
    return part;
  }

  // Near a quarter turn the other way round ends where it should, within 5°: nothing there is reversed.
  const endsTheSame = (turn) => Math.abs(turn) > 45 && Math.abs(fm.fold(2 * turn)) < 5;

  function marginRows(number) {
    const ending = fm.meta.judged === "rain" ? "_rain" : "";
    const margin = (name, mark) => ({ value: number(name + ending), mark });
    return [
      { label: "before", values: [margin("margin_before", "before")] },
      { label: "untouched", values: [margin("margin_untouched", "after")] },
      { label: "shared", values: [margin("margin_shared_before", "before"), margin("margin_shared_after", "after")] },
      ...(endsTheSame(number("turn_shared")) ? [] : [{ label: "reversed", values: [margin("margin_reversed", "after")] }]),
      { label: "realigned", values: [margin("margin_realigned", "after")] },
    ];
  }

  function marginPart(number) {
    const rows = marginRows(number);
    const picture = fm.drawMargins(rows, fm.meta.reserve);
    if (picture === null) return null;
    const reversed = rows.some(({ label }) => label === "reversed") ? " “Reversed” is what remains when the shared turn is made the wrong way." : "";
    const judged = fm.meta.judged === "rain" ? "in rain at the stated availability" : "in clear sky";
    return fm.element(
      "section", { class: "part" },
      fm.element("h3", {}, "Margins ", fm.element("small", {}, judged)),
      picture,
      fm.element("p", { class: "quiet" }, `Hollow: old satellite. Full: new satellite. Dashed line: the reserve, ${fm.withUnit(fm.meta.reserve, "dB")}.${reversed}`)
    );
  }

  function directionPart(number) {
    const rows = LINES.map(([name, words]) => [words, name + "_before", name + "_after"]).filter(([, before, after]) => Number.isFinite(number(before)) || Number.isFinite(number(after)));
    if (rows.length === 0) return null;
    const unit = (name) => (name.startsWith("range") ? "km" : "deg");
    const places = (name) => (name.startsWith("range") ? 0 : 2);
    const body = rows.map(([words, before, after]) => fm.element("tr", {}, fm.element("th", { scope: "row" }, words), [before, after].map((name) => fm.element("td", { class: "number" }, fm.withUnit(number(name), unit(name), places(name))))));
    const { outgoing, incoming } = fm.meta.geometry;
    return fm.element(
      "section", { class: "part" },
      fm.element("h3", {}, "Directions"),
      fm.element("table", { class: "facts" },
        fm.element("thead", {}, fm.element("tr", {}, fm.element("td"), [outgoing, incoming].map((satellite) => fm.element("th", { scope: "col", class: "number" }, fm.shortened(satellite.name, 24))))),
        fm.element("tbody", {}, body)),
      fm.element("p", { class: "quiet" }, "Azimuth from true north. Skew: clockwise is positive, looking towards the satellite.")
    );
  }

  function coordinates(i) {
    const [latitude, longitude] = [fm.sites.latitude[i], fm.inRange(fm.sites.longitude[i])];
    return fm.placeSection(latitude, longitude);
  }

  // Coordinates to copy and to hand to a navigation program, for a card and for any place.
  fm.placeSection = function (latitude, longitude) {
    const text = fm.coordinates(latitude, longitude, 5);
    const copy = async () => {
      try {
        await navigator.clipboard.writeText(text);
        fm.say("Coordinates copied.");
      } catch (problem) {
        selectText(shown);
        fm.say("The browser does not let the page copy; the coordinates are selected instead.");
      }
    };
    const shown = fm.element("span", { class: "coordinates" }, text);
    return fm.element(
      "section", { class: "part" },
      fm.element("h3", {}, "Place ", fm.element("small", {}, "latitude, longitude")),
      fm.element("div", { class: "row" }, shown, fm.button("Copy", copy), fm.element("a", { class: "button", href: `geo:${latitude.toFixed(6)},${longitude.toFixed(6)}` }, "Navigate"))
    );
  };

  function selectText(node) {
    const range = document.createRange();
    range.selectNodeContents(node);
    const selection = getSelection();
    selection.removeAllRanges();
    selection.addRange(range);
  }

  function aim(i, number) {
    const { incoming, outgoing } = fm.meta.geometry;
    return fm.aimSection([fm.sites.longitude[i], fm.sites.latitude[i]], [
      [`${fm.shortened(incoming.name, 24)} (new)`, number("azimuth_after")],
      [`${fm.shortened(outgoing.name, 24)} (old)`, number("azimuth_before")],
    ]);
  }

  function everything(i, columns) {
    const rows = [...columns].map(([name, { facts, read }]) => {
      const column = fm.meta.columns[name] || {};
      const value = read(i);
      const text = facts.kind !== "number" ? value : facts.flag ? (Number.isFinite(value) ? (value ? "yes" : "no") : "") : fm.withUnit(value, column.unit || "", 2);
      if (text === "" || text === fm.none) return null;
      return fm.element("tr", {}, fm.element("th", { scope: "row" }, name, column.meaning ? fm.element("small", {}, column.meaning) : null), fm.element("td", {}, text));
    });
    return fm.element("details", { class: "part" }, fm.element("summary", {}, "All values"), fm.element("table", { class: "facts all" }, fm.element("tbody", {}, rows)));
  }

  const SAFETY = "Roofs, ladders, wind, lightning and power lines can kill, and so can standing in front of a transmitting dish. Local codes and people licensed for the work decide; leave and come back when in doubt.";
  const safety = () => fm.element("p", { class: "caution" }, SAFETY);

  fm.printCard = async function (i) {
    const columns = await cells();
    const number = (name) => (columns.has(name) && columns.get(name).facts.kind === "number" ? columns.get(name).read(i) : NaN);
    const parts = sections(i, number, columns);
    const kind = fm.marks.kind(i);
    fm.replace(
      fm.byId("paper"),
      fm.element("p", { class: "quiet" }, fm.meta.title),
      fm.element("h2", {}, fm.shapeElement(kind, 24), fm.element("span", {}, fm.shortened(fm.siteTitle(i), 160))),
      fm.element("p", {}, [fm.shortened(fm.sites.id(i), 60), fm.shortened(fm.sites.district(i), 60), fm.coordinates(fm.sites.latitude[i], fm.sites.longitude[i], 5)].filter(Boolean).join(" · ")),
      visits(i),
      fm.element("div", { class: "columns" }, fm.element("div", {}, parts.task, parts.turn), fm.element("div", {}, parts.margins, parts.directions)),
      fm.element("div", { class: "columns" },
        fm.element("ul", { class: "boxes" }, fm.ticks.map(([, words]) => fm.element("li", {}, words))),
        fm.element("dl", { class: "blanks" }, fm.reportFields.map(([, words]) => [fm.element("dt", {}, words), fm.element("dd")]))),
      safety(),
      fm.element("p", { class: "quiet" }, fm.meta.provenance.map(([key, value]) => `${key}: ${value}`).join(" · "))
    );
    document.body.dataset.paper = "card";
    window.print();
  };
})(globalThis.FieldMap);
