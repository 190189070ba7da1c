/* Around the theme's search: it waits until somebody turns to it, it works from a file, and what
   is a name, a CAS number or a formula as a whole comes first. Runs before the theme's script. */
(() => {
  "use strict";

  /* The theme loads index and worker with every page, which nobody may ever use. */
  const wanted = new Promise((resolve) => {
    for (const kind of ["focusin", "pointerover"]) {
      document.addEventListener(kind, ({ target }) => {
        if (target.closest?.('[data-md-component="search"], [for="__search"]')) { resolve(); }
      });
    }
  });
  const { open, send } = XMLHttpRequest.prototype;
  XMLHttpRequest.prototype.open = function (method, address, ...rest) {
    this.waits = String(address).endsWith("/search_index.json");
    open.call(this, method, address, ...rest);
  };
  XMLHttpRequest.prototype.send = function (...content) {
    if (this.waits) { wanted.then(() => send.apply(this, content)); } else { send.apply(this, content); }
  };

  const squeeze = (text) => text.toLowerCase().normalize("NFKD").replace(/[^a-z0-9\u0370-\u03ff]/g, "");

  /* Datasheets by what they are called as a whole; a CAS number or name before a formula or synonym.
     Title "Acetone 67-64-1", text "67-64-1 · C3H6O · … · propanone — Ketones, …". */
  const names = ({ title, text }) => {
    const [cas, ...others] = text.split(" — ")[0].split(" · ");
    return [cas, title.replace(cas, ""), ...others];
  };

  const index = (entries) => {
    const called = new Map();
    for (const entry of entries.filter(({ location: place }) => place.startsWith("solvents/"))) {
      names(entry).forEach((name, place) => {
        const key = squeeze(name);
        if (!called.has(key)) { called.set(key, []); }
        called.get(key).push({ entry, grade: place < 2 ? 0 : 1 });
      });
    }
    called.forEach((found) => found.sort((a, b) => a.grade - b.grade));
    return called;
  };

  const exactFirst = (items, found) => {
    const places = found.map(({ entry }) => entry.location);
    const rest = items.filter(([first]) => !places.includes(first.location));
    const exact = found.map(({ entry }) => items.find(([first]) => first.location === entry.location)
      ?? [{ ...entry, score: 1, terms: {} }]);
    return [...exact, ...rest];
  };

  const patch = new URL("search-worker.js", document.currentScript.src).href;
  const [SETUP, QUERY, RESULT] = [0, 2, 3]; /* the theme's kinds of message */
  const Native = window.Worker;

  window.Worker = class extends EventTarget {
    constructor(address) {
      super();
      this.waiting = [];
      this.called = new Map();
      this.asked = [];
      const theme = new URL(address, location.href).href;
      wanted.then(() => (location.protocol === "file:" ? this.inFrame(theme) : this.inWorker(theme)));
    }

    inWorker(theme) {
      const worker = new Native(`${patch}#${encodeURIComponent(theme)}`);
      worker.addEventListener("message", ({ data }) => this.answer(data));
      this.flush((data) => worker.postMessage(data));
    }

    /* A browser starts no worker from a file; a hidden frame looks like one from both sides. */
    async inFrame(theme) {
      const frame = document.createElement("iframe");
      frame.hidden = true;
      frame.title = "Search";
      document.body.append(frame);
      const inside = frame.contentWindow;
      inside.postMessage = (data) => this.answer(data);
      for (const address of [theme, patch]) {
        const script = frame.contentDocument.createElement("script");
        script.src = address;
        const loaded = new Promise((resolve) => { script.addEventListener("load", resolve); });
        frame.contentDocument.head.append(script);
        await loaded;
      }
      this.flush((data) => inside.dispatchEvent(new MessageEvent("message", { data })));
    }

    flush(deliver) {
      this.deliver = deliver;
      this.waiting.forEach((data) => this.postMessage(data));
    }

    postMessage(message) {
      if (!this.deliver) { this.waiting.push(message); return; }
      if (message.type === SETUP) { this.called = index(message.data.docs); }
      if (message.type === QUERY) { this.asked.push(squeeze(message.data)); }
      this.deliver(message);
    }

    answer(message) {
      if (message.type === RESULT) {
        const found = this.called.get(this.asked.shift());
        if (found) { message.data.items = exactFirst(message.data.items, found); }
      }
      this.dispatchEvent(new MessageEvent("message", { data: message }));
    }
  };
})();
