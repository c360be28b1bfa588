"use strict";
// Where the page comes from, what to mind, whom to thank; theme.
(function (fm) {
  fm.buildAbout = function (meta) {
    const rows = meta.provenance.map(([key, value]) => fm.element("tr", {}, fm.element("th", { scope: "row" }, key), fm.element("td", {}, value)));
    const sites = meta.sites.count;
    fm.replace(
      fm.byId("pane-about"),
      fm.element("h2", { class: "unseen" }, "About"),
      fm.element("section", { class: "part" }, fm.element("h3", {}, "This map"), fm.element("table", { class: "facts wide" }, fm.element("tbody", {}, rows))),
      fm.element("section", { class: "part" },
        fm.element("h3", {}, "Who may have it"),
        fm.element("p", {}, sites ? `This file carries the coordinates of ${sites} ${sites === 1 ? "site" : "sites"} and everything else that its list holds. Pass it on only to those who may know them.` : "This file carries no sites."),
        meta.privacy ? fm.element("p", {}, meta.privacy) : null,
        fm.element("p", {}, `It asks the network for nothing${meta.tiles ? ", unless the online background is switched on" : ""}. Filters, layer and view stand in the address, so a copied address opens the same view of the same file.`),
        sites ? fm.element("div", { class: "row" }, fm.button("Save all reports as a file", fm.saveReports), fm.button("Clear ticks and readings", confirmClear)) : null),
      meta.cautions.length ? fm.element("section", { class: "part" }, fm.element("h3", {}, "To mind"), fm.element("ul", {}, meta.cautions.map((line) => fm.element("li", {}, line)))) : null,
      fm.element("section", { class: "part" }, fm.button("Print the map as it is shown", fm.printWhole)),
      fm.element("section", { class: "part" },
        fm.element("h3", {}, "Keys"),
        fm.element("p", {}, "Arrow keys move the map and + and − zoom it while it has the focus. Enter in the search field opens the first site. Esc closes a card.")),
      fm.element("section", { class: "part" },
        fm.element("h3", {}, "Thanks"),
        meta.thanks.basemap ? fm.element("p", {}, meta.thanks.basemap) : null,
        meta.tiles ? fm.element("p", {}, `Online background: ${meta.tiles.thanks}`) : null,
        fm.element("details", {}, fm.element("summary", {}, "Leaflet, the map library inside this file"), fm.element("pre", {}, meta.thanks.leaflet)))
    );
  };

  function confirmClear() {
    if (window.confirm("Clear all ticks and readings of this map from this device?")) fm.clearNotes();
  }

  const KEY = "geoskew:theme";
  const NEXT = { auto: "light", light: "dark", dark: "auto" };
  const WORDS = { auto: "Theme: as the device", light: "Theme: light", dark: "Theme: dark" };
  const SIGNS = { auto: "◐", light: "○", dark: "●" };

  fm.startTheme = function () {
    const button = fm.byId("theme-button");
    const kept = fm.store.read(KEY);
    set(kept in NEXT ? kept : "auto");
    button.addEventListener("click", () => set(NEXT[document.documentElement.dataset.theme]));
    window.matchMedia("(prefers-color-scheme: dark)").addEventListener("change", () => fm.tell("theme"));

    function set(theme) {
      document.documentElement.dataset.theme = theme;
      button.textContent = SIGNS[theme];
      button.setAttribute("aria-label", WORDS[theme]);
      button.title = WORDS[theme];
      fm.store.write(KEY, theme === "auto" ? null : theme);
      fm.tell("theme");
    }
  };
})(globalThis.FieldMap);
