"use strict";
// One namespace, and the only way in which this page makes elements: text is always text.
globalThis.FieldMap = globalThis.FieldMap || {};

(function (fm) {
  const SVG = "http://www.w3.org/2000/svg";

  function fill(node, options, children) {
    for (const [key, value] of Object.entries(options || {})) {
      if (value === undefined || value === null || value === false) continue;
      if (key === "on") {
        for (const [event, act] of Object.entries(value)) node.addEventListener(event, act);
      } else if (key === "data") {
        Object.assign(node.dataset, value);
      } else {
        node.setAttribute(key, value === true ? "" : String(value));
      }
    }
    for (const child of children.flat(3)) {
      if (child === undefined || child === null || child === false) continue;
      node.append(child instanceof Node ? child : document.createTextNode(String(child)));
    }
    return node;
  }

  // element("p", {class: "quiet"}, "text", otherElement)
  fm.element = (name, options, ...children) => fill(document.createElement(name), options, children);
  fm.svg = (name, options, ...children) => fill(document.createElementNS(SVG, name), options, children);
  fm.button = (text, act, options) =>
    fm.element("button", { type: "button", on: { click: act }, ...(options || {}) }, text);
  fm.byId = (id) => document.getElementById(id);

  fm.replace = function (node, ...children) {
    node.replaceChildren();
    return fill(node, null, children);
  };

  // Says something to everybody, screen readers included, for a few seconds.
  let silence = 0;
  fm.say = function (text) {
    const news = fm.byId("news");
    news.textContent = text;
    news.classList.add("shown");
    clearTimeout(silence);
    silence = setTimeout(() => news.classList.remove("shown"), 4000);
  };

  // Listeners by subject: the parts of the page know subjects, not each other.
  const listeners = new Map();
  fm.when = function (subject, act) {
    if (!listeners.has(subject)) listeners.set(subject, []);
    listeners.get(subject).push(act);
  };
  fm.tell = function (subject, news) {
    for (const act of listeners.get(subject) || []) act(news);
  };

  // The device may forbid storage, for instance in a private window: then nothing is kept, and said so.
  fm.store = {
    read(key) {
      try {
        return localStorage.getItem(key);
      } catch (problem) {
        return null;
      }
    },
    write(key, text) {
      try {
        if (text === null) localStorage.removeItem(key);
        else localStorage.setItem(key, text);
        return true;
      } catch (problem) {
        return false;
      }
    },
  };
})(globalThis.FieldMap);
