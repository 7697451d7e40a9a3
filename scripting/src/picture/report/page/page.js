// The page: reads what is packed in it, and builds snapshots, sweeps, materials and errors when they are looked at.

let records = null;
let blocks = [];
let snapshots = [];
let living = [];
let sections = 0;

/** The numbers of a block, unpacked once. */
const blockOf = (place, columns) => {
  blocks[place] ??= unpacked(document.getElementById(`block${place}`).textContent).then((bytes) => columnsOf(bytes, columns));
  return blocks[place];
};

/** The CSV files of a snapshot, the same as `epiloom export --to csv` writes, as far as the page holds the rows. */
const csvFiles = (record, columns) => {
  const makers = record.tables.map((table) => ({
    held: table.held,
    rows: table.rows,
    make: () => {
      const lists = table.columns.map((column) => columns[column.at]);
      const lines = [table.columns.map((column) => column.name)];
      for (let row = 0; row < table.held; row += 1) lines.push(lists.map((list) => digits(list[row])));
      return csvText(lines);
    },
  }));
  if (record.figures.length > 0 || makers.length === 0) {
    makers.push({ make: () => csvText([["figure", "value", "numerical_error", "unit", "reason"],
      ...record.figures.map((f) => [f.name, digits(f.value), digits(f.error), f.unit, f.reason ?? ""])]) });
  }
  if (record.ledgers.length > 0) {
    makers.push({ make: () => csvText([["ledger", "group", "line", "value", "unit", "share", "note"],
      ...record.ledgers.flatMap((ledger) => ledger.lines.map(([group, line, value, unit, share, note]) =>
        [ledger.title, group, line, digits(value), unit, digits(share), note]))]) });
  }
  return makers.map((maker, place) => {
    const suffix = place > 0 ? `-${record.files[place]}` : "";
    const part = maker.held < maker.rows ? ` (${maker.held} of ${maker.rows} rows)` : "";
    return {
      title: part ? `The rows that this page holds${part}; the archive has all` : "The numbers as epiloom export --to csv writes them",
      part,
      click: () => download(`${fileName(record.name)}${suffix}${part ? "-part" : ""}.csv`, maker.make(), "text/csv"),
    };
  });
};

const pairs = (rows) => el("dl", { class: "pairs" }, rows.map(([name, value]) => el("div", {}, el("dt", {}, name), el("dd", {}, value))));

/** Figures of merit, large: the value to its error. */
const figureList = (figures) => {
  const none = figures.filter((f) => f.value === null);
  if (none.length === figures.length && figures.length > 1 && none.every((f) => f.reason === none[0].reason)) {
    return el("p", { class: "note" }, `No figures of merit: ${none[0].reason ?? "none"}.`);
  }
  return el("dl", { class: "figures" }, figures.map((f) => {
    const [value, error] = f.shown.split(" +- ");
    const exact = f.value === null ? null : `${digits(f.value)} ${f.symbol}`.trim();
    const split = /^(\S+) (.+)$/.exec(value);
    return el("div", { title: exact && visible(`as stored: ${exact}`) }, el("dt", {}, f.title),
      f.value === null ? el("dd", { class: "none" }, f.shown) : el("dd", {}, el("span", { class: "value" }, split ? split[1] : value),
        split ? ` ${symbolText(split[2])}` : "", error ? el("span", { class: "error" }, ` \u00b1 ${error}`) : null));
  }));
};

