"use strict";
// Puts the parts together: map, sheets, drawer, taps and keys.
(function (fm) {
  let ground, lines, marks;
  fm.redrawGround = () => ground && ground.redraw();
  fm.redrawLines = () => lines && lines.redraw();
  fm.redrawMarks = () => marks && marks.redraw();

  function makeMap(meta) {
    const [west, south, east, north] = meta.frame;
    fm.middle = (west + east) / 2;
    const map = (fm.map = L.map("field", {
      ...meta.start,
      attributionControl: false,
      zoomControl: false,
      zoomSnap: 0.5,
      maxZoom: 19,
      maxBounds: [[south, west], [north, east]],
      maxBoundsViscosity: 1,
      worldCopyJump: false,
    }));
    for (const [name, level] of [["tiles", 150], ["ground", 200], ["lines", 300], ["marks", 400]]) {
      map.createPane(name).style.zIndex = level;
      if (name !== "tiles") map.getPane(name).style.pointerEvents = "none";
    }
    L.control.scale({ imperial: false, position: "bottomright" }).addTo(map);
    fm.showAll = () => {
      const [w, s, e, n] = meta.extent;
      map.fitBounds([[s, w], [n, e]], { padding: [12, 12], animate: false });
    };
    fm.showAll();
    map.setMinZoom(Math.min(map.getZoom(), map.getBoundsZoom([[south, west], [north, east]], true)));
    return map;
  }

  function makeSheets(map, meta, base) {
    ground = new fm.Sheet({
      pane: "ground",
      draw(pen, view) {
        if (!fm.drawing.tiles) base.fill(pen, view);
        const picture = fm.shownPicture();
        if (picture) picture.draw(pen, view, fm.drawing.opacity);
      },
    }).addTo(map);
    lines = new fm.Sheet({
      pane: "lines",
      draw(pen, view) {
        const space = new fm.LabelSpace();
        base.outline(pen, view);
        if (fm.drawing.lines.size) fm.drawContours(pen, view, fm.contours, fm.drawing.lines, space);
        if (fm.drawing.coverage.size) fm.drawContours(pen, view, fm.coverage, fm.drawing.coverage, space);
        if (fm.routes && fm.drawing.routes && (fm.choice.crew || fm.choice.day)) fm.drawRoutes(pen, view, fm.routes, fm.choice.crew, fm.choice.day);
        // From afar the marks lie on the names.
        if (fm.map.getZoom() >= 6) fm.drawNames(pen, view, meta.names, space);
      },
    }).addTo(map);
    marks = new fm.Sheet({
      pane: "marks",
      draw(pen, view) {
        fm.marks.draw(pen, view);
        fm.drawPlace(pen, view);
        fm.drawAim(pen, view);
      },
    }).addTo(map);
    fm.when("theme", () => { fm.redrawGround(); fm.redrawLines(); fm.redrawMarks(); });
    fm.when("choice", () => { fm.redrawMarks(); fm.redrawLines(); fm.drawKey(); });
    fm.when("place", () => fm.redrawMarks());
    fm.when("thinned", () => fm.drawKey());
  }

  fm.open = async function (i, { focus, stay }) {
    fm.marks.chosen = i;
    fm.showTab("sites");
    fm.setDrawer(true);
    await fm.showCard(i, { focus });
    if (!stay) fm.map.panInside([fm.sites.latitude[i], fm.nearMiddle(fm.sites.longitude[i])], { padding: [60, 70] });
    fm.redrawMarks();
  };

  fm.close = function () {
    const i = fm.hideCard();
    fm.marks.chosen = -1;
    fm.redrawMarks();
    fm.tell("closed");
    fm.tell("opened", -1);
    if (i >= 0) fm.focusList(i);
  };

  fm.centreOn = (i) => fm.map.setView([fm.sites.latitude[i], fm.nearMiddle(fm.sites.longitude[i])], Math.max(fm.map.getZoom(), 9));
  fm.fitLine = function ({ from, azimuth, metres }) {
    const [longitude, latitude] = fm.placeAlong(...from, azimuth, metres);
    fm.map.fitBounds([[from[1], fm.nearMiddle(from[0])], [latitude, fm.nearMiddle(longitude)]], { padding: [50, 50] });
  };

  function taps(map) {
    map.on("click", ({ latlng }) => {
      const [longitude, latitude] = [latlng.lng, latlng.lat];
      if (fm.takeLandmark(longitude, latitude)) return;
      const i = fm.marks.nearest(fm.worldX(longitude), fm.worldY(latitude), 256 * 2 ** map.getZoom());
      if (i >= 0) {
        fm.open(i, {});
        return;
      }
      if (fm.cardOpen() >= 0) fm.close();
      fm.showTab("place");
      fm.tell("place", { longitude, latitude });
    });
    let last = null;
    let waiting = 0;
    map.on("mousemove", ({ latlng }) => {
      last = latlng;
      waiting = waiting || requestAnimationFrame(() => { waiting = 0; fm.read(last); });
    });
    map.on("mouseout", () => { last = null; fm.read(null); });
    map.on("moveend", () => { fm.tell("moved"); if (last === null) fm.read(null); });
    fm.when("opened-picture", () => fm.read(last));
  }

  // The value under the pointer; without one (a finger), at the middle of the map.
  fm.read = function (latlng) {
    const box = fm.byId("reading");
    const picture = fm.shownPicture();
    const at = latlng || fm.map.getCenter();
    const [x, y] = [fm.worldX(at.lng), fm.worldY(at.lat)];
    const i = latlng ? fm.marks.nearest(x, y, 256 * 2 ** fm.map.getZoom(), 10) : -1;
    const value = picture ? fm.element("b", {}, fm.layerValue(picture.record, picture.valueAt(x, y))) : null;
    const where = i >= 0 ? fm.shortened(fm.siteTitle(i), 40) : `${latlng ? "" : "middle: "}${fm.coordinates(at.lat, at.lng, 3)}`;
    fm.replace(box, value, fm.element("span", {}, where));
    box.hidden = false;
    fm.byId("chart").classList.toggle("middle", !latlng);
  };

  function keys() {
    document.addEventListener("keydown", (event) => {
      if (event.key === "Escape" && fm.cardOpen() >= 0) fm.close();
    });
    fm.byId("zoom-in").addEventListener("click", () => fm.map.zoomIn());
    fm.byId("zoom-out").addEventListener("click", () => fm.map.zoomOut());
    fm.byId("zoom-all").addEventListener("click", () => fm.showAll());
    window.addEventListener("afterprint", () => { delete document.body.dataset.paper; });
    window.addEventListener("beforeprint", () => { if (document.body.dataset.paper !== "card") fm.printMap(); });
  }

  // The map as it is on the screen, on paper: the sheets are copied into one picture.
  fm.printMap = function () {
    const size = fm.map.getSize();
    const copy = fm.element("canvas", { width: size.x * 2, height: size.y * 2 });
    const pen = copy.getContext("2d");
    pen.fillStyle = fm.inks().sea;
    pen.fillRect(0, 0, copy.width, copy.height);
    pen.scale(2, 2);
    for (const sheet of [ground, lines, marks]) {
      const at = fm.map.layerPointToContainerPoint(sheet._bounds.min);
      const wide = sheet._bounds.getSize();
      pen.drawImage(sheet._container, at.x, at.y, wide.x, wide.y);
    }
    // A canvas that is drawn while printing begins would be replayed as strokes, at another size.
    const image = fm.element("img", { alt: "The map as it is on the screen", src: copy.toDataURL() });
    const key = fm.byId("key").cloneNode(false);
    key.removeAttribute("id");
    key.className = "paper-key";
    const picture = fm.shownPicture();
    fm.drawKey();
    for (const node of fm.byId("key").querySelectorAll("details > :not(summary)")) key.append(node.cloneNode(true));
    const counts = fm.meta.classes.map((kind) => `${kind.name} ${fm.choice.counts.get(kind.code) || 0}`).join(" · ");
    fm.replace(
      fm.byId("paper"),
      fm.element("h2", {}, fm.meta.title),
      fm.element("p", {}, picture ? picture.record.description : ""),
      image, key,
      fm.sites.count ? fm.element("p", {}, `${fm.choice.total} of ${fm.sites.count} sites shown: ${counts}`) : null,
      fm.meta.cautions.length ? fm.element("ul", {}, fm.meta.cautions.map((line) => fm.element("li", {}, line))) : null,
      fm.element("p", { class: "quiet" }, [...fm.meta.provenance.map(([name, value]) => `${name}: ${value}`), fm.meta.thanks.basemap].filter(Boolean).join(" · "))
    );
  };

  fm.printWhole = async function () {
    fm.printMap();
    await document.querySelector("#paper img").decode();
    window.print();
  };

  async function start() {
    const meta = (fm.meta = fm.readMeta());
    fm.byId("title").textContent = fm.shortened(meta.title, 200);
    // The first short lines; a checksum is for the page of notes.
    const first = meta.provenance.map(([, value]) => value).filter((value) => value.length <= 40).slice(0, 2);
    fm.byId("subtitle").textContent = first.join(" · ");
    fm.startTheme();
    fm.startTabs();
    fm.startNotes(meta);
    if (typeof DecompressionStream === "undefined") {
      fm.say("This browser is too old to unpack the map: use one from 2023 or later.");
      return;
    }
    const [basemap, sites, visits, contours, coverage, routes] = await Promise.all(["basemap", "sites", "visits", "contours", "coverage", "routes"].map(fm.openBlock));
    const map = makeMap(meta);
    fm.sites = fm.makeSites(sites);
    fm.choice = fm.makeChoice(fm.sites, visits ? fm.makeVisits(visits, fm.sites.count) : null, meta.classes);
    fm.marks = new fm.Marks(fm.sites, meta.classes);
    fm.pictures = fm.makePictures(meta);
    fm.contours = contours && fm.makeContours(contours);
    fm.coverage = coverage && fm.makeContours(coverage);
    fm.routes = routes && fm.makeRoutes(routes);
    fm.buildList(meta);
    fm.buildCards(meta);
    fm.buildPlace();
    fm.buildLayers(meta);
    fm.buildAbout(meta);
    makeSheets(map, meta, fm.makeBasemap(basemap));
    taps(map);
    keys();
    fm.startAddress();
    await fm.obeyAddress();
    const picture = fm.shownPicture();
    if (picture) await picture.open();
    fm.redrawGround();
    fm.read(null);
    requestAnimationFrame(() => requestAnimationFrame(() => { document.body.dataset.ready = "yes"; }));
  }

  start().catch((problem) => {
    // Said on the page as well as in the console: a blank map helps nobody.
    document.body.prepend(fm.element("p", { class: "plain" }, `The map cannot be drawn: ${problem.message}`));
    throw problem;
  });
})(globalThis.FieldMap);
