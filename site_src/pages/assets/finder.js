/* The finder: best match first, from the first key stroke. Used on the home page and to choose
   substances side by side. Nothing is requested, so that it works from a file. */
(() => {
  "use strict";

  const LIMIT = 24;

  /* Letters and digits only: a CAS number, a name and a formula are found with or without
     hyphens, blanks and brackets. */
  const squeeze = (text) =>
    text.toLowerCase().normalize("NFKD").replace(/[^a-z0-9\u0370-\u03ff]/g, "");

  const prepare = (entry) => ({
    entry,
    name: squeeze(entry.n),
    words: entry.n.toLowerCase().split(/[^a-z0-9]+/),
    cas: squeeze(entry.c),
    formula: entry.f.toLowerCase(),
    synonyms: entry.s.map(squeeze),
    key: squeeze(entry.k),
  });

  /* Lower is better; -1 means that it does not match. An exact CAS number or name always wins. */
  const rank = (item, query, typed) => [
    item.cas === query || item.key === query,
    item.name === query,
    item.synonyms.includes(query),
    item.formula === typed,
    item.name.startsWith(query),
    item.words.some((word) => word.startsWith(query)),
    item.synonyms.some((name) => name.startsWith(query)),
    item.cas.startsWith(query),
    item.name.includes(query),
    item.synonyms.some((name) => name.includes(query)),
    item.formula.includes(typed),
    item.cas.includes(query),
    item.key.includes(query),
  ].indexOf(true);

  const search = (items, text, fits = () => true) => {
    const query = squeeze(text);
    const typed = text.trim().toLowerCase();
    return items
      .map((item, place) => ({ item, place, grade: query ? rank(item, query, typed) : 0 }))
      .filter(({ item, grade }) => grade >= 0 && fits(item.entry))
      .sort((a, b) => a.grade - b.grade
        || (query ? a.item.name.length - b.item.name.length : 0) || a.place - b.place)
      .map(({ item }) => item.entry);
  };

  const { make } = handbook;

  const formula = (text) => make("span", { class: "formula" },
    ...text.split(/(\d+)/).map((part) => (/^\d+$/.test(part) ? make("sub", {}, part) : part)));

  /* The synonym that was meant, where the name itself does not show why it was found. */
  const alias = (entry, text) => {
    const wanted = squeeze(text);
    if (!wanted || squeeze(entry.n).includes(wanted)) { return []; }
    const found = entry.s.find((name) => squeeze(name).includes(wanted));
    return found ? [make("span", { class: "alias" }, `also ${found}`)] : [];
  };

  /* Arrow keys go through the hits below a text field. */
  const keys = (input, list, clear) => {
    const all = () => Array.from(list.querySelectorAll("[data-hit]"));
    const act = (event, actions) => {
      if (actions[event.key]) {
        actions[event.key]();
        event.preventDefault();
      }
    };
    input.addEventListener("keydown", (event) => act(event, {
      ArrowDown: () => all()[0]?.focus(),
      Enter: () => all()[0]?.click(),
      Escape: clear,
    }));
    list.addEventListener("keydown", (event) => {
      const hits = all();
      const at = hits.indexOf(document.activeElement);
      if (at < 0) { return; }
      act(event, {
        ArrowDown: () => (hits[at + 1] ?? hits[at]).focus(),
        ArrowUp: () => (hits[at - 1] ?? input).focus(),
        Home: () => hits[0].focus(),
        End: () => hits.at(-1).focus(),
        Escape: () => { clear(); input.focus(); },
      });
    });
  };

  window.handbook.finder = { prepare, search, formula, alias, keys };

  /* ---- the home page ---- */

  const input = document.getElementById("finder-input");
  if (!input) { return; }
  /* What the columns are called, then a row a substance. */
  const [columns, ...rows] = JSON.parse(document.getElementById("finder-index").textContent);
  const items = rows.map((cells) =>
    prepare(Object.fromEntries(cells.map((cell, place) => [columns[place], cell]))));
  window.handbook.finder.items = items;
  const results = document.getElementById("finder-results");
  const status = document.getElementById("finder-status");
  const selects = Array.from(document.querySelectorAll(".finder-filters select"));
  const liquid = document.getElementById("finder-liquid");
  const stock = document.getElementById("finder-stock");
  const box = handbook.tray(document.getElementById("finder-tray"));

  const chosen = () => selects.some((select) => select.value) || liquid.value || stock.checked;

  /* Liquid at a temperature only where both ends of the range are known to hold it. */
  const fits = (entry) => {
    const at = liquid.valueAsNumber;
    return selects.every(({ value, dataset }) =>
      !value || (value === "?" ? entry[dataset.key] === "" : entry[dataset.key] === value))
      && (Number.isNaN(at)
        || (entry.m !== null && entry.b !== null && entry.m <= at && at <= entry.b))
      && (!stock.checked || entry.o === 1);
  };

  const row = (entry) => make("li", {}, box(entry.u, entry.n), make("a", {
    href: `solvents/${entry.u}.html`, "data-hit": true,
  },
      make("b", {}, entry.n),
      ...alias(entry, input.value),
      make("span", { class: "cas" }, entry.c),
      formula(entry.f),
      make("span", { class: "eps" }, entry.e ? `ε ${entry.e} at ${entry.t}` : "ε not known"),
      make("span", { class: "polar" }, entry.p === "not known" ? "polarity not known" : entry.p),
  ));

  const show = () => {
    if (!input.value.trim() && !chosen()) {
      results.replaceChildren();
      status.textContent = "";
      return;
    }
    const found = search(items, input.value, fits);
    results.replaceChildren(...found.slice(0, LIMIT).map(row));
    const open = items.filter(({ entry }) => entry.m === null || entry.b === null).length;
    status.textContent = [
      found.length ? `${found.length} substance${found.length === 1 ? "" : "s"}` : "Nothing in the handbook matches",
      found.length > LIMIT ? `, the first ${LIMIT} shown` : "",
      liquid.value && open ? `; ${open} left out, their liquid range is not known` : "",
      ".",
    ].join("");
  };

  const clear = () => { input.value = ""; show(); };

  input.addEventListener("input", show);
  [...selects, stock].forEach((field) => field.addEventListener("change", show));
  liquid.addEventListener("input", show);
  keys(input, results, clear);
  document.getElementById("finder-clear").addEventListener("click", () => {
    selects.forEach((select) => { select.value = ""; });
    liquid.value = "";
    stock.checked = false;
    clear();
  });
  /* The theme opens its own search at "/"; on this page the finder comes first. */
  addEventListener("keydown", (event) => {
    const typing = /^(INPUT|SELECT|TEXTAREA)$/.test(document.activeElement?.tagName ?? "");
    if (event.key === "/" && !typing && !event.ctrlKey && !event.metaKey && !event.altKey) {
      event.preventDefault();
      event.stopPropagation();
      input.focus();
      input.select();
    }
  }, true);
  show();
})();
