/* On every page: copy buttons, what a mark means, the date of a print. Also the few helpers that
   the other scripts share, as `handbook`. Nothing is requested. */
(() => {
  "use strict";

  const make = (tag, attributes = {}, ...content) => {
    const made = document.createElement(tag);
    for (const [name, value] of Object.entries(attributes)) {
      if (value !== false && value != null) { made.setAttribute(name, value === true ? "" : value); }
    }
    made.append(...content);
    return made;
  };

  /* A page opened over plain http has no clipboard; a selected text field does. */
  const copy = async (text) => {
    if (navigator.clipboard) {
      await navigator.clipboard.writeText(text);
      return;
    }
    const before = document.activeElement;
    const field = make("textarea", { class: "off-screen", "aria-hidden": "true" });
    field.value = text;
    document.body.append(field);
    field.select();
    document.execCommand("copy");
    field.remove();
    before?.focus();
  };

  /* `text` may be a function, for what is worked out only when it is wanted. */
  const copies = (button, text) => {
    const label = button.textContent;
    button.addEventListener("click", async () => {
      let word = "Copied";
      try {
        await copy(typeof text === "function" ? text() : text);
      } catch {
        word = "Not allowed";
      }
      button.textContent = word;
      setTimeout(() => { button.textContent = label; }, 1500);
    });
  };

  /* Numbers for other programs: a plain minus sign, powers of ten as they type them. */
  const RAISED = "⁻⁰¹²³⁴⁵⁶⁷⁸⁹";
  const plain = (text) => text
    .replace(/×10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)/g, (_, power) =>
      `e${Array.from(power, (digit) => "-0123456789"[RAISED.indexOf(digit)]).join("")}`)
    .replace(/−(?=\d)/g, "-");
  const quoted = (text) => (/[",\n]/.test(text) ? `"${text.replaceAll('"', '""')}"` : text);
  const csv = (rows) => rows.map((row) => row.map(quoted).join(",")).join("\n") + "\n";
  const tabbed = (rows) => rows.map((row) => row.join("\t")).join("\n") + "\n";

  const download = (name, text) => {
    const address = URL.createObjectURL(new Blob([text], { type: "text/csv;charset=utf-8" }));
    make("a", { href: address, download: name }).click();
    setTimeout(() => URL.revokeObjectURL(address), 10_000);
  };

  /* What follows the # as a list of choices, and back. */
  const choices = () => new URLSearchParams(location.hash.slice(1));
  const setChoices = (chosen) => {
    const text = chosen.toString();
    history.replaceState(null, "", text ? `#${text}` : location.pathname + location.search);
  };

  /* Boxes by which substances are chosen to stand side by side, and the way there. */
  const tray = (holder) => {
    const picked = new Map();
    const most = Number(holder.dataset.most);
    const show = () => {
      const { size } = picked;
      holder.hidden = size === 0;
      const end = size < 2 ? make("span", { class: "quiet" }, "Choose one more.")
        : size > most ? make("span", { class: "quiet" }, `${most} at most.`)
          : make("a", { href: `${holder.dataset.compare}#${[...picked.keys()].join("+")}` },
            `Compare these ${size}`);
      holder.replaceChildren(`Side by side: ${[...picked.values()].join(", ")}. `, end);
    };
    return (address, name) => {
      const slug = address.replace(/^.*\/|\.html$/g, "");
      const box = make("input", {
        type: "checkbox", class: "pick", "aria-label": `Side by side: ${name}`,
      });
      box.checked = picked.has(slug);
      box.addEventListener("change", () => {
        if (box.checked) { picked.set(slug, name); } else { picked.delete(slug); }
        show();
      });
      return box;
    };
  };

  window.handbook = { make, tray, copies, plain, csv, tabbed, download, choices, setChoices };

  const copyButton = (holder) => {
    const text = holder.dataset.copy || holder.textContent;
    const label = holder.dataset.copyLabel ?? "Copy";
    const button = make("button", {
      type: "button", class: "copy-button",
      "aria-label": holder.dataset.copyLabel ? null : `Copy ${text}`, title: text,
    }, label);
    copies(button, text);
    if (holder.dataset.copyLabel) { holder.append(button); } else { holder.after(button); }
  };

  /* The legend says what a mark means; so does the mark itself, for who points at it. */
  const explainMarks = () => {
    const meanings = new Map(Array.from(document.querySelectorAll(".legend sup.mark"), (mark) =>
      [mark.textContent, mark.parentNode.textContent.trim().replace(/^\S+\s+/, "")]));
    document.addEventListener("pointerover", ({ target }) => {
      if (target.matches?.("sup.mark") && !target.title) {
        target.title = Array.from(target.textContent, (letter) => meanings.get(letter) ?? letter)
          .join("\n");
      }
    });
  };

  const stamp = () => {
    const now = new Date();
    const date = [now.getFullYear(), now.getMonth() + 1, now.getDate()]
      .map((part) => String(part).padStart(2, "0")).join("-");
    document.querySelectorAll(".print-date").forEach((place) => { place.textContent = date; });
  };

  document.querySelectorAll("[data-copy]").forEach(copyButton);
  explainMarks();
  stamp();
  addEventListener("beforeprint", stamp);
})();