const ledgerTable = (ledger) => {
  let group = null;
  const rows = ledger.lines.map(([place, line, value, , share, note, shown, percent, symbol]) => {
    const head = place !== group ? place : "";
    group = place;
    return el("tr", { class: head ? "head" : null }, el("th", { scope: "row" }, head), el("td", {}, line), el("td", { class: "number" }, percent ?? ""),
      el("td", { class: "number", title: value === null ? null : `${digits(value)} ${symbol}` }, shown ?? "\u2013"), el("td", {}, symbolText(symbol)), el("td", { class: "remark" }, note));
  });
  return el("div", { class: "scroll" }, el("table", { class: "ledger" }, el("caption", {}, `Ledger of ${ledger.title}`),
    el("thead", {}, el("tr", {}, ["place", "line"].map((text) => el("th", { scope: "col" }, text)), ["share", "amount"].map((text) => el("th", { scope: "col", class: "number" }, text)),
      ["unit", "remark"].map((text) => el("th", { scope: "col" }, text)))), el("tbody", {}, rows)));
};

const dataTable = (table, columns, csv) => sortedTable({
  name: table.name,
  columns: table.columns.map((column) => ({ name: column.name, number: true })),
  size: table.held,
  at: (row, column) => columns[table.columns[column].at][row],
  first: 25,
  csv: el("button", { type: "button", title: csv.title, "data-tool": "csv", on: { click: csv.click } }, `CSV${csv.part}`),
  note: table.held < table.rows ? `${table.rows} in the archive; extremes are kept` : "",
});

const stackTable = (stack) => [
  el("div", { class: "scroll" }, el("table", { class: "stack" },
    el("thead", {}, el("tr", {}, el("th", { scope: "col" }, "layer"), el("th", { class: "number", scope: "col" }, "thickness"),
      ["doping", "material", "set here"].map((text) => el("th", { scope: "col" }, text)))),
    el("tbody", {}, stack.layers.map(([name, thickness, doping, material, settings]) => el("tr", {}, el("th", { scope: "row" }, name),
      el("td", { class: "number" }, thickness.replace(/ um$/, " \u00b5m")), el("td", {}, unitText(doping)), el("td", {}, material),
      el("td", {}, settings.map(([key, value]) => `${key} ${value}`).join(", "))))))),
  pairs(stack.settings),
];

const folded = (title, open, make) => {
  const inside = el("div", { class: "inside" });
  const element = el("details", {}, el("summary", {}, title), inside);
  const fill = () => {
    if (element.open && inside.childNodes.length === 0) inside.append(...[make()].flat());
  };
  element.addEventListener("toggle", fill);
  if (open) element.open = true;
  fill();
  return element;
};

const figureOf = (chart, columns, context) => {
  const { body } = chart;
  if (body.curves) return curvesFigure(chart, columns, context);
  if (body.bars) return barsFigure(chart, columns, context);
  if (body.map) return mapFigure(chart, columns, context);
  return histogramFigure(chart, columns, context);
};

/** Fills the section of a snapshot; gives its figures. */
const fillSnapshot = async (place, inside) => {
  const record = records.snapshots[place];
  if (record.damaged) {
    inside.append(el("p", { class: "trouble" }, record.damaged));
    return [];
  }
  const columns = await blockOf(place, record.columns);
  const files = csvFiles(record, columns);
  if (record.failed) inside.append(el("p", { class: "trouble" }, `Failed: ${record.failed}. What follows is the last good state.`));
  if (record.figures.length > 0) inside.append(figureList(record.figures));
  const charts = record.charts.map((chart) => figureOf(chart, columns, {
    name: record.name,
    csv: chart.csv === null ? null : files[chart.csv],
  }));
  living.push(...charts);
  const thin = record.tables.filter((table) => table.held < table.rows);
  if (thin.length > 0) {
    inside.append(el("p", { class: "note" }, `To keep the page small it holds ${thin.map((table) => `${table.held} of the ${table.rows} rows of \u201c${table.name}\u201d`).join(", ")}, `
      + "with every extreme and both sides of every interface; no number is changed. All rows: epiloom export, or epiloom report --all-rows."));
  }
  if (charts.length > 0) inside.append(el("div", { class: "charts" }, charts.map((chart) => chart.element)));
  if (record.warnings.length > 0) {
    inside.append(el("ul", { class: "warnings" }, record.warnings.map((text) => {
      const found = /^\[(\w+)\] (.*)$/s.exec(text);
      return el("li", {}, el("span", { class: "code" }, found ? found[1] : ""), ` ${found ? found[2] : text}`);
    })));
  }
  if (record.conditions.length > 0) inside.append(pairs(record.conditions));
  if (record.stack !== null) {
    const stack = records.shared.stacks[record.stack];
    inside.append(folded(`Stack ${stack.name}`, false, () => stackTable(stack)));
  }
  for (const ledger of record.ledgers) inside.append(folded(`Ledger of ${ledger.title}`, false, () => [ledgerTable(ledger),
    el("div", { class: "tools" }, el("button", { type: "button", title: files.at(-1).title, "data-tool": "csv", on: { click: files.at(-1).click } }, "CSV of all ledgers"))]));
  for (const [index, table] of record.tables.entries()) {
    inside.append(folded(`Table ${table.name}: ${count(table.rows, "row", "rows")}`, record.tables.length > 0 && record.charts.length === 0,
      () => dataTable(table, columns, files[index])));
  }
  inside.append(el("div", { class: "tools" }, el("span", { class: "told" }, "CSV, as epiloom export writes it:"), files.map((file, index) =>
    el("button", { type: "button", title: file.title, "data-file": index, on: { click: file.click } }, `${record.files[index]}${file.part}`))));
  return charts;
};

