// Drives a field map in headless Chromium and prints what it saw as one JSON object.
//
//   node fieldmap_browser.mjs CHROMIUM NODE_MODULES TASK < {"file": ..., "width": ..., ...}
//
// Every task opens the file, counts requests, console messages, page errors and dialogs, and adds its own.
import { createRequire } from "node:module";
import { readFileSync } from "node:fs";
import path from "node:path";
import { pathToFileURL } from "node:url";

const [chromium, modules, task] = process.argv.slice(2);
const given = JSON.parse(readFileSync(0, "utf8"));
const require = createRequire(path.join(modules, "package.json"));
const playwright = require("playwright-core");

const seen = { requests: [], messages: [], errors: [], dialogs: [] };

async function open(browser, { file, width = 1280, height = 800, theme = "light", hash = "" }) {
  const phone = width < 800;
  const context = await browser.newContext({
    viewport: { width, height }, colorScheme: theme, hasTouch: phone, isMobile: phone, deviceScaleFactor: phone ? 2 : 1, acceptDownloads: true,
  });
  const page = await context.newPage();
  page.on("request", (request) => {
    if (!/^(data|blob):/.test(request.url())) seen.requests.push(request.url());
  });
  page.on("console", (message) => seen.messages.push(message.text()));
  page.on("pageerror", (error) => seen.errors.push(String(error.stack)));
  page.on("dialog", (dialog) => {
    seen.dialogs.push(dialog.message());
    return dialog.dismiss();
  });
  await page.goto(pathToFileURL(file).href + hash);
  await ready(page);
  return page;
}

const ready = (page) => page.waitForSelector("body[data-ready=yes]", { state: "attached", timeout: 30000 });

// Point of a site, or of a place, on the page.
const pointOfSite = (page, i) => page.evaluate((row) => {
  const at = FieldMap.map.latLngToContainerPoint([FieldMap.sites.latitude[row], FieldMap.nearMiddle(FieldMap.sites.longitude[row])]);
  const box = document.getElementById("field").getBoundingClientRect();
  return { x: at.x + box.left, y: at.y + box.top };
}, i);

const press = (page, x, y) => (given.width < 800 ? page.touchscreen.tap(x, y) : page.mouse.click(x, y));
const text = (page, selector) => page.locator(selector).innerText();
const settle = (page) => page.waitForTimeout(400);

async function boxes(page, selector) {
  return page.$$eval(selector, (nodes) => nodes.filter((node) => node.offsetParent !== null).map((node) => {
    const label = node.closest("label.tick");
    const { width, height } = (label || node).getBoundingClientRect();
    return { what: node.id || node.className || node.textContent.slice(0, 20), width, height };
  }));
}

async function audit(page) {
  const axe = readFileSync(path.join(modules, "axe-core", "axe.min.js"), "utf8");
  // The page's own policy forbids foreign scripts; the protocol's evaluation is not bound by it.
  await page.evaluate(axe);
  const { violations } = await page.evaluate(() => axe.run(document));
  return violations.map(({ id, impact, nodes }) => ({ id, impact, nodes: nodes.slice(0, 4).map((node) => node.html.slice(0, 160)) }));
}

