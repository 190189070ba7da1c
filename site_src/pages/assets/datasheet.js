/* The permittivity at a temperature of the reader's choice. Every number is one the generator has
   worked out; this only shows the one that was asked for. */
(() => {
  "use strict";

  const form = document.getElementById("at-any");
  if (!form) { return; }
  const { t, v, u, b, m, bases, marks } = JSON.parse(form.querySelector("script").textContent);
  const degrees = t.map((text) => Number(handbook.plain(text)));
  const field = document.getElementById("at-field");
  const slider = document.getElementById("at-slider");
  const value = document.getElementById("at-value");
  const last = degrees.length - 1;

  const nearest = (wanted) => degrees.reduce((best, degree, i) =>
    (Math.abs(degree - wanted) < Math.abs(degrees[best] - wanted) ? i : best), 0);

  const say = (i, note = "") => {
    const { make } = handbook;
    const flags = Array.from(m[i], (letter) => make("span", { class: "flag" }, marks[letter]));
    value.replaceChildren(
      make("b", {}, v[i]),
      ...(u[i] ? [make("span", { class: "pm" }, ` ± ${u[i]}`)] : []),
      ` at ${t[i]} °C `,
      make("span", { class: "quiet" }, bases[b[i]]), " ", ...flags,
      ...(note ? [" ", make("span", { class: "at-note" }, note)] : []),
    );
    slider.value = i;
    slider.setAttribute("aria-valuetext", `${t[i]} °C, permittivity ${v[i]}`);
  };

  const outside = (wanted) => {
    value.replaceChildren(handbook.make("span", { class: "at-note" },
      `Nothing is known at ${wanted} °C. Values go from ${t[0]} to ${t[last]} °C.`));
  };

  slider.min = 0;
  slider.max = last;
  slider.addEventListener("input", () => {
    field.value = degrees[slider.value];
    say(Number(slider.value));
  });
  field.addEventListener("input", () => {
    const wanted = field.valueAsNumber;
    if (Number.isNaN(wanted)) { return; }
    if (wanted < degrees[0] || wanted > degrees[last]) { outside(field.value); return; }
    const i = nearest(wanted);
    say(i, Math.abs(degrees[i] - wanted) > 1e-6 ? "the nearest step" : "");
  });
  form.addEventListener("submit", (event) => event.preventDefault());

  form.hidden = false;
  field.min = degrees[0];
  field.max = degrees[last];
  const start = nearest(Number(form.dataset.start));
  field.value = degrees[start];
  say(start);
})();
