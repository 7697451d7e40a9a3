// Maps: a value by colour over two axes; a click on a point shows its curves.

/** From low to high in one hue that grows lighter, told apart by everybody and in grey print; chosen for this page. */
const SHADES = [[20, 34, 76], [28, 72, 122], [30, 113, 142], [62, 152, 143], [124, 187, 138], [192, 217, 150], [250, 243, 188]];

const shade = (share) => {
  const at = Math.min(Math.max(share, 0), 1) * (SHADES.length - 1);
  const low = Math.min(Math.floor(at), SHADES.length - 2);
  const mixed = SHADES[low].map((v, i) => Math.round(v + (SHADES[low + 1][i] - v) * (at - low)));
  return `rgb(${mixed.join(",")})`;
};

/** Edges between neighbouring places: half way, or half way of the logarithms. */
const cellEdges = (places, log) => {
  const f = log ? Math.log : (v) => v;
  const back = log ? Math.exp : (v) => v;
  const at = places.map(f);
  if (at.length === 1) return [back(at[0] - 0.5), back(at[0] + 0.5)];
  const inner = at.slice(1).map((v, i) => (v + at[i]) / 2);
  return [at[0] - (inner[0] - at[0]), ...inner, at.at(-1) + (at.at(-1) - inner.at(-1))].map(back);
};

/** Pieces of the line along which a grid takes a value: pairs of points. */
const contour = (xs, ys, z, level) => {
  const pieces = [];
  const cross = (x1, y1, a, x2, y2, b) => {
    const share = (level - a) / (b - a);
    return [x1 + (x2 - x1) * share, y1 + (y2 - y1) * share];
  };
  for (let j = 0; j + 1 < ys.length; j += 1) {
    for (let i = 0; i + 1 < xs.length; i += 1) {
      const corners = [[xs[i], ys[j], z(i, j)], [xs[i + 1], ys[j], z(i + 1, j)], [xs[i + 1], ys[j + 1], z(i + 1, j + 1)], [xs[i], ys[j + 1], z(i, j + 1)]];
      if (!corners.every(([, , v]) => Number.isFinite(v))) continue;
      const cuts = [];
      for (let k = 0; k < 4; k += 1) {
        const [p, q] = [corners[k], corners[(k + 1) % 4]];
        if ((p[2] < level) !== (q[2] < level)) cuts.push(cross(...p, ...q));
      }
      for (let k = 0; k + 1 < cuts.length; k += 2) pieces.push([cuts[k], cuts[k + 1]]);
    }
  }
  return pieces;
};

