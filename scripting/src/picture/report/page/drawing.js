// What all drawings share: colours by theme, dashes, a frame with axes as SVG, and files.

const FONT = 'system-ui, -apple-system, "Segoe UI", Roboto, "Helvetica Neue", "Liberation Sans", Arial, sans-serif';

/** Width of a drawing that is printed in one of two columns: its letters keep the size of the text around. */
const PRINTED = 400;

const PAPER = { ground: "#ffffff", ink: "#1b1d1f", quiet: "#5d636a", line: "#d9dce0", layer: "#f1f2f4", other: "#e4e6e9", lost: "#b9bec4" };
const NIGHT = { ground: "#15171a", ink: "#e8e6e1", quiet: "#a3a7ad", line: "#34383e", layer: "#1d2024", other: "#272b30", lost: "#565c64" };

const nightAsked = matchMedia("(prefers-color-scheme: dark)");

const isNight = () => {
  const chosen = document.documentElement.dataset.theme;
  return chosen ? chosen === "dark" : nightAsked.matches;
};

/** The colours of the page, or those of paper. */
const theme = (paper) => (paper || !isNight() ? PAPER : NIGHT);

let palette = { light: [], dark: [] };

/** The colour of a curve. */
const colourOf = (look, paper) => {
  if (look.colour === null || look.colour === undefined) return theme(paper).quiet;
  const colours = paper || !isNight() ? palette.light : palette.dark;
  return colours[look.colour % colours.length];
};

const DASHES = { Solid: [], Long: [9, 4], Short: [4, 3], Dotted: [1.5, 3], DashDot: [9, 3, 2, 3], DashDotDot: [9, 3, 2, 3, 2, 3] };

/** Width of a text in pixels, near enough to lay out by. */
const textWidth = (() => {
  const context = document.createElement("canvas").getContext("2d");
  return (text, size, weight) => {
    context.font = `${weight || 400} ${size}px ${FONT}`;
    return context.measureText(text).width;
  };
})();

/** A piece of text in a drawing. */
const label = (x, y, text, attributes) =>
  svg("text", { x: x.toFixed(2), y: y.toFixed(2), "font-size": 12, fill: "currentColor", ...attributes }, text);

/** The root of a drawing of this size. */
const drawing = (width, height, name, ...children) =>
  svg("svg", { xmlns: "http://www.w3.org/2000/svg", width, height, viewBox: `0 0 ${width} ${height}`, "font-family": FONT,
    role: "img", "aria-label": visible(name) }, ...children);

/** A text cut to fit, with dots at its end. */
const fitText = (text, width, size) => {
  if (textWidth(text, size) <= width) return text;
  let cut = text;
  while (cut.length > 1 && textWidth(`${cut}\u2026`, size) > width) cut = cut.slice(0, -1);
  return `${cut}\u2026`;
};

/** A drawing as a file of its own. */
const svgFile = (element) => {
  const copy = element.cloneNode(true);
  copy.removeAttribute("class");
  return `<?xml version="1.0" encoding="UTF-8"?>\n${new XMLSerializer().serializeToString(copy)}\n`;
};

/** From a number to its place between two pixels. */
const placer = (log, from, to, begin, end) => {
  const f = log ? Math.log10 : (v) => v;
  const low = f(from);
  const scale = (end - begin) / (f(to) - low || 1);
  return (value) => begin + (f(value) - low) * scale;
};

/** Axes around a panel: grid, ticks, labels, and the frame's lower and left lines. */
const frame = (box, xAxis, yAxis, colours) => {
  const parts = [];
  const { left, top, width, height } = box;
  for (const [i, tick] of xAxis.ticks.entries()) {
    const x = xAxis.place(tick);
    if (x < left - 0.5 || x > left + width + 0.5) continue;
    const text = xAxis.labels[i];
    parts.push(svg("line", { x1: x, x2: x, y1: top, y2: top + height, stroke: colours.line, "stroke-width": text ? 0.75 : 0.35 }));
    if (text && xAxis.shown !== false) parts.push(label(x, top + height + 16, text, { "text-anchor": "middle", fill: colours.quiet }));
  }
  for (const [i, tick] of yAxis.ticks.entries()) {
    const y = yAxis.place(tick);
    if (y < top - 0.5 || y > top + height + 0.5) continue;
    const text = yAxis.labels[i];
    parts.push(svg("line", { x1: left, x2: left + width, y1: y, y2: y, stroke: colours.line, "stroke-width": text ? 0.75 : 0.35 }));
    if (text) parts.push(label(left - 6, y + 4, text, { "text-anchor": "end", fill: colours.quiet }));
  }
  parts.push(svg("path", { d: `M${left},${top}V${top + height}H${left + width}`, fill: "none", stroke: colours.quiet, "stroke-width": 1 }));
  if (xAxis.text && xAxis.shown !== false) {
    parts.push(label(left + width / 2, top + height + 34, xAxis.text, { "text-anchor": "middle", fill: colours.ink }));
  }
  if (yAxis.text) {
    const middle = top + height / 2;
    parts.push(label(14, middle, yAxis.text, { "text-anchor": "middle", fill: colours.ink, transform: `rotate(-90 14 ${middle})` }));
  }
  return parts;
};

/** Room that the labels of an upright axis take. */
const roomFor = (labels) => Math.max(...labels.map((text) => textWidth(text, 12)), 10) + 34;

/** A small line in the look of a curve, for legends. */
const swatch = (look, paper, width) =>
  svg("svg", { width: width || 26, height: 12, viewBox: `0 0 ${width || 26} 12`, "aria-hidden": "true", class: "swatch" },
    look.filled
      ? svg("rect", { x: 1, y: 2, width: 24, height: 9, fill: fillOf(look, paper), stroke: colourOf(look, paper), "stroke-width": 0.75 })
      : svg("line", { x1: 0, x2: width || 26, y1: 6, y2: 6, stroke: colourOf(look, paper), "stroke-width": 2.25,
        "stroke-dasharray": DASHES[look.dash].join(" ") }));

/** The colour of an area: its curve's, let through. */
const fillOf = (look, paper) => {
  const colour = colourOf(look, paper);
  return colour.startsWith("#") ? `${colour}${look.colour === null ? "55" : "66"}` : colour;
};
