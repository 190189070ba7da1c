/* Permittivity against temperature of a few substances in one figure, from values that the build
   has worked out. Lines differ in pattern and mark as well as in colour, and each carries its name. */
(() => {
  "use strict";

  const { make } = handbook;
  const [WIDTH, HEIGHT] = [760, 380];
  const [LEFT, RIGHT, TOP, BOTTOM] = [52, 150, 14, 44];

  const svg = (tag, attributes = {}, ...content) => {
    const made = document.createElementNS("http://www.w3.org/2000/svg", tag);
    Object.entries(attributes).forEach(([name, value]) => made.setAttribute(name, value));
    made.append(...content);
    return made;
  };

  /* "20:80.1 x25:78.4" → [{at, value, sure}] */
  const points = (text) => text.split(" ").filter(Boolean).map((part) => {
    const [at, value] = part.replace("x", "").split(":").map(Number);
    return { at, value, sure: !part.startsWith("x") };
  });

  /* A step of 1, 2 or 5 times a power of ten that gives about `count` of them. */
  const step = (span, count) => {
    const rough = span / count;
    const power = 10 ** Math.floor(Math.log10(rough));
    return power * ([1, 2, 5].find((factor) => factor * power >= rough) ?? 10);
  };

  const axis = (low, high, count) => {
    const by = step(high - low || 1, count);
    const first = Math.floor(low / by) * by;
    const last = Math.ceil(high / by) * by;
    const ticks = Array.from({ length: Math.round((last - first) / by) + 1 }, (_, i) => first + i * by);
    const digits = Math.max(0, -Math.floor(Math.log10(by)));
    return { first, last, ticks, label: (tick) => tick.toFixed(digits).replace("-", "−") };
  };

  /* Pieces of a curve that belong together: sure or not, and no further apart than two steps. */
  const pieces = (curve) => {
    const made = [];
    curve.forEach((point, i) => {
      const before = curve[i - 1];
      if (!before || point.at - before.at > 10.5) { return; }
      const sure = point.sure && before.sure;
      const last = made.at(-1);
      if (last && last.sure === sure && last.points.at(-1) === before) {
        last.points.push(point);
      } else {
        made.push({ sure, points: [before, point] });
      }
    });
    return made;
  };

  const mark = (kind, x, y) => [
    () => svg("circle", { cx: x, cy: y, r: 3.6 }),
    () => svg("rect", { x: x - 3.3, y: y - 3.3, width: 6.6, height: 6.6 }),
    () => svg("path", { d: `M${x} ${y - 4.4}l4.2 7.6h-8.4z` }),
    () => svg("path", { d: `M${x} ${y - 4.8}l4.6 4.8l-4.6 4.8l-4.6-4.8z` }),
    () => svg("path", { d: `M${x} ${y + 4.4}l4.2-7.6h-8.4z` }),
  ][kind]();

  /* Names at the right, moved apart where lines end close together. */
  const spread = (ends) => {
    const sorted = [...ends].sort((a, b) => a.y - b.y);
    sorted.forEach((end, i) => { if (i) { end.y = Math.max(end.y, sorted[i - 1].y + 14); } });
    const over = (sorted.at(-1)?.y ?? 0) - (HEIGHT - BOTTOM);
    if (over > 0) { sorted.forEach((end) => { end.y -= over; }); }
    return ends;
  };

  const words = (solvents, curves) => solvents.map(({ n }, i) => {
    const curve = curves[i];
    if (!curve.length) { return `${n}: not known`; }
    const at = ({ at: t, value }) => `${value} at ${String(t).replace("-", "−")} °C`;
    return curve.length === 1 ? `${n} ${at(curve[0])}` : `${n} from ${at(curve[0])} to ${at(curve.at(-1))}`;
  }).join("; ");

  const draw = (solvents, curves) => {
    const all = curves.flat();
    const across = axis(Math.min(...all.map((p) => p.at)), Math.max(...all.map((p) => p.at)), 7);
    const upwards = axis(Math.min(...all.map((p) => p.value)), Math.max(...all.map((p) => p.value)), 6);
    const x = (at) => LEFT + ((at - across.first) / (across.last - across.first)) * (WIDTH - LEFT - RIGHT);
    const y = (value) => HEIGHT - BOTTOM
      - ((value - upwards.first) / (upwards.last - upwards.first)) * (HEIGHT - TOP - BOTTOM);
    const grid = [
      ...across.ticks.flatMap((tick) => [
        svg("line", { class: "grid", x1: x(tick), x2: x(tick), y1: TOP, y2: HEIGHT - BOTTOM }),
        svg("text", { class: "tick tick-x", x: x(tick), y: HEIGHT - BOTTOM + 18 }, across.label(tick)),
      ]),
      ...upwards.ticks.flatMap((tick) => [
        svg("line", { class: "grid", x1: LEFT, x2: WIDTH - RIGHT, y1: y(tick), y2: y(tick) }),
        svg("text", { class: "tick tick-y", x: LEFT - 8, y: y(tick) + 4 }, upwards.label(tick)),
      ]),
      svg("text", { class: "axis-title", x: (LEFT + WIDTH - RIGHT) / 2, y: HEIGHT - 6 }, "Temperature / °C"),
      svg("text", { class: "axis-title", transform: `translate(14 ${(HEIGHT - BOTTOM + TOP) / 2}) rotate(-90)` },
        "Relative permittivity ε"),
    ];
    const ends = spread(curves.flatMap((curve, i) => (curve.length
      ? [{ i, x: x(curve.at(-1).at), y: y(curve.at(-1).value) }] : [])));
    const lines = curves.map((curve, i) => svg("g", { class: `curve line-${i + 1}` },
      ...pieces(curve).map(({ sure, points: list }) => svg("polyline", {
        class: sure ? "sure" : "unsure",
        points: list.map((p) => `${x(p.at).toFixed(1)},${y(p.value).toFixed(1)}`).join(" "),
      })),
      /* A mark about every twenty degrees tells lines apart without colour. */
      ...curve.filter((p, k) => p.at % 20 === 0 || k === 0 || k === curve.length - 1)
        .map((p) => mark(i, x(p.at), y(p.value)))));
    const names = ends.map((end) => svg("text", { class: `name line-${end.i + 1}`, x: end.x + 9, y: end.y + 4 },
      solvents[end.i].n));
    return svg("svg", {
      class: "curves", viewBox: `0 0 ${WIDTH} ${HEIGHT}`, role: "img",
      "aria-label": `Relative permittivity against temperature. ${words(solvents, curves)}.`,
    }, ...grid, ...lines, ...names);
  };

  /* The figure with its caption; nothing where no curve is known. */
  window.handbook.curves = (solvents) => {
    const curves = solvents.map(({ curve }) => points(curve));
    if (!curves.some((curve) => curve.length)) {
      return [make("p", {}, "No permittivity is known of these.")];
    }
    const missing = solvents.filter((_, i) => !curves[i].length).map(({ n }) => n);
    const caption = ["The handbook's own values every five degrees, as on the datasheets. Broken: "
      + "extrapolated, carried over from another temperature, or estimated."];
    if (missing.length) { caption.push(` Not known: ${missing.join(", ")}.`); }
    return [draw(solvents, curves), make("figcaption", {}, ...caption)];
  };
})();
