// Words and elements: everything from the archive becomes text, never markup.

/** Characters that would be invisible or turn the text around, written out. */
const visible = (text) =>
  String(text).replace(/[\u0000-\u0008\u000b-\u001f\u007f-\u009f\u200e\u200f\u202a-\u202e\u2066-\u2069]/g,
    (letter) => `\\u{${letter.codePointAt(0).toString(16)}}`);

const put = (element, attributes, children) => {
  for (const [name, value] of Object.entries(attributes || {})) {
    if (value === null || value === undefined || value === false) continue;
    if (name === "on") {
      for (const [event, listener] of Object.entries(value)) element.addEventListener(event, listener);
    } else {
      element.setAttribute(name, value === true ? "" : value);
    }
  }
  for (const child of children.flat(3)) {
    if (child === null || child === undefined || child === false) continue;
    element.append(child instanceof Node ? child : document.createTextNode(visible(child)));
  }
  return element;
};

/** An element of the page. */
const el = (tag, attributes, ...children) => put(document.createElement(tag), attributes, children);

/** An element of a drawing. */
const svg = (tag, attributes, ...children) =>
  put(document.createElementNS("http://www.w3.org/2000/svg", tag), attributes, children);

const RAISED = { "-": "\u207b", "+": "\u207a", 0: "\u2070", 1: "\u00b9", 2: "\u00b2", 3: "\u00b3", 4: "\u2074", 5: "\u2075", 6: "\u2076",
  7: "\u2077", 8: "\u2078", 9: "\u2079" };

const raise = (text) => [...String(text)].map((letter) => RAISED[letter] || letter).join("");

/** `cm^-3` with a raised exponent. */
const unitText = (unit) => unit.replace(/\^([-+]?\d+)/g, (_, power) => raise(power));

/** `mA/cm2` with raised powers. */
const symbolText = (symbol) => unitText(symbol).replace(/(cm|mm|m|um|nm)(\d)/g, (_, base, power) => base + raise(power));

/** Label and unit as an axis shows them. */
const axisText = (axis, magnitude) => {
  const label = magnitude ? `|${axis.label}|` : axis.label;
  return axis.unit ? `${label} / ${unitText(axis.unit)}` : label;
};

/** A number with its unit, all digits. */
const amount = (value, unit) => (unit ? `${digits(value)} ${unitText(unit)}` : digits(value));

/** A name that can stand in a file name. */
const fileName = (text) => visible(text).replace(/[/\\:*?"<>|\s]+/g, "_");

/** Offers a text as a file; it is made here and leaves nowhere. */
const download = (name, text, type) => {
  const address = URL.createObjectURL(new Blob([text], { type }));
  const link = el("a", { href: address, download: name });
  document.body.append(link);
  link.click();
  link.remove();
  setTimeout(() => URL.revokeObjectURL(address), 10000);
};

const count = (n, one, many) => `${n} ${n === 1 ? one : many}`;

/** A remark under a plot; a long one is folded. */
const remarkOf = (text) => {
  const shown = visible(text);
  if (shown.length <= 140) return el("p", {}, shown);
  const cut = shown.lastIndexOf(" ", 60);
  return el("details", {}, el("summary", {}, `${shown.slice(0, cut)} \u2026`), el("p", {}, shown));
};
