/* The finder of the home page. A classic script without requests, so that it works from a file. */
(function () {
  "use strict";

  var LIMIT = 24;

  /* Letters and digits only: a CAS number, a name and a formula are found with or without
     hyphens, blanks and brackets. */
  function squeeze(text) {
    return text.toLowerCase().normalize("NFKD").replace(/[^a-z0-9\u0370-\u03ff]/g, "");
  }

  function prepare(entry) {
    return {
      entry: entry,
      name: squeeze(entry.n),
      words: entry.n.toLowerCase().split(/[^a-z0-9]+/),
      cas: squeeze(entry.c),
      formula: entry.f.toLowerCase(),
      synonyms: entry.s.map(squeeze),
      key: squeeze(entry.k)
    };
  }

  /* Lower is better; -1 means that it does not match. An exact CAS number or name always wins. */
  function rank(item, query, typed) {
    if (item.cas === query || item.key === query) { return 0; }
    if (item.name === query) { return 1; }
    if (item.synonyms.indexOf(query) >= 0) { return 2; }
    if (item.formula === typed) { return 3; }
    if (item.name.indexOf(query) === 0) { return 4; }
    if (item.words.some(function (word) { return word.indexOf(query) === 0; })) { return 5; }
    if (item.synonyms.some(function (name) { return name.indexOf(query) === 0; })) { return 6; }
    if (item.cas.indexOf(query) === 0) { return 7; }
    if (item.name.indexOf(query) > 0) { return 8; }
    if (item.synonyms.some(function (name) { return name.indexOf(query) > 0; })) { return 9; }
    if (item.formula.indexOf(typed) >= 0) { return 10; }
    if (item.cas.indexOf(query) > 0) { return 11; }
    if (item.key.indexOf(query) >= 0) { return 12; }
    return -1;
  }

  function search(items, text, family, polar) {
    var query = squeeze(text);
    var typed = text.trim().toLowerCase();
    var found = [];
    items.forEach(function (item, position) {
      if (family && item.entry.g !== family) { return; }
      if (polar && item.entry.p !== polar) { return; }
      var grade = query ? rank(item, query, typed) : 20;
      if (grade >= 0) { found.push([grade, query ? item.name.length : 0, position, item]); }
    });
    found.sort(function (a, b) { return a[0] - b[0] || a[1] - b[1] || a[2] - b[2]; });
    return found.map(function (hit) { return hit[3].entry; });
  }

  if (typeof module !== "undefined") {
    module.exports = { prepare: prepare, search: search };
    return;
  }

  function element(tag, name, text) {
    var made = document.createElement(tag);
    if (name) { made.className = name; }
    if (text) { made.textContent = text; }
    return made;
  }

  function formula(text) {
    var holder = element("span", "formula");
    text.split(/(\d+)/).forEach(function (part) {
      holder.appendChild(/^\d+$/.test(part) ? element("sub", "", part) : document.createTextNode(part));
    });
    return holder;
  }

  function row(entry, query) {
    var link = element("a");
    link.href = entry.u;
    link.appendChild(element("b", "", entry.n));
    var wanted = squeeze(query);
    var alias = wanted && squeeze(entry.n).indexOf(wanted) < 0
      ? entry.s.filter(function (name) { return squeeze(name).indexOf(wanted) >= 0; })[0] : "";
    if (alias) { link.appendChild(element("span", "alias", "also " + alias)); }
    link.appendChild(element("span", "cas", entry.c));
    link.appendChild(formula(entry.f));
    link.appendChild(element("span", "eps", entry.e ? "ε " + entry.e + " at " + entry.t : "ε not known"));
    link.appendChild(element("span", "polar", entry.p === "not known" ? "polarity not known" : entry.p));
    var item = element("li");
    item.appendChild(link);
    return item;
  }

  function start() {
    var input = document.getElementById("finder-input");
    var index = document.getElementById("finder-index");
    if (!input || !index || input.dataset.ready) { return; }
    input.dataset.ready = "yes";
    var items = JSON.parse(index.textContent).map(prepare);
    var results = document.getElementById("finder-results");
    var status = document.getElementById("finder-status");
    var family = document.getElementById("finder-family");
    var polar = document.getElementById("finder-polar");

    function links() { return Array.prototype.slice.call(results.querySelectorAll("a")); }

    function show() {
      results.textContent = "";
      if (!input.value.trim() && !family.value && !polar.value) {
        status.textContent = "";
        return;
      }
      var found = search(items, input.value, family.value, polar.value);
      found.slice(0, LIMIT).forEach(function (entry) { results.appendChild(row(entry, input.value)); });
      var more = found.length - LIMIT;
      status.textContent = found.length
        ? found.length + (found.length === 1 ? " substance" : " substances") + (more > 0 ? ", the first " + LIMIT + " shown" : "")
        : "Nothing in the handbook matches.";
    }

    function move(event) {
      var list = links();
      var at = list.indexOf(document.activeElement);
      if (event.key === "ArrowDown" && list.length) {
        list[Math.min(at + 1, list.length - 1)].focus();
      } else if (event.key === "ArrowUp" && at >= 0) {
        (at === 0 ? input : list[at - 1]).focus();
      } else if (event.key === "Home" && at > 0) {
        list[0].focus();
      } else if (event.key === "End" && at >= 0) {
        list[list.length - 1].focus();
      } else if (event.key === "Escape") {
        input.value = "";
        show();
        input.focus();
      } else if (event.key === "Enter" && document.activeElement === input && list.length) {
        list[0].click();
      } else {
        return;
      }
      event.preventDefault();
    }

    input.addEventListener("input", show);
    family.addEventListener("change", show);
    polar.addEventListener("change", show);
    input.addEventListener("keydown", move);
    results.addEventListener("keydown", move);
    /* The theme opens its own search at "/" and swallows arrows; on this page the finder is first. */
    window.addEventListener("keydown", function (event) {
      var tag = document.activeElement ? document.activeElement.tagName : "";
      var typing = /^(INPUT|SELECT|TEXTAREA)$/.test(tag);
      if (event.key === "/" && !typing && !event.ctrlKey && !event.metaKey && !event.altKey) {
        event.preventDefault();
        event.stopPropagation();
        input.focus();
        input.select();
      }
    }, true);
    show();
  }

  if (document.readyState === "loading") {
    document.addEventListener("DOMContentLoaded", start);
  } else {
    start();
  }
})();
