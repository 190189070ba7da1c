/* What the theme does in inline scripts, as a file: a strict Content-Security-Policy needs no
   exception then. Runs right after the header, before the page is painted. */
(() => {
  "use strict";

  const top = new URL("..", document.currentScript.src);

  /* The theme's store of choices; names and format are the theme's. */
  window.__md_scope = top;
  window.__md_hash = (text) =>
    Array.from(text).reduce((sum, letter) => ((sum << 5) - sum + letter.charCodeAt(0)) | 0, 0);
  window.__md_get = (key, store, scope = top) => {
    try {
      return JSON.parse((store ?? localStorage).getItem(`${scope.pathname}.${key}`));
    } catch {
      return null;
    }
  };
  window.__md_set = (key, value, store, scope = top) => {
    try {
      (store ?? localStorage).setItem(`${scope.pathname}.${key}`, JSON.stringify(value));
    } catch {
      /* A browser that keeps nothing shows the page all the same. */
    }
  };

  /* The colours chosen last, else those the system asks for. */
  const options = Array.from(document.querySelectorAll("[data-md-color-media]"));
  const wanted = options.find((option) => matchMedia(option.dataset.mdColorMedia).matches);
  const scheme = window.__md_get("__palette")?.color?.scheme ?? wanted?.dataset.mdColorScheme;
  document.body.dataset.mdColorScheme = scheme ?? "default";

  /* A browser starts no worker from a file. There the search runs in a hidden frame, which looks
     like a worker from both sides. */
  if (location.protocol !== "file:") { return; }
  window.Worker = class extends EventTarget {
    constructor(address) {
      super();
      this.waiting = [];
      const frame = document.createElement("iframe");
      frame.hidden = true;
      frame.title = "Search";
      document.body.append(frame);
      this.inside = frame.contentWindow;
      this.inside.postMessage = (data) => this.dispatchEvent(new MessageEvent("message", { data }));
      const script = frame.contentDocument.createElement("script");
      script.src = new URL(address, location.href).href;
      script.addEventListener("load", () => {
        const waiting = this.waiting;
        this.waiting = null;
        waiting.forEach((data) => this.postMessage(data));
      });
      frame.contentDocument.head.append(script);
    }

    postMessage(data) {
      if (this.waiting) {
        this.waiting.push(data);
      } else {
        this.inside.dispatchEvent(new MessageEvent("message", { data }));
      }
    }
  };
})();
