/* Tables that are sorted, filtered, cut to columns, copied and printed as they are shown.
   The plain table in the page is the only source; rows beyond the first hundred and fifty are taken
   out of the page until somebody scrolls there or prints, because laying them out is what costs.
   What is chosen stands behind the # of the address, so that it can be sent. */
(() => {
  "use strict";

  const { make, tray, copies, plain, csv, tabbed, download, choices, setChoices } = handbook;
  const STEP = 150;
  const order = new Intl.Collator("en", { numeric: true });

  class Sheet {
    constructor(table) {
      this.table = table;
      this.body = table.tBodies[0];
      this.scroller = table.closest(".table-scroll");
      this.tools = document.querySelector(`.table-tools[data-for="${table.id}"]`);
      this.columns = Array.from(table.tHead.rows[0].cells, (head, index) => ({
        head, index,
        key: head.dataset.key ?? String(index),
        numeric: head.dataset.sort === "number",
        sortable: Boolean(head.dataset.sort),
        title: (head.querySelector(".head") ?? head).textContent.trim(),
        unit: head.querySelector(".unit")?.textContent.trim() ?? "",
        shown: true, low: null, high: null, only: "",
      }));
      this.rows = Array.from(this.body.rows);
      this.original = this.rows;
      this.keys = new Map();
      this.sorting = null;
      this.shown = this.rows;
      this.columns.filter((column) => column.sortable).forEach((column) => this.sortButton(column));
      this.scroller.addEventListener("scroll", () => this.more(), { passive: true });
      addEventListener("beforeprint", () => this.render(Infinity));
      addEventListener("afterprint", () => this.render(this.step));
      /* Other tables are shorter, and lead to their rows by the address. */
      this.choosable = table.classList.contains("long");
      this.step = this.choosable ? STEP : Infinity;
      this.limit = this.step;
      if (this.tools) { this.setUpTools(); }
      if (this.choosable) {
        this.fromAddress();
        addEventListener("hashchange", () => this.fromAddress());
        table.classList.add("ready");
      }
    }

    /* ---- reading ---- */

    key(row, column) {
      const cell = row.cells[column.index];
      if (!column.numeric) { return cell.textContent.trim(); }
      return cell.dataset.v ? Number(cell.dataset.v) : NaN;
    }

    keysOf(column) {
      if (!this.keys.has(column)) {
        this.keys.set(column, new Map(this.original.map((row) => [row, this.key(row, column)])));
      }
      return this.keys.get(column);
    }

    /* What the text filter looks at: substance, CAS, family; in a list, every column. */
    texts() {
      if (!this.found) {
        const columns = this.columns.filter((c) => !c.numeric && (c.index < 3 || !this.choosable));
        this.found = new Map(this.original.map((row) =>
          [row, columns.map((c) => this.key(row, c)).join(" ").toLowerCase()]));
      }
      return this.found;
    }

    /* ---- showing ---- */

    apply() {
      const wanted = this.query.toLowerCase();
      const bare = wanted.replaceAll("-", "");
      const tests = [];
      if (wanted) {
        const texts = this.texts();
        tests.push((row) => {
          const text = texts.get(row);
          return text.includes(wanted) || text.replaceAll("-", "").includes(bare);
        });
      }
      for (const column of this.columns) {
        const { low, high, only } = column;
        if (low === null && high === null && !only) { continue; }
        const keys = this.keysOf(column);
        tests.push(column.numeric
          ? (row) => keys.get(row) >= (low ?? -Infinity) && keys.get(row) <= (high ?? Infinity)
          : (row) => keys.get(row) === only);
      }
      this.shown = this.rows.filter((row) => tests.every((test) => test(row)));
      this.render(this.step);
      this.say();
    }

    sort() {
      this.columns.forEach(({ head }) => head.removeAttribute("aria-sort"));
      if (!this.sorting) {
        this.rows = this.original;
        return;
      }
      const { column, down } = this.sorting;
      const keys = this.keysOf(column);
      const none = (key) => (column.numeric ? Number.isNaN(key) : key === "");
      const compare = column.numeric ? (a, b) => a - b : order.compare;
      /* Empty places stay at the end whichever way the column is sorted. */
      this.rows = [...this.original].sort((one, other) => {
        const [a, b] = [keys.get(one), keys.get(other)];
        return none(a) - none(b) || (none(a) ? 0 : (down ? -1 : 1) * compare(a, b));
      });
      column.head.setAttribute("aria-sort", down ? "descending" : "ascending");
    }

    render(limit) {
      this.limit = limit;
      const rows = this.shown.slice(0, limit);
      rows.forEach((row) => this.prepare(row));
      this.body.replaceChildren(...rows);
      this.scroller.scrollTop = 0;
      if (this.rest) {
        const left = this.shown.length - rows.length;
        this.rest.hidden = left <= 0;
        this.rest.textContent = `Show all ${this.shown.length} rows`;
      }
    }

    more() {
      const { scrollTop, clientHeight, scrollHeight } = this.scroller;
      if (this.limit >= this.shown.length || scrollTop + 2 * clientHeight < scrollHeight) { return; }
      const next = this.shown.slice(this.limit, this.limit + this.step);
      next.forEach((row) => this.prepare(row));
      this.body.append(...next);
      this.limit += this.step;
      if (this.rest) { this.rest.hidden = this.limit >= this.shown.length; }
    }

    say() {
      if (!this.count) { return; }
      const { length } = this.original;
      const all = this.shown.length === length;
      this.count.textContent = `${all ? "" : `${this.shown.length} of `}${length} ${this.noun}`;
      if (this.paper) {
        const parts = [this.count.textContent];
        if (this.query) { parts.push(`with “${this.query}”`); }
        for (const { title, unit, low, high, only } of this.columns) {
          if (only) { parts.push(`${title}: ${only}`); }
          if (low !== null || high !== null) {
            parts.push(`${title} ${unit} from ${low ?? "…"} to ${high ?? "…"}`);
          }
        }
        if (this.sorting) { parts.push(`sorted by ${this.sorting.column.title}`); }
        this.paper.textContent = `Shown: ${parts.join("; ")}.`;
      }
    }

    hideColumns() {
      const gone = this.columns.filter((column) => !column.shown);
      const rules = gone.map(({ index }) =>
        `#${this.table.id} tr > :nth-child(${index + 1}) { display: none; }`);
      this.style ??= new CSSStyleSheet();
      if (!document.adoptedStyleSheets.includes(this.style)) {
        document.adoptedStyleSheets = [...document.adoptedStyleSheets, this.style];
      }
      this.style.replaceSync(rules.join("\n"));
    }

    /* ---- choosing ---- */

    sortButton(column) {
      const button = make("button", { type: "button", class: "sort" }, ...column.head.childNodes);
      column.head.append(button);
      button.addEventListener("click", () => {
        const same = this.sorting?.column === column;
        this.sorting = { column, down: same && !this.sorting.down };
        this.sort();
        this.apply();
        this.toAddress();
      });
    }

    setUpTools() {
      const find = (name) => this.tools.querySelector(name);
      this.filter = find(".table-filter");
      this.count = find(".table-count");
      this.noun = this.count.textContent.replace(/^\d+ /, "");
      this.paper = this.tools.parentNode.querySelector(".table-shown");
      this.uncertainty = find(".table-uncertainty");
      this.filter.addEventListener("input", () => { this.apply(); this.toAddress(); });
      this.uncertainty?.addEventListener("change", () => {
        this.showUncertainty();
        this.toAddress();
      });
      this.rest = make("button", { type: "button", class: "plain rest", hidden: true });
      this.rest.addEventListener("click", () => this.render(Infinity));
      this.scroller.after(this.rest);
      if (this.choosable) {
        this.setUpChoice(find(".table-choice-panel"));
        copies(find(".table-copy"), () => tabbed(this.content()));
        find(".table-csv").addEventListener("click", () =>
          download(`${this.table.id.replace(/^table-/, "")}.csv`, csv(this.content())));
        find(".table-print").addEventListener("click", () => print());
        find(".table-reset").addEventListener("click", () => {
          setChoices(new URLSearchParams());
          this.fromAddress();
        });
      }
      const holder = find(".tray");
      if (holder) { this.box = tray(holder); }
      this.tools.hidden = false;
    }

    setUpChoice(panel) {
      for (const column of this.columns.slice(1)) {
        const name = [column.title, column.unit && `(${column.unit})`].filter(Boolean).join(" ");
        const box = make("input", { type: "checkbox", checked: true });
        const parts = [make("label", { class: "check" }, box, ` ${name}`)];
        box.addEventListener("change", () => {
          column.shown = box.checked;
          this.hideColumns();
          this.toAddress();
        });
        column.box = box;
        if (column.numeric) {
          const end = (which, word) => {
            const field = make("input", {
              type: "number", step: "any", inputmode: "decimal", placeholder: word,
              "aria-label": `${column.title}, ${word}`,
            });
            field.addEventListener("input", () => {
              column[which] = Number.isNaN(field.valueAsNumber) ? null : field.valueAsNumber;
              this.apply();
              this.toAddress();
            });
            return field;
          };
          column.fields = { low: end("low", "from"), high: end("high", "to") };
          parts.push(make("span", { class: "range" }, column.fields.low, " ", column.fields.high));
        } else if (column.sortable && column.key !== "cas") {
          const values = [...new Set(this.original.map((row) => this.key(row, column)))];
          const select = make("select", { "aria-label": `${column.title}, only` },
            make("option", { value: "" }, "all"),
            ...values.filter(Boolean).sort(order.compare).map((value) => make("option", {}, value)));
          select.addEventListener("change", () => {
            column.only = select.value;
            this.apply();
            this.toAddress();
          });
          column.select = select;
          parts.push(select);
        }
        panel.append(make("div", { class: "table-choice-row" }, ...parts));
      }
    }

    showUncertainty() {
      this.table.classList.toggle("without-u", !this.uncertainty.checked);
    }

    /* A box before each name, made when the row is first shown. */
    prepare(row) {
      if (!this.box || row.dataset.ready) { return; }
      row.dataset.ready = "yes";
      const link = row.cells[0].querySelector("a");
      link.before(this.box(link.getAttribute("href"), link.textContent));
    }

    /* ---- taking away ---- */

    /* What is shown, in rows of text; a number takes a column each for value, uncertainty, marks. */
    content() {
      const columns = this.columns.filter((column) => column.shown
        && (column.index === 0 || column.sortable));
      const withU = this.uncertainty?.checked;
      const head = columns.flatMap(({ title, unit, numeric }) => {
        const name = unit ? `${title} (${unit})` : title;
        return numeric ? [name, ...(withU ? [`${title} ±`] : []), `${title} marks`] : [name];
      });
      const rows = this.shown.map((row) => columns.flatMap(({ index, numeric }) => {
        const cell = row.cells[index];
        if (!numeric) { return [(index === 0 ? cell.querySelector("a") ?? cell : cell).textContent.trim()]; }
        const part = (name) => plain(cell.querySelector(name)?.textContent ?? "");
        const value = cell.dataset.v ? plain(cell.firstChild.textContent) : "";
        return [value, ...(withU ? [part("small").replace(/^±\s*/u, "")] : []), part("sup")];
      }));
      return [head, ...rows];
    }

    /* ---- the address ---- */

    toAddress() {
      if (!this.choosable) { return; }
      const chosen = new URLSearchParams();
      if (this.query) { chosen.set("q", this.query); }
      if (this.sorting) {
        chosen.set("sort", (this.sorting.down ? "-" : "") + this.sorting.column.key);
      }
      const hidden = this.columns.filter((column) => !column.shown).map(({ key }) => key);
      if (hidden.length) { chosen.set("hide", hidden.join(" ")); }
      if (this.uncertainty && !this.uncertainty.checked) { chosen.set("u", "0"); }
      for (const { key, low, high, only } of this.columns) {
        if (only) { chosen.set(key, only); }
        if (low !== null || high !== null) { chosen.set(key, `${low ?? ""}..${high ?? ""}`); }
      }
      setChoices(chosen);
    }

    fromAddress() {
      const chosen = choices();
      const hidden = (chosen.get("hide") ?? "").split(" ");
      for (const column of this.columns) {
        const given = chosen.get(column.key) ?? "";
        const [low, high] = (given.includes("..") ? given : "..").split("..");
        column.low = low ? Number(low) : null;
        column.high = high ? Number(high) : null;
        column.only = column.select && !given.includes("..") ? given : "";
        column.shown = !hidden.includes(column.key);
        if (column.box) { column.box.checked = column.shown; }
        if (column.fields) {
          column.fields.low.value = low;
          column.fields.high.value = high;
        }
        if (column.select) { column.select.value = column.only; }
      }
      const sort = chosen.get("sort") ?? "";
      const column = this.columns.find(({ key }) => key === sort.replace(/^-/, ""));
      this.sorting = column?.sortable ? { column, down: sort.startsWith("-") } : null;
      if (this.filter) { this.filter.value = chosen.get("q") ?? ""; }
      if (this.uncertainty) {
        this.uncertainty.checked = chosen.get("u") !== "0";
        this.showUncertainty();
      }
      if (this.columns.some(({ shown }) => !shown) || this.style) { this.hideColumns(); }
      this.sort();
      this.apply();
    }

    get query() { return this.filter?.value.trim() ?? ""; }
  }

  document.querySelectorAll("table.sortable").forEach((table) => new Sheet(table));
})();