/** `open(point)`: what happens when a person chooses a point. */
const mapFigure = (chart, columns, context) => {
  const map = chart.body.map;
  const [xs, ys, zs, errors] = [map.xs, map.ys, map.zs, map.errors].map((at) => columns[at]);
  const [xlog, ylog, zlog] = [map.x, map.y, map.z].map((axis) => axis.scale === "Log");
  const [low, high] = span([zs], zlog);
  const shareOf = (v) => (zlog ? (Math.log(v) - Math.log(low)) / (Math.log(high) - Math.log(low) || 1) : (v - low) / (high - low || 1));
  const sorted = (list) => [...new Set(list)].filter(Number.isFinite).sort((a, b) => a - b);
  const [ux, uy] = [sorted(xs), sorted(ys)];
  const at = new Map(Array.from(xs.keys(), (i) => [`${xs[i]}|${ys[i]}`, i]));
  const find = (i, j) => at.get(`${ux[i]}|${uy[j]}`);
  const words = (i) => {
    const value = Number.isFinite(zs[i]) ? amount(zs[i], map.z.unit) : "no value";
    const error = Number.isFinite(errors[i]) ? ` \u00b1 ${digits(errors[i])}` : "";
    return `${map.x.label} ${amount(xs[i], map.x.unit)}, ${map.y.label} ${amount(ys[i], map.y.unit)}: ${map.z.label} ${value}${error}`;
  };
  let chosen = null;
  const draw = (width, paper, tell) => {
    const colours = theme(paper);
    const [ex, ey] = [cellEdges(ux, xlog), cellEdges(uy, ylog)];
    const yTicks = ticksOf(ylog, ey[0], ey.at(-1), 6);
    const bar = ticksOf(zlog, low, high, 5);
    const left = roomFor(yTicks.labels);
    const barRoom = Math.max(...bar.labels.map((text) => textWidth(text, 12)), 20) + 42;
    const height = Math.round(Math.min(Math.max(width * 0.66, 250), 430));
    const box = { left, top: 12, width: width - left - barRoom - 18, height: height - 64 };
    const px = placer(xlog, ex[0], ex.at(-1), box.left, box.left + box.width);
    const py = placer(ylog, ey[0], ey.at(-1), box.top + box.height, box.top);
    const xTicks = ticksOf(xlog, ex[0], ex.at(-1), Math.max(Math.floor(box.width / 70), 2));
    const cells = [];
    const shapes = new Map();
    for (let j = 0; j < uy.length; j += 1) {
      for (let i = 0; i < ux.length; i += 1) {
        const point = find(i, j);
        if (point === undefined) continue;
        const good = Number.isFinite(zs[point]);
        const [x, y] = [px(ex[i]), py(ey[j + 1])];
        const first = shapes.size === 0;
        const cell = svg("rect", { x, y, width: Math.max(px(ex[i + 1]) - x, 0.5) + 0.4, height: Math.max(py(ey[j]) - y, 0.5) + 0.4,
          fill: good ? shade(shareOf(zs[point])) : "none", stroke: good ? null : colours.quiet, "stroke-dasharray": good ? null : "2 2",
          class: paper ? null : "cell", "data-point": paper ? null : point, tabindex: paper ? null : (chosen === null ? first : chosen === point) ? 0 : -1,
          role: paper ? null : "button", "aria-label": paper ? null : visible(words(point)),
          on: { pointerenter: () => tell(words(point)), pointerleave: () => tell(""), focus: () => tell(words(point)), click: () => choose(point),
            keydown: (event) => {
              const by = { ArrowLeft: [-1, 0], ArrowRight: [1, 0], ArrowDown: [0, -1], ArrowUp: [0, 1] }[event.key];
              if (by) {
                event.preventDefault();
                let [a, b] = [i + by[0], j + by[1]];
                while (a >= 0 && b >= 0 && a < ux.length && b < uy.length && find(a, b) === undefined) [a, b] = [a + by[0], b + by[1]];
                shapes.get(find(a, b))?.focus();
              } else if (event.key === "Enter" || event.key === " ") {
                event.preventDefault();
                choose(point);
              }
            } } }, svg("title", {}, words(point)));
        shapes.set(point, cell);
        cells.push(cell);
      }
    }
    const lines = [];
    if (map.grid) {
      for (const level of map.levels) {
        const pieces = contour(ux, uy, (i, j) => zs[find(i, j)] ?? NaN, level);
        if (pieces.length === 0) continue;
        const d = pieces.map(([a, b]) => `M${px(a[0]).toFixed(1)},${py(a[1]).toFixed(1)}L${px(b[0]).toFixed(1)},${py(b[1]).toFixed(1)}`).join("");
        lines.push(svg("path", { d, fill: "none", stroke: shareOf(level) > 0.55 ? "#00000088" : "#ffffffaa", "stroke-width": 1, "pointer-events": "none" }));
      }
    }
    const marks = [];
    const ring = (point, text) => {
      const [x, y] = [px(xs[point]), py(ys[point])];
      marks.push(svg("circle", { cx: x, cy: y, r: 6, fill: "none", stroke: "#ffffff", "stroke-width": 4, "pointer-events": "none" }),
        svg("circle", { cx: x, cy: y, r: 6, fill: "none", stroke: "#000000", "stroke-width": 1.5, "pointer-events": "none" }));
      if (text) {
        const end = x + 12 + textWidth(text, 11) > box.left + box.width;
        marks.push(label(end ? x - 11 : x + 11, y + 4, text, { "font-size": 11, "text-anchor": end ? "end" : "start", fill: "#000000", stroke: "#ffffff",
          "stroke-width": 3, "paint-order": "stroke", "pointer-events": "none" }));
      }
    };
    if (map.best !== null) ring(map.best, "best");
    if (chosen !== null && chosen !== map.best) ring(chosen, "");
    const barX = box.left + box.width + 16;
    const steps = Array.from({ length: 48 }, (_, k) => svg("rect", { x: barX, y: box.top + box.height * (1 - (k + 1) / 48), width: 13,
      height: box.height / 48 + 0.5, fill: shade((k + 0.5) / 48) }));
    const pz = placer(zlog, low, high, box.top + box.height, box.top);
    const barLabels = bar.ticks.map((tick, k) => label(barX + 18, pz(tick) + 4, bar.labels[k], { fill: colours.quiet }));
    const middle = box.top + box.height / 2;
    const barText = label(width - 6, middle, axisText(map.z, false), { "text-anchor": "middle", fill: colours.ink, transform: `rotate(-90 ${width - 6} ${middle})` });
    return drawing(width, height, `${chart.title} of ${context.name}`, paper ? svg("rect", { width, height, fill: colours.ground }) : null,
      ...frame(box, { ...xTicks, place: px, text: axisText(map.x, false) }, { ...yTicks, place: py, text: axisText(map.y, false) }, colours),
      svg("g", {}, cells), svg("g", {}, lines), svg("g", {}, marks), svg("g", {}, steps), barLabels, barText);
  };
  const choose = (point) => {
    chosen = point;
    made.repaint();
    made.element.querySelector(`[data-point="${point}"]`)?.focus();
    context.open?.(point);
  };
  const made = drawnFigure(chart, { ...context, draw });
  made.choose = choose;
  return made;
};
