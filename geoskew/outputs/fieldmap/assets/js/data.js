"use strict";
// Reads the inert blocks of the page: JSON, and packed arrays (base64 of gzip, see blocks.py).
(function (fm) {
  fm.readMeta = () => JSON.parse(fm.byId("data-meta").textContent);

  fm.bytesOfBase64 = function (text) {
    const raw = atob(text);
    const bytes = new Uint8Array(raw.length);
    for (let i = 0; i < raw.length; i++) bytes[i] = raw.charCodeAt(i);
    return bytes;
  };

  fm.gunzip = async function (bytes) {
    const stream = new Blob([bytes]).stream().pipeThrough(new DecompressionStream("gzip"));
    return new Uint8Array(await new Response(stream).arrayBuffer());
  };

  // Unsigned integers from planes of equal significance, lowest first.
  function fromPlanes(bytes, start, width, count) {
    const Kind = width === 1 ? Uint8Array : width === 2 ? Uint16Array : Uint32Array;
    const out = new Kind(count);
    for (let plane = 0; plane < width; plane++) {
      const at = start + plane * count;
      const shift = 8 * plane;
      for (let i = 0; i < count; i++) out[i] |= bytes[at + i] << shift;
    }
    return out;
  }

  class Block {
    constructor(bytes) {
      const length = bytes[0] | (bytes[1] << 8) | (bytes[2] << 16) | (bytes[3] << 24);
      const head = JSON.parse(new TextDecoder().decode(bytes.subarray(4, 4 + length)));
      this.texts = head.texts;
      this.facts = head.facts;
      this.bytes = bytes;
      this.where = new Map();
      let start = 4 + length;
      for (const part of head.parts) {
        this.where.set(part.name, { ...part, start });
        start += part.width * part.count;
      }
    }

    has(name) {
      return this.where.has(name);
    }

    array(name) {
      const part = this.where.get(name);
      return fromPlanes(this.bytes, part.start, part.width, part.count);
    }
  }

  const opened = new Map();
  // A block by name, unpacked once; null when the page does not carry it.
  fm.openBlock = function (name) {
    if (!opened.has(name)) {
      const holder = fm.byId("data-" + name);
      opened.set(
        name,
        holder === null
          ? Promise.resolve(null)
          : fm.gunzip(fm.bytesOfBase64(holder.textContent)).then((bytes) => {
              // The text would stay in memory beside the arrays.
              holder.remove();
              return new Block(bytes);
            })
      );
    }
    return opened.get(name);
  };

  // A quantised column: number(i) is NaN where there is no value.
  fm.numberColumn = function (block, facts) {
    const codes = block.array(facts.name);
    return (i) => (codes[i] === 0 ? NaN : facts.offset + (codes[i] - 1) * facts.step);
  };

  fm.textColumn = function (block, name) {
    const codes = block.array(name);
    const words = block.texts[name];
    return (i) => words[codes[i]];
  };

  fm.degrees = (codes, decimals) => Float64Array.from(codes, (code) => code / 10 ** decimals - 720);
})(globalThis.FieldMap);
