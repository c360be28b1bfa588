"use strict";
// The roll of sites: counts that are switches, search, crew and day, and a table to sort.
(function (fm) {
  const AT_ONCE = 100;
  let order = [];
  let limit = AT_ONCE;
  // At first the order of the list that the map was made from: it costs nothing, and its maker chose it.
  let sorting = { key: "", down: false };
  let body = null;
  let more = null;
  let summary = null;
  let columns = [];
  const switches = new Map();

  fm.buildList = function (meta) {
    const { sites, choice } = fm;
    columns = tableColumns(meta);
    const roll = fm.byId("roll");
    if (sites.count === 0) {
      fm.replace(roll, fm.element("p", { class: "quiet" }, "This map was made without a list of sites. Tap anywhere to read a place."));
      return;
    }
    const field = fm.element("input", {
      type: "search", id: "find", placeholder: "id, name or district", autocomplete: "off", spellcheck: "false",
      on: {
        input: (event) => choice.set({ text: event.target.value }),
        keydown: (event) => {
          if (event.key === "Enter" && order.length) fm.open(order[0], { focus: true });
        },
      },
    });
    const picks = [picker("crew", "Crew", choice.crews), picker("day", "Day", choice.days)].filter(Boolean);
    summary = fm.element("p", { id: "summary", class: "quiet" });
    body = fm.element("tbody");
    more = fm.button("", () => { limit += 5 * AT_ONCE; fillRows(); }, { class: "wide", hidden: true });
    fm.replace(
      roll,
      fm.element("div", { id: "counts", role: "group", "aria-label": "Actions: tap to hide or show" }, meta.classes.map(actionSwitch), actionSwitch(fm.noAction)),
      fm.element("div", { class: "finders" }, fm.element("label", { class: "grow find" }, fm.element("span", {}, "Find"), field), picks),
      summary,
      fm.element("table", { id: "sites" }, fm.element("caption", { class: "unseen" }, "Sites that are shown"), heading(), body),
      more
    );
    fm.when("choice", () => { limit = AT_ONCE; update(); });
    fm.when("opened", markRow);
    update();
  };

  function actionSwitch(kind) {
    if (kind === fm.noAction && !fm.choice.counts.get(kind.code)) return null;
    const number = fm.element("b");
    const node = fm.button("", () => {
      const hidden = new Set(fm.choice.hidden);
      if (!hidden.delete(kind.code)) hidden.add(kind.code);
      fm.choice.set({ hidden });
    }, { class: "count", "aria-pressed": "true" });
    node.append(fm.shapeElement(kind, 22), fm.element("span", {}, kind.name), number);
    switches.set(kind.code, { node, number });
    return node;
  }

  function picker(key, label, values) {
    if (values.length === 0) return null;
    const options = ["", ...values].map((value) => fm.element("option", { value }, value === "" ? "all" : fm.shortened(value, 40)));
    const select = fm.element("select", { id: "pick-" + key, on: { change: (event) => fm.choice.set({ [key]: event.target.value }) } }, options);
    return fm.element("label", {}, fm.element("span", {}, label), select);
  }

  function tableColumns(meta) {
    const { sites } = fm;
    const margin = "margin_untouched" + (meta.judged === "rain" ? "_rain" : "");
    const [shared, anew, untouched] = ["turn_shared", "turn_realigned", margin].map((name) => sites.number(name));
    const names = new Map([...meta.classes, fm.noAction].map((kind) => [kind.code, kind.name]));
    // The turn within the feed's stops, where the table holds it: that of the job card.
    const turn = sites.known.has("turn_to_make") ? sites.number("turn_to_make") : (i) => (fm.turnLayer(names.get(sites.action[i])) === "turn_shared" ? shared(i) : anew(i));
    const out = [
      { key: "name", title: "Site", text: (i) => fm.siteTitle(i), compare: (a, b) => fm.collate(fm.siteTitle(a), fm.siteTitle(b)) },
      { key: "action", title: "Action", text: (i) => names.get(sites.action[i]) || fm.noAction.name, compare: (a, b) => sites.action[a] - sites.action[b] },
    ];
    if (sites.known.has("turn_realigned")) out.push(numeric("turn", "Turn °", turn, 1));
    if (sites.known.has(margin)) out.push(numeric("margin", "Untouched dB", untouched, 1));
    return out;
  }

  // Sites without a value come last, whichever way the column is sorted.
  function numeric(key, title, value, decimals) {
    return {
      key, title, number: true,
      text: (i) => (Number.isFinite(value(i)) ? fm.number(value(i), decimals) : "–"),
      missing: (i) => !Number.isFinite(value(i)),
      compare: (a, b) => value(a) - value(b),
    };
  }

  function heading() {
    const sorter = (column) => fm.button(column.title, () => {
      sorting = { key: column.key, down: sorting.key === column.key && !sorting.down };
      limit = AT_ONCE;
      update();
    }, { class: "sorter", data: { key: column.key } });
    // The action stands below the name, so both sort from one heading.
    const [name, action, ...numbers] = columns;
    const first = fm.element("th", { scope: "col" }, sorter(name), sorter(action));
    const cells = numbers.map((column) => fm.element("th", { scope: "col", class: "number" }, sorter(column)));
    return fm.element("thead", {}, fm.element("tr", {}, first, cells));
  }

  function update() {
    const { choice, sites } = fm;
    for (const [code, { node, number }] of switches) {
      number.textContent = String(choice.counts.get(code) || 0);
      node.setAttribute("aria-pressed", choice.hidden.has(code) ? "false" : "true");
    }
    order = [];
    for (let i = 0; i < sites.count; i++) if (choice.shown[i]) order.push(i);
    const column = columns.find((entry) => entry.key === sorting.key);
    if (column) {
      const sign = sorting.down ? -1 : 1;
      const missing = column.missing || (() => false);
      order.sort((a, b) => missing(a) - missing(b) || sign * column.compare(a, b) || a - b);
    }
    for (const cell of document.querySelectorAll("#sites thead th")) {
      const buttons = [...cell.querySelectorAll("button")];
      for (const node of buttons) node.dataset.sorted = node.dataset.key === sorting.key ? (sorting.down ? "down" : "up") : "";
      const chosen = buttons.some((node) => node.dataset.key === sorting.key);
      cell.setAttribute("aria-sort", chosen ? (sorting.down ? "descending" : "ascending") : "none");
    }
    summary.textContent = `${choice.total} of ${sites.count} sites shown`;
    for (const [id, value] of [["find", choice.text], ["pick-crew", choice.crew], ["pick-day", choice.day]]) {
      const node = fm.byId(id);
      if (node && node.value !== value) node.value = value;
    }
    fillRows();
  }

  function fillRows() {
    body.replaceChildren(...order.slice(0, limit).map(row));
    const left = order.length - limit;
    more.hidden = left <= 0;
    more.textContent = `Show more (${left} left)`;
    markRow();
  }

  function row(i) {
    const opener = fm.button("", () => fm.open(i, { focus: true }), { class: "opener" });
    opener.append(fm.shapeElement(fm.marks.kind(i), 18), fm.element("span", {}, fm.shortened(fm.siteTitle(i), 60)));
    const [, action] = columns;
    opener.append(fm.element("small", {}, action.text(i)));
    const cells = columns.slice(2).map((column) => fm.element("td", { class: "number" }, column.text(i)));
    return fm.element("tr", { data: { row: i } }, fm.element("th", { scope: "row" }, opener), cells);
  }

  function markRow() {
    for (const node of body.children) node.classList.toggle("chosen", Number(node.dataset.row) === fm.marks.chosen);
  }

  // Back from a card: the row that led there, or the search field, takes the focus.
  fm.focusList = function (i) {
    const node = body && body.querySelector(`tr[data-row="${Number(i)}"] button`);
    const target = node || fm.byId("find");
    if (target) target.focus();
  };
})(globalThis.FieldMap);
