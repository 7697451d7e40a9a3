// Tables: sorted by a click on a heading, filtered by words and comparisons.

const COMPARISON = /^(.+?)\s*(<=|>=|<|>|=)\s*(-?[\d.]+(?:e[-+]?\d+)?)$/i;

/** What a filter asks for: words that must occur, and comparisons of a column with a number. */
const filterOf = (text, names) => {
  const words = [];
  const tests = [];
  const unknown = [];
  for (const part of text.split(",").map((each) => each.trim()).filter(Boolean)) {
    const found = COMPARISON.exec(part);
    if (!found) {
      words.push(part.toLowerCase());
      continue;
    }
    const wanted = found[1].toLowerCase();
    let column = names.findIndex((name) => name.toLowerCase() === wanted);
    if (column < 0) column = names.findIndex((name) => name.toLowerCase().startsWith(wanted));
    if (column < 0) unknown.push(found[1]);
    else tests.push({ column, sign: found[2], than: Number(found[3]) });
  }
  return { words, tests, unknown };
};

const holds = (value, { sign, than }) =>
  ({ "<": value < than, ">": value > than, "<=": value <= than, ">=": value >= than, "=": value === than })[sign];

/** Order of two cells: numbers by size, then texts, what is empty last whichever way. */
const order = (a, b, down) => {
  const empty = (v) => v === "" || v === null || v === undefined || Number.isNaN(v);
  if (empty(a) || empty(b)) return empty(a) - empty(b);
  const sign = down ? -1 : 1;
  if (typeof a === "number" && typeof b === "number") return sign * (a - b);
  return sign * String(a).localeCompare(String(b), "en", { numeric: true });
};

/**
 * A table with headings that sort and a field that filters.
 * `columns`: [{name, number, title}]; `size`: number of rows; `at(row, column)`: a number or a text; `show(row, column)`: what its
 * cell shows; `rowElement(row)`: a row that is there already; `first`: rows shown before a person asks for more.
 */
const sortedTable = ({ name, columns, size, at, show, rowElement, first = 60, csv, note }) => {
  const state = { column: -1, down: false, most: first, text: "" };
  const body = el("tbody", {});
  const told = el("p", { class: "told", role: "status" });
  const headings = columns.map((column, index) => {
    const button = el("button", { type: "button", on: { click: () => sortBy(index) } }, column.name);
    return el("th", { class: column.number ? "number" : null, title: column.title, scope: "col" }, button);
  });
  const table = el("table", { "aria-label": name }, el("thead", {}, el("tr", {}, headings)), body);
  const field = el("input", { type: "search", placeholder: "filter: words, or column > number", "aria-label": `Filter ${name}`,
    spellcheck: "false", on: { input: () => { state.text = field.value; state.most = first; fill(); } } });
  const more = el("button", { type: "button", class: "more", on: { click: () => { state.most = Infinity; fill(); } } }, "");

  const sortBy = (index) => {
    // up, down, as it was
    if (state.column !== index) [state.column, state.down] = [index, false];
    else if (!state.down) state.down = true;
    else state.column = -1;
    fill();
  };

  const rows = () => {
    const { words, tests, unknown } = filterOf(state.text, columns.map((column) => column.name));
    let list = Array.from({ length: size }, (_, row) => row);
    if (words.length > 0 || tests.length > 0) {
      list = list.filter((row) => {
        if (!tests.every((test) => holds(Number(at(row, test.column)), test))) return false;
        if (words.length === 0) return true;
        const text = columns.map((_, column) => at(row, column)).map((v) => (typeof v === "number" ? digits(v) : v)).join("\n").toLowerCase();
        return words.every((word) => text.includes(word));
      });
    }
    if (state.column >= 0) {
      const keys = new Map(list.map((row) => [row, at(row, state.column)]));
      list.sort((a, b) => order(keys.get(a), keys.get(b), state.down) || a - b);
    }
    return { list, unknown };
  };

  const fill = () => {
    const { list, unknown } = rows();
    const shown = list.slice(0, state.most);
    body.replaceChildren(...shown.map((row) => (rowElement ? rowElement(row) : el("tr", {}, columns.map((column, index) => {
      const content = show ? show(row, index) : at(row, index);
      return el("td", { class: column.number ? "number" : column.unbroken ? "unbroken" : null }, typeof content === "number" ? digits(content) : content);
    })))));
    for (const [index, heading] of headings.entries()) {
      if (index === state.column) heading.setAttribute("aria-sort", state.down ? "descending" : "ascending");
      else heading.removeAttribute("aria-sort");
    }
    more.hidden = shown.length === list.length;
    more.textContent = `Show all ${list.length} rows`;
    const part = list.length === size ? count(size, "row", "rows") : `${list.length} of ${count(size, "row", "rows")}`;
    const bad = unknown.length > 0 ? `no column begins with ${unknown.join(", ")}` : "";
    told.textContent = visible([part, note, bad].filter(Boolean).join("; "));
  };
  fill();
  const tools = el("div", { class: "tools" }, size > 8 ? field : null, csv, size > 8 || note ? told : null);
  return el("div", { class: "table" }, tools, el("div", { class: "scroll" }, table), more);
};

/** Gives a table that stands in the page as markup the same headings and field. */
const enhance = (table) => {
  const cells = [...table.tHead.rows[0].cells];
  const rows = [...table.tBodies[0].rows];
  const columns = cells.map((cell) => ({ name: cell.textContent, number: cell.classList.contains("number"), title: cell.title || null }));
  const value = (row, column) => {
    const cell = rows[row].cells[column];
    return cell.dataset.sort !== undefined ? Number(cell.dataset.sort) : cell.textContent;
  };
  const made = sortedTable({
    name: table.dataset.name,
    columns,
    size: rows.length,
    at: value,
    rowElement: (row) => rows[row],
    first: Infinity,
  });
  table.closest(".scroll").replaceWith(made);
};
