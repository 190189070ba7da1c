/* Two to five substances side by side. The numbers come from handbook-data.js, which the build
   writes; what is worked out here is only the difference of two numbers that both stand on the page.
   The choice stands behind the # of the address: #acetone+water. */
(() => {
  "use strict";

  const data = window.handbookData;
  const { make, copies, plain, csv, tabbed, download, finder } = handbook;
  const find = (id) => document.getElementById(id);
  const bySlug = new Map(data.solvents.map((solvent) => [solvent.slug, solvent]));
  const items = data.solvents.map(finder.prepare);
  /* `own`: a word of each that nobody expects to be the same. */
  const WORDS = [
    { name: "Family" }, { name: "Is it polar?" }, { name: "ε on warming" },
    { name: "Liquid", own: true }, { name: "Values at" },
  ];
  /* Further apart than this many combined standard uncertainties: a difference (95 %). */
  const COVERAGE = 2;
  const [input, found, status, only] =
    ["compare-input", "compare-found", "compare-status", "compare-only"].map(find);

  const chosen = () => [...new Set(decodeURIComponent(location.hash.slice(1)).split("+"))]
    .filter((slug) => bySlug.has(slug)).slice(0, data.most);

  const choose = (slugs) => {
    history.replaceState(null, "", slugs.length ? `#${slugs.join("+")}` : location.pathname);
    show();
  };

  /* ---- numbers ---- */

  const cell = (text) => {
    const [value = "", spread = "", marks = ""] = text.split("|");
    return { value, spread, marks, number: Number(plain(value)), own: Number(plain(spread)) };
  };

  const decimals = (text) => (plain(text).split("e")[0].split(".")[1] ?? "").length;

  /* A difference to the decimals that both numbers show. */
  const difference = (a, b) => {
    const gap = Math.abs(a.number - b.number);
    if (a.value.includes("×") || b.value.includes("×")) {
      const ratio = Math.max(a.number, b.number) / Math.min(a.number, b.number);
      return Number.isFinite(ratio) ? `× ${ratio.toPrecision(2)}` : "";
    }
    return gap.toFixed(Math.min(decimals(a.value), decimals(b.value)));
  };

  /* How a number stands to the first one: a sign and a word, never a colour alone. */
  const verdict = (first, other) => {
    if (!first.value || !other.value) { return null; }
    const gap = other.number - first.number;
    const spread = Math.hypot(first.own, other.own);
    if (Math.abs(gap) <= COVERAGE * spread || gap === 0) {
      return { kind: "same", text: gap === 0 ? "= equal" : "≈ within uncertainty" };
    }
    const up = gap > 0;
    return {
      kind: up ? "up" : "down",
      text: `${up ? "▲ higher" : "▼ lower"} by ${difference(first, other)}`.replace("by ×", "by a factor of"),
    };
  };

  /* ---- the table ---- */

  const symbol = (text) => {
    const [head, index = ""] = text.split("_");
    const [, low, rest] = index.match(/^([^(]*)(.*)$/);
    return make("i", { class: "symbol" }, head, ...(low ? [make("sub", {}, low)] : []), rest);
  };

  const rowsOf = (solvents) => {
    const words = WORDS.map((row, i) => ({ ...row, words: solvents.map((s) => s.words[i]) }));
    let place = 0;
    const groups = data.groups.map(({ title, rows }) => ({
      title,
      rows: rows.map((row) => {
        const cells = solvents.map((s) => cell(s.values[place]));
        place += 1;
        return { ...row, cells };
      }),
    }));
    const listed = data.listed.map((at, i) =>
      ({ name: `ε at ${at}`, unit: "", cells: solvents.map((s) => cell(s.listed[i])) }));
    return [
      { title: "", rows: words },
      ...groups,
      { title: "Relative permittivity by temperature", rows: listed },
    ].map(({ title, rows }) => ({ title, rows: rows.filter(known).map(judged).filter(wanted) }))
      .filter(({ rows }) => rows.length);
  };

  const known = (row) => row.words || row.cells.some(({ value }) => value);

  const judged = (row) => {
    const verdicts = row.words
      ? row.words.map((word) => (word === row.words[0] || row.own ? null : { kind: "other", text: "≠ differs" }))
      : row.cells.map((one, i) => (i ? verdict(row.cells[0], one) : null));
    return { ...row, verdicts, differs: verdicts.some((v) => v && v.kind !== "same") };
  };

  const wanted = (row) => !only.checked || row.differs;

  const shownCell = (row, i) => {
    const mark = row.verdicts[i];
    const note = mark ? [make("span", { class: `diff diff-${mark.kind}` }, mark.text)] : [];
    if (row.words) { return make("td", {}, row.words[i], ...note); }
    const { value, spread, marks } = row.cells[i];
    if (!value) { return make("td", { class: "none" }, "–"); }
    return make("td", {}, value,
      ...(marks ? [make("sup", { class: "mark" }, marks)] : []),
      ...(spread ? [make("span", { class: "u" }, ` ± ${spread}`)] : []), ...note);
  };

  const head = (solvents) => make("thead", {}, make("tr", {},
    make("th", { scope: "col", class: "corner" }, "Quantity"),
    ...solvents.map((solvent, i) => {
      const slugs = solvents.map(({ slug }) => slug);
      const button = (word, act) => {
        const made = make("button", {
          type: "button", class: "plain", "aria-label": `${word}: ${solvent.n}`,
        }, word);
        made.addEventListener("click", act);
        return made;
      };
      const rest = slugs.filter((slug) => slug !== solvent.slug);
      return make("th", { scope: "col" },
        make("span", { class: `key-line line-${i + 1}`, "aria-hidden": "true" }),
        make("a", { href: `solvents/${solvent.slug}.html` }, solvent.n),
        make("span", { class: "cas" }, solvent.c), finder.formula(solvent.f),
        make("span", { class: "column-deeds" },
          i ? button("Compare to this", () => choose([solvent.slug, ...rest]))
            : make("span", { class: "quiet" }, "others against this"),
          button("Remove", () => choose(rest))));
    })));

  const bodies = (groups, count) => groups.map(({ title, rows }) => make("tbody", {},
    ...(title ? [make("tr", { class: "group" },
      make("th", { scope: "rowgroup", colspan: count + 1 }, make("span", {}, title)))] : []),
    ...rows.map((row) => make("tr", {},
      make("th", { scope: "row" },
        row.href ? make("a", { href: row.href }, row.name) : row.name,
        ...(row.symbol ? [" ", symbol(row.symbol)] : []),
        ...(row.unit ? [make("span", { class: "unit" }, ` / ${row.unit}`)] : [])),
      ...entries(row).map((_, i) => shownCell(row, i))))));

  const entries = (row) => row.words ?? row.cells;

  const legend = (groups) => {
    const used = new Set(groups.flatMap(({ rows }) => rows.flatMap((row) =>
      (row.cells ?? []).flatMap(({ marks }) => [...marks]))));
    return [
      make("span", {}, "± standard uncertainty (k = 1)"),
      make("span", {}, `A difference counts from ${COVERAGE} combined standard uncertainties on`),
      ...Object.entries(data.marks).filter(([letter]) => used.has(letter)).map(([letter, text]) =>
        make("span", {}, make("sup", { class: "mark" }, letter), ` ${text}`)),
    ];
  };

  /* What is shown, in rows of text. */
  const content = () => {
    const shown = chosen().map((slug) => bySlug.get(slug));
    const top = ["Quantity", "Unit", ...shown.flatMap(({ n, c }) => [`${n} (${c})`, "±", "marks", "difference"])];
    const rows = rowsOf(shown).flatMap(({ rows: list }) => list.map((row) => [
      [row.name, row.words ? "" : row.symbol].filter(Boolean).join(" "), row.unit ?? "",
      ...entries(row).flatMap((one, i) => [
        ...(row.words ? [one, "", ""] : [plain(one.value), plain(one.spread), one.marks]),
        row.verdicts[i]?.text ?? "",
      ]),
    ]));
    return [top, ...rows];
  };

  /* ---- the page ---- */

  const show = () => {
    const shown = chosen().map((slug) => bySlug.get(slug));
    const groups = rowsOf(shown);
    find("compare-result").hidden = shown.length === 0;
    find("compare-table").replaceChildren(head(shown), ...bodies(groups, shown.length));
    find("compare-legend").replaceChildren(...legend(groups));
    find("compare-figure").replaceChildren(...handbook.curves(shown));
    const room = data.most - shown.length;
    input.disabled = room === 0;
    status.textContent = shown.length === 0 ? "Choose two, to begin with."
      : room === 0 ? `${data.most} is the most. Remove one to add another.`
        : shown.length === 1 ? "One chosen. Add another to compare it with."
          : `${shown.length} side by side; room for ${room} more.`;
  };

  const add = (solvent) => {
    input.value = "";
    found.replaceChildren();
    choose([...chosen(), solvent.slug]);
    input.focus();
  };

  const offer = () => {
    const taken = chosen();
    const hits = input.value.trim()
      ? finder.search(items, input.value, ({ slug }) => !taken.includes(slug)).slice(0, 8) : [];
    found.replaceChildren(...hits.map((solvent) => {
      const button = make("button", { type: "button", "data-hit": true },
        make("b", {}, solvent.n), ...finder.alias(solvent, input.value),
        make("span", { class: "cas" }, solvent.c), finder.formula(solvent.f));
      button.addEventListener("click", () => add(solvent));
      return make("li", {}, button);
    }));
    if (input.value.trim() && !hits.length) { status.textContent = "Nothing in the handbook matches."; }
  };

  input.addEventListener("input", offer);
  finder.keys(input, found, () => { input.value = ""; offer(); });
  only.addEventListener("change", show);
  copies(find("compare-copy"), () => tabbed(content()));
  find("compare-csv").addEventListener("click", () =>
    download(`${chosen().join("-")}.csv`, csv(content())));
  find("compare-print").addEventListener("click", () => print());
  addEventListener("hashchange", show);
  find("compare-picker").hidden = false;
  show();
})();
