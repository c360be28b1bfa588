"use strict";
// The drawer: four tabs. On a narrow screen it opens from below and closes again.
(function (fm) {
  const NAMES = ["sites", "place", "layers", "about"];
  const narrow = window.matchMedia("(max-width: 799px)");
  let current = "sites";

  fm.showTab = function (name) {
    current = name;
    for (const other of NAMES) {
      const tab = fm.byId("tab-" + other);
      tab.setAttribute("aria-selected", String(other === name));
      tab.tabIndex = other === name ? 0 : -1;
      fm.byId("pane-" + other).hidden = other !== name;
    }
    fm.byId("panes").scrollTop = 0;
  };

  fm.setDrawer = function (open) {
    const was = document.body.dataset.drawer;
    document.body.dataset.drawer = open ? "open" : "closed";
    // The map gives way to the drawer or takes its room back.
    if (fm.map && was !== document.body.dataset.drawer) fm.map.invalidateSize({ pan: true, animate: false });
  };

  fm.startTabs = function () {
    fm.setDrawer(!narrow.matches);
    for (const name of NAMES) {
      fm.byId("tab-" + name).addEventListener("click", () => {
        const again = current === name && document.body.dataset.drawer === "open";
        fm.showTab(name);
        fm.setDrawer(!(again && narrow.matches));
      });
    }
    fm.byId("tabs").addEventListener("keydown", (event) => {
      const step = { ArrowRight: 1, ArrowLeft: -1 }[event.key];
      if (!step) return;
      const next = NAMES[(NAMES.indexOf(current) + step + NAMES.length) % NAMES.length];
      fm.showTab(next);
      fm.setDrawer(true);
      fm.byId("tab-" + next).focus();
    });
    narrow.addEventListener("change", () => { fm.setDrawer(!narrow.matches); });
    fm.when("place", (place) => { if (place) { fm.showTab("place"); fm.setDrawer(true); } });
  };
})(globalThis.FieldMap);