/** The short line beside the name of a snapshot that is closed. */
const lead = (record) => (record.figures || []).filter((f) => f.value !== null).slice(0, 4)
  .map((f) => `${{ jsc: "Jsc", voc: "Voc", ff: "FF" }[f.name] ?? f.name.replaceAll("_", " ")} ${symbolText(f.shown.split(" +- ")[0])}`).join("  \u00b7  ");

const buildSnapshots = (opened) => {
  const section = document.getElementById("snapshots");
  section.querySelector("noscript")?.remove();
  for (const old of section.querySelectorAll(":scope > .snapshot, :scope > .tools")) old.remove();
  // what a run has stored never changes: what is built stays as it is, zoomed and unfolded
  const built = new Map(snapshots.filter((each) => each.charts).map((each) => [each.name, each]));
  const listed = records.snapshots.slice(0, records.listed);
  const many = listed.length > 6;
  if (listed.length > 1) {
    const all = (open) => el("button", { type: "button", on: { click: async () => {
      for (const each of snapshots) await each.set(open);
    } } }, open ? "Open all" : "Close all");
    section.append(el("div", { class: "tools" }, all(true), all(false)));
  }
  snapshots = listed.map((record, place) => {
    const there = built.get(record.name);
    if (there) {
      there.element.id = `s${place}`;
      section.append(there.element);
      return there;
    }
    sections += 1;
    const inside = el("div", { class: "inside", hidden: true, id: `in${sections}` });
    const button = el("button", { type: "button", "aria-expanded": "false", "aria-controls": inside.id, on: { click: () => each.set(inside.hidden) } },
      el("span", { class: "name" }, record.name), " ", el("span", { class: "kind" }, record.kind), record.failed || record.damaged ? el("strong", { class: "bad" }, " failed") : null);
    const element = el("article", { class: "snapshot", id: `s${place}` }, el("h3", {}, button), el("p", { class: "lead" }, lead(record)), inside);
    let filled = null;
    const each = {
      element,
      name: record.name,
      charts: null,
      open: () => !inside.hidden,
      set: async (open) => {
        inside.hidden = !open;
        element.classList.toggle("open", open);
        button.setAttribute("aria-expanded", open ? "true" : "false");
        if (open) each.charts = await (filled ??= fillSnapshot(place, inside));
      },
    };
    section.append(element);
    return each;
  });
  return Promise.all(snapshots.map((each, place) => each.set(opened ? opened.has(each.name) : !many || place === 0)));
};

