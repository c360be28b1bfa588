"use strict";
// Check-list and readings of a visit. They stay on this device and leave it as a report file, whose
// columns are those that the report reader expects.
(function (fm) {
  const COLUMNS = ["site", "date", "setting_scale", "setting_inclinometer", "quality_before", "quality_after", "note"];
  const TICKS = [
    ["arrived", "Site and dish are the ones on this card"],
    ["safe", "Weather, ladder, roof edge and power lines looked at; nobody works alone on a roof"],
    ["silent", "A transmitting dish is switched off before anyone stands in front of it"],
    ["before", "Setting and quality read before anything is loosened"],
    ["turned", "Feed turned as this card says, from the right side"],
    ["after", "Quality read afterwards; clamp tight, cable free, cover closed"],
  ];
  fm.ticks = TICKS;
  const FIELDS = [
    ["date", "Date", { type: "date" }],
    ["setting_scale", "Setting on the scale, °", { inputmode: "decimal" }],
    ["setting_inclinometer", "Setting by inclinometer, ° (plus: leans right, seen from behind)", { inputmode: "decimal" }],
    ["quality_before", "Quality before, dB", { inputmode: "decimal" }],
    ["quality_after", "Quality after, dB", { inputmode: "decimal" }],
    ["note", "Note", { maxlength: "2000" }],
  ];
  fm.reportFields = FIELDS;

  let prefix = "";
  fm.startNotes = function (meta) {
    prefix = `geoskew:${meta.identity}:`;
  };

  function read(site) {
    const text = fm.store.read(prefix + site);
    if (text === null) return { ticks: {}, fields: {} };
    try {
      const kept = JSON.parse(text);
      return { ticks: kept.ticks || {}, fields: kept.fields || {} };
    } catch (problem) {
      return { ticks: {}, fields: {} };
    }
  }

  function keep(site, notes) {
    const empty = !Object.values(notes.ticks).some(Boolean) && !Object.values(notes.fields).some(Boolean);
    const done = fm.store.write(prefix + site, empty ? null : JSON.stringify(notes));
    if (!done) fm.say("This device does not let the page keep anything: write your readings down.");
  }

  const today = () => {
    const now = new Date();
    return [now.getFullYear(), now.getMonth() + 1, now.getDate()].map((part) => String(part).padStart(2, "0")).join("-");
  };

  // A decimal comma is what many keyboards offer; the file has points.
  const tidied = (key, value) => (key === "note" || key === "date" ? value : value.trim().replace(",", "."));

  fm.notesSection = function (i) {
    const site = fm.sites.id(i);
    const notes = read(site);
    const boxes = TICKS.map(([key, words]) => {
      const box = fm.element("input", { type: "checkbox", on: { change: (event) => { notes.ticks[key] = event.target.checked; keep(site, notes); } } });
      box.checked = Boolean(notes.ticks[key]);
      return fm.element("label", { class: "tick" }, box, fm.element("span", {}, words));
    });
    const inputs = new Map();
    const fields = FIELDS.map(([key, words, options]) => {
      const input = fm.element("input", {
        ...options, type: options.type || "text", autocomplete: "off", data: { field: key },
        on: {
          change: (event) => {
            notes.fields[key] = tidied(key, event.target.value);
            if (!notes.fields.date && key !== "date") {
              notes.fields.date = today();
              inputs.get("date").value = notes.fields.date;
            }
            keep(site, notes);
          },
        },
      });
      input.value = notes.fields[key] || "";
      inputs.set(key, input);
      return fm.element("label", { class: key === "note" ? "field whole" : "field" }, fm.element("span", {}, words), input);
    });
    return fm.element(
      "section", { class: "part" },
      fm.element("h3", {}, "On site"),
      boxes,
      fm.element("div", { class: "fields" }, fields),
      fm.button("Save all reports as a file", fm.saveReports, { class: "wide" }),
      fm.element("p", { class: "quiet" }, "Ticks and readings stay on this device, for this map only, until they are cleared here or by the browser.")
    );
  };

  const cell = (text) => (/[",\r\n]/.test(text) || text !== text.trim() ? `"${text.replaceAll('"', '""')}"` : text);

  fm.reportText = function () {
    const lines = [COLUMNS.join(",")];
    for (let i = 0; i < fm.sites.count; i++) {
      const { fields } = read(fm.sites.id(i));
      if (!Object.values(fields).some(Boolean)) continue;
      const values = COLUMNS.map((column) => (column === "site" ? fm.sites.id(i) : fields[column] || ""));
      lines.push(values.map((value) => cell(String(value))).join(","));
    }
    return { text: lines.join("\r\n") + "\r\n", count: lines.length - 1 };
  };

  fm.saveReports = function () {
    const { text, count } = fm.reportText();
    if (count === 0) {
      fm.say("There are no readings on this device yet.");
      return;
    }
    const address = URL.createObjectURL(new Blob([text], { type: "text/csv;charset=utf-8" }));
    const link = fm.element("a", { href: address, download: `reports-${today()}.csv` });
    document.body.append(link);
    link.click();
    link.remove();
    setTimeout(() => URL.revokeObjectURL(address), 10000);
    fm.say(`Reports of ${count} ${count === 1 ? "site" : "sites"} saved.`);
  };

  // Everything that this map keeps on the device.
  fm.clearNotes = function () {
    for (let i = 0; i < fm.sites.count; i++) fm.store.write(prefix + fm.sites.id(i), null);
    fm.tell("cleared");
    fm.say("Ticks and readings of this map are cleared from this device.");
  };
})(globalThis.FieldMap);
