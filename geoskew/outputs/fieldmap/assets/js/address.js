"use strict";
// Filter, layer and view in the address' fragment, so that a link shows what its sender saw.
(function (fm) {
  let silent = false;
  let due = 0;

  fm.readAddress = function () {
    const words = new URLSearchParams(location.hash.slice(1));
    const view = (words.get("view") || "").split(",").map(Number);
    const names = new Map([...fm.meta.classes, fm.noAction].map((kind) => [kind.name, kind.code]));
    const hidden = (words.get("hide") || "").split(",").map((name) => names.get(name)).filter((code) => code !== undefined);
    return {
      view: view.length === 3 && view.every(Number.isFinite) ? view : null,
      hidden: new Set(hidden),
      crew: words.get("crew") || "",
      day: words.get("day") || "",
      text: words.get("find") || "",
      layer: words.get("layer"),
      site: words.get("site"),
    };
  };

  function compose() {
    const { choice, map } = fm;
    const words = new URLSearchParams();
    const centre = map.getCenter();
    words.set("view", `${centre.lat.toFixed(4)},${centre.lng.toFixed(4)},${map.getZoom()}`);
    const names = new Map([...fm.meta.classes, fm.noAction].map((kind) => [kind.code, kind.name]));
    if (choice.hidden.size) words.set("hide", [...choice.hidden].map((code) => names.get(code)).join(","));
    if (choice.crew) words.set("crew", choice.crew);
    if (choice.day) words.set("day", choice.day);
    if (choice.text) words.set("find", choice.text);
    if (fm.pictures.length && fm.drawing.picture !== fm.pictures[0].layer) words.set("layer", fm.drawing.picture);
    if (fm.cardOpen() >= 0) words.set("site", fm.sites.id(fm.cardOpen()));
    return "#" + words.toString().replaceAll("%2C", ",");
  }

  fm.keepAddress = function () {
    if (silent || due) return;
    due = setTimeout(() => {
      due = 0;
      const hash = compose();
      if (hash !== location.hash) history.replaceState(null, "", hash);
    }, 250);
  };

  // Puts everything that the address says into effect; an empty address means the whole map.
  fm.obeyAddress = async function () {
    const asked = fm.readAddress();
    silent = true;
    fm.choice.set({ hidden: asked.hidden, crew: asked.crew, day: asked.day, text: asked.text });
    if (asked.layer !== null) await fm.showPicture(asked.layer);
    if (asked.view) fm.map.setView([asked.view[0], asked.view[1]], asked.view[2], { animate: false });
    silent = false;
    if (asked.site !== null) {
      for (let i = 0; i < fm.sites.count; i++) {
        if (fm.sites.id(i) === asked.site) {
          await fm.open(i, { stay: asked.view !== null });
          return;
        }
      }
      fm.say(`There is no site ${fm.shortened(asked.site, 40)} on this map.`);
    }
  };

  fm.startAddress = function () {
    for (const subject of ["choice", "picture", "opened", "closed", "moved"]) fm.when(subject, fm.keepAddress);
    window.addEventListener("hashchange", fm.obeyAddress);
  };
})(globalThis.FieldMap);