/** Opens the snapshot that the address names. */
const follow = async () => {
  const found = /^#s(\d+)$/.exec(location.hash);
  const each = found && snapshots[Number(found[1])];
  if (!each) return;
  await each.set(true);
  each.element.scrollIntoView({ block: "start" });
};

const buildMaterials = () => {
  const section = document.getElementById("materials");
  for (const old of section.querySelectorAll(":scope > :not(h2)")) old.remove();
  const { sets, rows } = records.shared.materials;
  if (sets.length === 0) {
    section.append(el("p", { class: "note" }, "No snapshot holds material values."));
    return;
  }
  const columns = ["layer", "material", "parameter", "value", "source", "note"].map((name) => ({ name, number: name === "value" }));
  const places = [0, 1, 2, 4, 5, 6];
  for (const [index, set] of sets.entries()) {
    const users = records.snapshots.filter((record) => record.materials === index);
    const stacks = [...new Set(users.map((record) => (record.stack === null ? "" : records.shared.stacks[record.stack].name)))].filter(Boolean);
    const title = `${stacks.join(", ") || "Values"}: ${count(set.length, "value", "values")}, used in ${users.length === records.snapshots.length ? "all snapshots" : count(users.length, "snapshot", "snapshots")}`;
    section.append(folded(title, index === 0, () => sortedTable({
      name: "materials",
      columns,
      size: set.length,
      at: (row, column) => rows[set[row]][places[column]],
      show: (row, column) => {
        const cell = rows[set[row]][places[column]];
        if (column === 3) return el("span", { title: visible(cell) }, symbolText(shortValue(rows[set[row]][3])));
        return cell;
      },
      first: 40,
    })));
  }
};

const shortValue = (text) => text.replace(/ um$/, " \u00b5m");

const buildAccuracy = () => {
  const section = document.getElementById("accuracy");
  for (const old of section.querySelectorAll(".table, .note.made")) old.remove();
  const rows = records.snapshots.slice(0, records.listed).flatMap((record, place) => (record.figures || []).filter((f) => f.value !== null).map((f) => ({ record, place, f })));
  if (rows.length === 0) return;
  const relative = ({ f }) => (f.error === null || !f.value ? "" : Math.abs(f.error / f.value));
  const cells = [(r) => r.record.name, (r) => r.f.title, (r) => r.f.value, (r) => r.f.error ?? "", (r) => r.f.symbol, relative,
    (r) => r.f.meshes.map(([nodes, value]) => `${nodes}: ${digits(value)}`).join(", ")];
  const names = ["snapshot", "figure", "value", "error", "unit", "relative error", "value on each mesh (nodes: value)"];
  section.append(
    el("p", { class: "note made" }, "Every figure with all its digits, the estimate of its absolute numerical error, and its value on each of the nested meshes that the estimate comes from."),
    sortedTable({
      name: "figures and their errors",
      columns: names.map((name, i) => ({ name, number: [2, 3, 5].includes(i), unbroken: i === 1 || i === 6 })),
      size: rows.length,
      at: (row, column) => cells[column](rows[row]),
      show: (row, column) => {
        const value = cells[column](rows[row]);
        if (column === 0) return el("a", { href: `#s${rows[row].place}` }, value);
        if (column === 4) return symbolText(value);
        if (column === 5) return value === "" ? "" : value.toExponential(1).replace("e+", "e");
        return value;
      },
      first: 40,
    }));
};

/** The list of contents: the snapshots by name, with a field where there are many. */
const buildContents = () => {
  const list = document.querySelector("#contents a[href='#snapshots']")?.parentElement;
  if (!list) return;
  list.querySelector(".inner")?.remove();
  const listed = records.snapshots.slice(0, records.listed);
  const items = listed.map((record, place) => el("li", {}, el("a", { href: `#s${place}` }, record.name)));
  const names = el("ol", {}, items);
  const field = listed.length > 12 ? el("input", { type: "search", placeholder: "find a snapshot", "aria-label": "Find a snapshot", on: { input: () => {
    for (const [place, item] of items.entries()) item.hidden = !records.snapshots[place].name.toLowerCase().includes(field.value.toLowerCase());
  } } }) : null;
  list.append(el("div", { class: "inner" }, field, names));
};