const tasks = {
  // From opening through everything that a person does on one visit.
  async walk(page) {
    const out = {};
    const row = await page.evaluate(() => FieldMap.sites.known && Array.from(FieldMap.sites.action).indexOf(1));
    await page.evaluate((i) => FieldMap.map.setView([FieldMap.sites.latitude[i], FieldMap.sites.longitude[i]], 9, { animate: false }), row);
    await settle(page);
    const at = await pointOfSite(page, row);
    await press(page, at.x + 9, at.y - 10);
    await page.waitForSelector("#card:not([hidden])");
    out.card = await text(page, "#card");
    out.title = await page.evaluate((i) => FieldMap.siteTitle(i), row);
    out.chosen = (await page.evaluate(() => FieldMap.marks.chosen)) === row;
    out.cardBox = await page.evaluate(() => {
      const box = document.querySelector(".card-bar").getBoundingClientRect();
      return { left: box.left, right: box.right, top: box.top, bottom: box.bottom, width: innerWidth, height: innerHeight };
    });
    out.geo = await page.getAttribute('#card a[href^="geo:"]', "href");
    await page.click("#back");
    await page.click("#tab-layers");
    out.keys = [];
    for (const radio of await page.$$("#pane-layers input[type=radio]")) {
      await radio.click();
      await settle(page);
      out.keys.push(await page.evaluate(() => (FieldMap.byId("key").textContent || "").slice(0, 90)));
    }
    for (const box of await page.$$("#pane-layers input[type=checkbox]")) await box.click();
    await settle(page);
    await page.click("#tab-sites");
    if (!(await page.isVisible("#find"))) await page.click("#tab-sites");
    await page.fill("#find", "rural 12");
    await settle(page);
    out.summary = await text(page, "#summary");
    await page.fill("#find", "");
    await page.click("#tab-about");
    out.about = await text(page, "#pane-about");
    await page.emulateMedia({ media: "print" });
    await page.evaluate(() => { FieldMap.printMap(); });
    await page.emulateMedia({ media: "screen" });
    return out;
  },

  async keyboard(page) {
    const out = {};
    await page.focus("#find");
    await page.keyboard.type("rural 7");
    await page.keyboard.press("Enter");
    await page.waitForSelector("#card:not([hidden])");
    out.focus = await page.evaluate(() => document.activeElement.id);
    out.title = await text(page, "#card h2");
    await page.keyboard.press("Escape");
    out.closed = await page.isHidden("#card");
    out.back = await page.evaluate(() => document.activeElement.textContent || document.activeElement.id);
    await page.focus("#tab-sites");
    await page.keyboard.press("ArrowRight");
    out.tab = await page.evaluate(() => document.activeElement.id);
    return out;
  },

  async targets(page) {
    const out = { small: [] };
    const all = "button, a, select, input, summary";
    const measure = async () => out.small.push(...(await boxes(page, all)).filter((box) => box.width < 44 - 0.01 || box.height < 44 - 0.01));
    await measure();
    for (const tab of ["sites", "place", "layers", "about"]) {
      await page.click("#tab-" + tab);
      await measure();
    }
    await page.evaluate(() => FieldMap.open(0, {}));
    await settle(page);
    await measure();
    out.wide = await page.evaluate(() => document.documentElement.scrollWidth > innerWidth);
    return out;
  },

  async axe(page) {
    const out = { start: await audit(page) };
    for (const tab of ["place", "layers", "about"]) {
      await page.click("#tab-" + tab);
      out[tab] = await audit(page);
    }
    await page.evaluate(() => FieldMap.tell("place", { longitude: -64, latitude: -36 }));
    await settle(page);
    out.filled = await audit(page);
    await page.evaluate(() => FieldMap.open(1, {}));
    await settle(page);
    out.card = await audit(page);
    return out;
  },

  // Values read on the page at given places, per layer; through the decoded grids, as the pointer does.
  async values(page) {
    return page.evaluate(async (places) => {
      const out = {};
      for (const picture of FieldMap.pictures) {
        await picture.open();
        out[picture.layer] = places.map(([x, y]) => {
          const value = picture.valueAt(FieldMap.worldX(FieldMap.nearMiddle(x)), FieldMap.worldY(y));
          return Number.isFinite(value) ? value : null;
        });
      }
      return out;
    }, given.places);
  },

  async pointer(page) {
    const [x, y] = given.at;
    const at = await page.evaluate(([lon, lat]) => {
      const point = FieldMap.map.latLngToContainerPoint([lat, lon]);
      const box = document.getElementById("field").getBoundingClientRect();
      return { x: point.x + box.left, y: point.y + box.top };
    }, [x, y]);
    await page.mouse.move(at.x, at.y);
    await settle(page);
    const reading = await text(page, "#reading");
    const value = await page.evaluate(([px, py]) => {
      const box = document.getElementById("field").getBoundingClientRect();
      const place = FieldMap.map.containerPointToLatLng([px - box.left, py - box.top]);
      const picture = FieldMap.shownPicture();
      return FieldMap.layerValue(picture.record, picture.valueAt(FieldMap.worldX(place.lng), FieldMap.worldY(place.lat)));
    }, [at.x, at.y]);
    return { reading, value };
  },

  // Where the drawn picture changes colour on the screen, against where a coordinate falls.
  async edges(page) {
    const found = await page.evaluate(async (wanted) => {
      const out = [];
      const wait = () => new Promise((done) => setTimeout(done, 150));
      for (const { zoom, longitude, latitude } of wanted) {
        FieldMap.map.setMinZoom(0);
        FieldMap.map.setMaxBounds(null);
        FieldMap.map.setView([latitude, longitude], zoom, { animate: false });
        await wait();
        const canvas = document.querySelector(".leaflet-ground-pane canvas");
        const size = FieldMap.map.getSize();
        const box = canvas.getBoundingClientRect();
        const field = document.getElementById("field").getBoundingClientRect();
        // Leaflet's own conversions to pixels round; these do not.
        const point = FieldMap.map.project([latitude, longitude]).subtract(FieldMap.map.getPixelOrigin()).add(FieldMap.map._getMapPanePos());
        const density = canvas.width / box.width;
        const at = { x: (point.x + field.left - box.left) * density, y: (point.y + field.top - box.top) * density };
        const copy = document.createElement("canvas");
        [copy.width, copy.height] = [canvas.width, canvas.height];
        const pen = copy.getContext("2d", { willReadFrequently: true });
        pen.drawImage(canvas, 0, 0);
        const reach = 60;
        const column = pen.getImageData(Math.round(at.x) + 8, Math.round(at.y) - reach, 1, 2 * reach).data;
        const line = pen.getImageData(Math.round(at.x) - reach, Math.round(at.y) + 8, 2 * reach, 1).data;
        const nearest = (data, offset) => {
          let best = 1e9;
          for (let i = 1; i < 2 * reach; i++) {
            const change = Math.abs(data[4 * i] - data[4 * i - 4]) + Math.abs(data[4 * i + 1] - data[4 * i - 3]) + Math.abs(data[4 * i + 2] - data[4 * i - 2]);
            if (change > 30) best = Math.min(best, Math.abs(i + offset));
          }
          return best / density;
        };
        out.push({
          zoom, longitude, latitude, seen: size.x > 0,
          down: nearest(column, Math.round(at.y) - reach - at.y), side: nearest(line, Math.round(at.x) - reach - at.x),
        });
      }
      return out;
    }, given.wanted);
    return { found };
  },

  async place(page) {
    const at = await page.evaluate(([lon, lat]) => {
      const point = FieldMap.map.latLngToContainerPoint([lat, lon]);
      const box = document.getElementById("field").getBoundingClientRect();
      return { x: point.x + box.left, y: point.y + box.top };
    }, given.at);
    await press(page, at.x, at.y);
    await page.waitForSelector("#pane-place [data-grid]");
    return page.evaluate(() => ({
      place: FieldMap.placeOpen(),
      cells: Object.fromEntries([...document.querySelectorAll("#pane-place [data-value]")].map((node) => [node.dataset.value, node.textContent])),
      grids: Object.fromEntries([...document.querySelectorAll("#pane-place [data-grid]")].map((node) => [node.dataset.grid, node.textContent])),
      visible: !document.getElementById("pane-place").hidden,
    }));
  },

  async address(page) {
    const state = () => page.evaluate(() => ({
      crew: FieldMap.choice.crew, day: FieldMap.choice.day, text: FieldMap.choice.text, total: FieldMap.choice.total,
      hidden: [...FieldMap.choice.hidden], layer: FieldMap.drawing.picture, zoom: FieldMap.map.getZoom(), hash: location.hash, open: FieldMap.cardOpen(),
    }));
    const out = { first: await state() };
    await page.selectOption("#pick-crew", given.crew);
    await page.selectOption("#pick-day", given.day);
    await page.click("#counts button >> nth=0");
    await page.evaluate((layer) => FieldMap.showPicture(layer), given.layer);
    await page.evaluate(() => FieldMap.map.setZoom(6, { animate: false }));
    await page.evaluate((i) => FieldMap.open(i, { stay: true }), given.site);
    await page.waitForTimeout(700);
    out.set = await state();
    await page.goto("about:blank");
    await page.goto(pathToFileURL(given.file).href + out.set.hash);
    await ready(page);
    out.again = await state();
    return out;
  },

  async notes(page) {
    await page.evaluate(() => FieldMap.open(3, {}));
    await settle(page);
    await page.click('#card input[type="checkbox"] >> nth=1');
    for (const [key, value] of Object.entries(given.readings)) {
      await page.fill(`#card [data-field="${key}"]`, value);
      await page.locator(`#card [data-field="${key}"]`).blur();
    }
    await page.reload();
    await ready(page);
    await page.evaluate(() => FieldMap.open(3, {}));
    await settle(page);
    const kept = await page.isChecked('#card input[type="checkbox"] >> nth=1');
    const [download] = await Promise.all([page.waitForEvent("download"), page.click("text=Save all reports as a file >> visible=true")]);
    const file = await download.path();
    return { kept, name: download.suggestedFilename(), csv: readFileSync(file, "utf8"), id: await page.evaluate(() => FieldMap.sites.id(3)) };
  },

  // Hostile text is shown as it is; nothing runs.
  async hostile(page) {
    const rows = await page.evaluate(() => FieldMap.sites.count);
    const cards = [];
    for (let i = 0; i < rows; i++) {
      await page.evaluate((row) => FieldMap.open(row, {}), i);
      await page.waitForTimeout(60);
      cards.push({ text: await page.evaluate(() => document.getElementById("card").textContent), name: await page.evaluate((row) => FieldMap.sites.name(row), i) });
    }
    await page.evaluate(() => { window.print = () => { window.printed = true; }; });
    await page.evaluate(() => FieldMap.printCard(5));
    await settle(page);
    const paper = await page.evaluate(() => document.getElementById("paper").textContent);
    await page.evaluate(() => { FieldMap.close(); for (const name of FieldMap.contours.names) FieldMap.drawing.lines.add(name); FieldMap.redrawLines(); });
    for (const tab of ["place", "layers", "about", "sites"]) await page.click("#tab-" + tab);
    await page.evaluate(() => FieldMap.tell("place", { longitude: -60, latitude: -30 }));
    await settle(page);
    return {
      cards, paper,
      title: await page.evaluate(() => document.title),
      list: await page.evaluate(() => document.getElementById("sites").textContent),
      about: await page.evaluate(() => document.getElementById("pane-about").textContent),
      images: await page.evaluate(() => document.querySelectorAll("img, body svg[onload]").length),
      scripts: await page.evaluate(() => document.querySelectorAll("script:not([type])").length),
    };
  },

  async paper(page) {
    await page.evaluate(() => { window.print = () => {}; });
    await page.evaluate(() => FieldMap.open(1, {}));
    await settle(page);
    await page.evaluate(() => FieldMap.printCard(1));
    const card = await page.pdf({ path: given.card, preferCSSPageSize: true, printBackground: true });
    await page.evaluate(async () => {
      window.dispatchEvent(new Event("afterprint"));
      await FieldMap.printWhole();
    });
    const map = await page.pdf({ path: given.map, preferCSSPageSize: true, printBackground: true });
    return { card: card.length, map: map.length };
  },

  async tiles(page) {
    await page.click("#tab-layers");
    const before = seen.requests.length;
    await page.click("text=Load map pictures from the network");
    await page.waitForTimeout(1200);
    return { before, after: seen.requests.length, alive: await page.evaluate(() => FieldMap.map.getZoom() > 0) };
  },

  async shot(page) {
    if (given.run) await page.evaluate(given.run);
    await page.waitForTimeout(900);
    await page.screenshot({ path: given.out });
    return {};
  },
};

const browser = await playwright.chromium.launch({
  executablePath: chromium,
  args: ["--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking", "--disable-component-update", "--disable-sync", "--host-resolver-rules=MAP * ~NOTFOUND"],
});
try {
  const page = await open(browser, given).catch((problem) => {
    throw new Error(`${problem.message}\n${seen.errors.join("\n")}`);
  });
  const result = await tasks[task](page);
  console.log(JSON.stringify({ ...seen, result }));
} finally {
  await browser.close();
}
