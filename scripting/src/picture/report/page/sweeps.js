// Sweeps: maps and lines of what the points gave, a table of them, and what one point stored.

/** The columns of the table of a sweep, and of its CSV file: index, coordinates, outputs with errors, reason. */
const sweepColumns = (sweep, columns) => {
  const made = [{ name: "point", number: true, at: (row) => sweep.points[row].index }];
  for (const column of sweep.columns) {
    if (column.texts) {
      made.push({ name: column.name, label: column.label, unit: "", number: false, at: (row) => column.texts[row] });
      continue;
    }
    const number = (at) => (row) => (Number.isNaN(columns[at][row]) ? "" : columns[at][row]);
    made.push({ name: column.name, label: column.label, unit: column.unit, number: true, at: number(column.at), error: column.error ? columns[column.error.at] : null });
    if (column.error) made.push({ name: column.error.name, number: true, at: number(column.error.at), isError: true });
  }
  made.push({ name: "reason", number: false, at: (row) => sweep.points[row].reason });
  return made;
};

/** The point of each sweep that a person looks at, by its index. */
const chosenPoints = new Map();

const fillSweep = async (sweep, inside) => {
  const columns = await blockOf(sweep.block, sweep.packed);
  const table = sweepColumns(sweep, columns);
  const csv = {
    title: "Every point with all digits",
    click: () => download(`${fileName(sweep.name)}.csv`, csvText([table.map((column) => column.name),
      ...sweep.points.map((_, row) => table.map((column) => { const v = column.at(row); return typeof v === "number" ? digits(v) : v; }))]), "text/csv"),
  };
  const panel = el("div", { class: "point", tabindex: "-1", "aria-live": "polite" });
  let closing = [];

  /** Shows what a point gave and stored. */
  const open = async (row) => {
    for (const each of closing) each.end();
    living = living.filter((each) => !closing.includes(each));
    const before = living.length;
    const point = sweep.points[row];
    chosenPoints.set(sweep.name, point.index);
    const outputs = table.filter((column) => !column.isError && !["point", "reason"].includes(column.name));
    panel.replaceChildren(
      el("h4", {}, `Point ${point.index}`),
      pairs(outputs.map((column) => {
        const v = column.at(row);
        const error = column.error ? column.error[row] : NaN;
        return [column.label, (typeof v === "number" ? amount(v, column.unit) : v || "none") + (Number.isFinite(error) ? ` \u00b1 ${digits(error)}` : "")];
      })),
      ...(point.reason ? [el("p", { class: point.failed ? "trouble" : "note" }, point.failed ? `Failed: ${point.reason}` : point.reason)] : []),
      ...point.warnings.map((text) => el("p", { class: "note" }, `warning: ${text}`)),
      ...(point.printed.length > 0 ? [el("pre", { class: "command" }, point.printed.join("\n"))] : []),
    );
    if (point.stored === 0) panel.append(el("p", { class: "note" }, "This point stored no curves; store(\"name\", result) inside the sweep keeps them."));
    else if (point.snapshots.length < point.stored) panel.append(el("p", { class: "note" }, `The curves of this point are in the archive and not in this page, which holds those of part of the points: epiloom show ${records.file} '${sweep.name}/${point.index}'.`));
    for (const place of point.snapshots) {
      const record = records.snapshots[place];
      const box = el("div", { class: "inside" });
      panel.append(el("h4", {}, record.name, " ", el("span", { class: "kind" }, record.kind)), box);
      await fillSnapshot(place, box);
    }
    closing = living.slice(before);
  };

  const titled = (chart) => {
    const { map, curves } = chart.body;
    if (map) return `${map.z.label} over ${map.x.label.toLowerCase()} and ${map.y.label.toLowerCase()}`;
    if (curves) return `Along ${curves.x.label.toLowerCase()}`;
    return chart.title;
  };
  const charts = sweep.charts.map((chart) => figureOf({ ...chart, title: titled(chart) }, columns, {
    name: sweep.name,
    csv,
    open: async (row) => {
      await open(row);
      panel.scrollIntoView({ block: "nearest" });
    },
  }));
  living.push(...charts);
  if (charts.some((chart) => chart.choose)) inside.append(el("p", { class: "note" }, "A click on a point of a map, or Enter, shows what it gave and its curves below."));
  if (charts.length > 0) inside.append(el("div", { class: "charts" }, charts.map((chart) => chart.element)));
  inside.append(panel, sortedTable({
    name: `points of ${sweep.name}`,
    columns: table.map(({ name, number }) => ({ name, number })),
    size: sweep.points.length,
    at: (row, column) => table[column].at(row),
    show: (row, column) => {
      const value = table[column].at(row);
      if (column > 0) return value;
      return el("button", { type: "button", class: "link", title: "Show what this point gave", "data-row": row, on: { click: async () => {
        await open(row);
        panel.scrollIntoView({ block: "start" });
        panel.focus({ preventScroll: true });
      } } }, String(value));
    },
    first: 25,
    csv: el("button", { type: "button", title: csv.title, "data-tool": "csv", on: { click: csv.click } }, "CSV"),
  }));
  // a page that renews itself shows the same point again
  const again = sweep.points.findIndex((point) => point.index === chosenPoints.get(sweep.name));
  if (again >= 0) await open(again);
};

const buildSweeps = () => {
  const section = document.getElementById("sweeps");
  if (!section) return Promise.resolve();
  for (const old of section.querySelectorAll(":scope > :not(h2)")) old.remove();
  return Promise.all(records.sweeps.map((sweep, place) => {
    const inside = el("div", { class: "inside" });
    const facts = [sweep.plan, count(sweep.points.length, "point", "points"), sweep.failed > 0 ? `${sweep.failed} failed` : null,
      sweep.leftOut > 0 ? `${sweep.leftOut} left out by the filter` : null, sweep.share ? `share ${sweep.share}` : null].filter(Boolean);
    section.append(el("article", { class: "sweep", id: `w${place}` }, el("h3", {}, sweep.name), el("p", { class: "facts" }, facts.join(" \u00b7 ")),
      sweep.troubles.map((text) => el("p", { class: "trouble" }, text)), inside));
    return fillSweep(sweep, inside);
  }));
};
