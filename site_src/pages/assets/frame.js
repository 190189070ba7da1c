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
  const asked = options.find((option) => matchMedia(option.dataset.mdColorMedia).matches);
  const scheme = window.__md_get("__palette")?.color?.scheme ?? asked?.dataset.mdColorScheme;
  document.body.dataset.mdColorScheme = scheme ?? "default";
})();