const themeButton = () => {
  const words = { "": "light or dark: as the system", light: "light", dark: "dark" };
  const button = el("button", { type: "button", class: "theme", on: { click: () => {
    const order = ["", "light", "dark"];
    const now = document.documentElement.dataset.theme ?? "";
    const next = order[(order.indexOf(now) + 1) % 3];
    if (next) document.documentElement.dataset.theme = next;
    else delete document.documentElement.dataset.theme;
    show();
    repaint();
  } } }, "");
  const show = () => {
    button.textContent = words[document.documentElement.dataset.theme ?? ""];
  };
  show();
  document.querySelector(".masthead").append(button);
};

const repaint = () => {
  for (const each of living) each.repaint();
};

const start = async (opened) => {
  const kept = new Set(snapshots.flatMap((each) => each.charts ?? []));
  for (const each of living) if (!kept.has(each)) each.end();
  living = [...kept];
  blocks = [];
  records = JSON.parse(new TextDecoder().decode(await unpacked(document.getElementById("records").textContent)));
  palette = records.palette;
  for (const table of document.querySelectorAll("table.sortable")) enhance(table);
  themeButton();
  buildContents();
  const ready = Promise.all([buildSnapshots(opened), buildSweeps()]);
  buildAccuracy();
  buildMaterials();
  await ready;
  await follow();
  document.documentElement.dataset.ready = "";
};

/** Takes over what a newer page of the same run holds; what is open and where the reader stands stay. */
const renew = async () => {
  const text = await (await fetch("/", { cache: "no-store" })).text();
  const news = new DOMParser().parseFromString(text, "text/html");
  const opened = new Set(snapshots.filter((each) => each.open()).map((each) => each.name));
  const [top, theme] = [scrollY, document.documentElement.dataset.theme];
  for (const old of document.querySelectorAll("script[type='text/plain']")) old.remove();
  document.querySelector(".masthead").replaceWith(news.querySelector(".masthead"));
  document.querySelector(".frame").replaceWith(news.querySelector(".frame"));
  document.querySelector(".frame").after(...news.querySelectorAll("script[type='text/plain']"));
  document.body.dataset.watching = news.body.dataset.watching;
  if (theme) document.documentElement.dataset.theme = theme;
  await start(opened.size > 0 ? opened : null);
  scrollTo(0, top);
};

/** Asks once a second whether the run has stored more, until it ends. */
const watch = async () => {
  const say = (text) => {
    const state = document.getElementById("state") ?? el("p", { class: "state", id: "state", role: "status" });
    state.textContent = text;
    if (!state.isConnected) document.querySelector(".masthead").append(state);
  };
  say("The run is going on; this page renews itself.");
  for (;;) {
    await new Promise((resolve) => { setTimeout(resolve, 1000); });
    let state;
    try {
      state = await (await fetch("/state", { cache: "no-store" })).json();
      if (String(state.version) !== document.body.dataset.watching) await renew();
    } catch {
      say("The run has ended, or is no longer watched. What is here stays until the page is closed; epiloom report writes it to a file.");
      return;
    }
    if (!state.running) {
      say("The run has ended. What is here stays until the page is closed; epiloom report writes it to a file.");
      return;
    }
    say("The run is going on; this page renews itself.");
  }
};

nightAsked.addEventListener("change", repaint);
addEventListener("hashchange", follow);
// paper takes drawings, not the pixels of a screen
addEventListener("beforeprint", () => {
  for (const each of living) each.print();
});

start(null).then(() => {
  if (document.body.dataset.watching) watch();
}).catch((error) => {
  document.querySelector(".masthead").append(el("p", { class: "trouble" },
    `This page could not be unpacked (${error.message}). A browser of the year 2023 or later is needed.`));
  throw error;
});
