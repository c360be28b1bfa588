"use strict";
// Which sites are shown: by action, crew, day and text. Everything that lists or draws sites asks here.
(function (fm) {
  fm.makeChoice = function (sites, visits, classes) {
    const codes = [...classes.map((kind) => kind.code), fm.noAction.code];
    const choice = {
      hidden: new Set(),
      crew: "",
      day: "",
      text: "",
      shown: new Uint8Array(sites.count).fill(1),
      total: sites.count,
      counts: new Map(),
      crews: visits ? [...visits.crews].sort(collate) : [],
      days: visits ? [...visits.days].sort(collate) : [],
      visitsOf: (i) => (visits ? visits.of(i) : []),

      // Change some of {hidden, crew, day, text} and tell everybody.
      set(change) {
        Object.assign(choice, change);
        choice.apply();
        fm.tell("choice", choice);
      },

      apply() {
        const needles = choice.text.toLowerCase().split(/\s+/).filter(Boolean);
        const onRoad = visits && (choice.crew || choice.day) ? visits.mask(choice.crew, choice.day) : null;
        choice.counts = new Map(codes.map((code) => [code, 0]));
        choice.total = 0;
        for (let i = 0; i < sites.count; i++) {
          const fits = (!onRoad || onRoad[i]) && needles.every((needle) => sites.haystack(i).includes(needle));
          const code = choice.counts.has(sites.action[i]) ? sites.action[i] : fm.noAction.code;
          if (fits) choice.counts.set(code, choice.counts.get(code) + 1);
          choice.shown[i] = fits && !choice.hidden.has(code) ? 1 : 0;
          choice.total += choice.shown[i];
        }
      },
    };
    choice.apply();
    return choice;
  };

  // Numbers inside names in their own order: crew 2 before crew 10.
  const collator = new Intl.Collator("en", { numeric: true, sensitivity: "base" });
  const collate = (a, b) => collator.compare(a, b);
  fm.collate = collate;

  fm.makeVisits = function (block, count) {
    const [site, crew, day, stop] = ["site", "crew", "day", "stop"].map((name) => block.array(name));
    const { crews, days } = block.texts;
    if (site.length === 0) return null;
    return {
      crews,
      days,
      mask(wantedCrew, wantedDay) {
        const out = new Uint8Array(count);
        for (let v = 0; v < site.length; v++) {
          if (wantedCrew && crews[crew[v]] !== wantedCrew) continue;
          if (wantedDay && days[day[v]] !== wantedDay) continue;
          out[site[v]] = 1;
        }
        return out;
      },
      of(i) {
        const out = [];
        for (let v = 0; v < site.length; v++) {
          if (site[v] === i) out.push({ crew: crews[crew[v]], day: days[day[v]], stop: stop[v] });
        }
        return out;
      },
    };
  };

  // A map without a list answers like a list without rows.
  const NO_SITES = {
    count: 0, known: new Map(), weight: null, action: new Uint8Array(0),
    latitude: new Float64Array(0), longitude: new Float64Array(0),
    id: () => "", name: () => "", district: () => "", haystack: () => "",
    number: () => () => NaN, text: () => () => "",
  };

  // The first block of sites as functions of a row.
  fm.makeSites = function (block) {
    if (block === null) return NO_SITES;
    const count = block.facts.count;
    const known = new Map(block.facts.columns.map((facts) => [facts.name, facts]));
    const text = (name) => (known.has(name) && known.get(name).kind === "text" ? fm.textColumn(block, name) : () => "");
    const number = function (name) {
      const facts = known.get(name);
      if (!facts) return () => NaN;
      if (facts.kind === "number") return fm.numberColumn(block, facts);
      const cells = fm.textColumn(block, name);
      return (i) => (cells(i) === "" ? NaN : Number(cells(i)));
    };
    const [id, name, district] = [text("id"), text("name"), text("district")];
    const weighing = number("weight");
    const weight = known.has("weight") ? Float64Array.from({ length: count }, (_, i) => weighing(i)) : null;
    const haystacks = [];
    return {
      count,
      known,
      id,
      name,
      district,
      number,
      text,
      weight,
      action: block.array("action"),
      latitude: fm.degrees(block.array("lat"), 6),
      longitude: fm.degrees(block.array("lon"), 6),
      haystack(i) {
        if (haystacks[i] === undefined) haystacks[i] = `${id(i)} ${name(i)} ${district(i)}`.toLowerCase();
        return haystacks[i];
      },
    };
  };
})(globalThis.FieldMap);
