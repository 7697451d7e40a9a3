// Curves: a plot that answers to pointer and keys, and the same as a drawing for print and files.

/** Brings the curves of a panel onto one rising axis: the axis, and for each curve which of its points stands at each place. */
const aligned = (series, columns) => {
  const ids = [...new Set(series.map((each) => each.x))];
  const rising = (x) => {
    const list = Array.from(x.keys()).filter((i) => !Number.isNaN(x[i]));
    const sorted = list.every((i, place) => place === 0 || x[list[place - 1]] <= x[i]);
    return sorted ? list : list.sort((a, b) => x[a] - x[b] || a - b);
  };
  if (ids.length === 1) {
    const list = rising(columns[ids[0]]);
    return { xs: list.map((i) => columns[ids[0]][i]), at: series.map(() => list) };
  }
  const slots = new Map();
  for (const id of ids) {
    let [before, times] = [NaN, 0];
    for (const i of rising(columns[id])) {
      const x = columns[id][i];
      times = x === before ? times + 1 : 0;
      before = x;
      const key = `${x}|${times}`;
      if (!slots.has(key)) slots.set(key, { x, times, at: new Map() });
      slots.get(key).at.set(id, i);
    }
  }
  const list = [...slots.values()].sort((a, b) => a.x - b.x || a.times - b.times);
  return { xs: list.map((slot) => slot.x), at: series.map((each) => list.map((slot) => slot.at.get(each.x) ?? -1)) };
};

/** Least and greatest of what can be drawn. */
const span = (lists, log) => {
  let [low, high] = [Infinity, -Infinity];
  for (const list of lists) {
    for (const v of list) {
      const drawn = log ? Math.abs(v) : v;
      if (!Number.isFinite(drawn) || (log && drawn === 0)) continue;
      if (drawn < low) low = drawn;
      if (drawn > high) high = drawn;
    }
  }
  if (low > high) return log ? [1e-1, 1] : [0, 1];
  // what lies further down is told when the scale is drawn
  if (log) return [Math.max(low, high * 1e-18), high];
  return low === high ? [low - (Math.abs(low) || 1) * 0.1, high + (Math.abs(high) || 1) * 0.1] : [low, high];
};

/** A little room around. */
const padded = ([low, high], log, share) => {
  if (log) {
    const factor = (high / low) ** share || 1;
    return [low / Math.max(factor, 1.05), high * Math.max(factor, 1.05)];
  }
  const room = (high - low) * share;
  return [low - room, high + room];
};

let figures = 0;

/**
 * The figure of a chart of curves. `columns`: the numbers; `files`: [{name, make}] of CSV; `name`: of the snapshot.
 */
const curvesFigure = (chart, columns, { name, csv }) => {
  const { x: xAxis, panels, regions } = chart.body.curves;
  // where several panels hold several curves each, a name alone does not tell which is meant
  const nameOf = (panel, each) => unitText(panels.length > 1 && panel.series.length > 1 ? `${panel.y.label}: ${each.name}` : each.name);
  figures += 1;
  const key = `figure${figures}`;
  const state = { xlog: xAxis.scale === "Log", x: null, at: null };
  const parts = panels.map((panel) => ({
    panel,
    log: panel.y.scale === "Log",
    range: null,
    hidden: new Set(),
    line: aligned(panel.series, columns),
    plot: null,
    box: el("div", { class: "plot", tabindex: "0", role: "group", "aria-roledescription": "plot",
      "aria-label": visible(`${chart.title} of ${name}: ${axisText(panel.y, false)} against ${axisText(xAxis, false)}. Arrow keys move along the curves, plus and minus zoom, 0 shows all, L switches the scale.`) }),
  }));
  const reading = el("p", { class: "reading", "aria-live": "polite" });
  const notes = el("div", { class: "notes" });
  const root = el("figure", { class: "chart", id: key, "data-kind": chart.kind });

  const wholeX = () => {
    const all = parts.map((part) => part.line.xs);
    if (!state.xlog && xAxis.scale !== "Log" && xAxis.range[0] !== null) return [...xAxis.range];
    return span(all.map((xs) => xs.filter((x) => !state.xlog || x > 0)), state.xlog);
  };

  const wholeY = (part) => {
    const { y } = part.panel;
    // the names of layers stand above the curves
    const room = (range) => {
      const [low, high] = padded(range, part.log, 0.03);
      if (regions.length === 0 || part !== parts[0]) return [low, high];
      return [low, part.log ? high * (high / low) ** 0.08 : high + (high - low) * 0.08];
    };
    if ((y.scale === "Log") === part.log && y.range[0] !== null) return room(y.range);
    const shown = part.panel.series.filter((_, i) => !part.hidden.has(i));
    const lists = shown.flatMap((each) => [columns[each.y], each.base === null ? [] : columns[each.base]]);
    return room(span(lists, part.log));
  };

  const xRange = () => state.x || wholeX();
  const yRange = (part) => part.range || wholeY(part);
  const magnitude = (part) => part.log && (part.panel.y.magnitude || part.panel.series.some((each) => columns[each.y].some((v) => v < 0)));

  const drawnData = (part) => {
    const keep = part.line.xs.map((x, slot) => slot).filter((slot) => !state.xlog || part.line.xs[slot] > 0);
    part.slots = keep;
    const xs = keep.map((slot) => part.line.xs[slot]);
    const ys = part.panel.series.map((each, i) => keep.map((slot) => {
      const at = part.line.at[i][slot];
      if (at < 0) return undefined;
      const v = columns[each.y][at];
      if (!Number.isFinite(v) || (part.log && v === 0)) return null;
      return part.log ? Math.abs(v) : v;
    }));
    return [xs, ...ys];
  };

  // areas and layers, below everything else
  const underlay = (part) => (plot) => {
    const { ctx, bbox } = plot;
    const ratio = devicePixelRatio;
    const colours = theme(false);
    ctx.save();
    ctx.beginPath();
    ctx.rect(bbox.left, bbox.top, bbox.width, bbox.height);
    ctx.clip();
    const px = (v) => plot.valToPos(v, "x", true);
    for (const [i, region] of regions.entries()) {
      const from = state.xlog && region.from <= 0 ? bbox.left : px(region.from);
      const to = px(region.to);
      ctx.fillStyle = i % 2 === 0 ? colours.layer : colours.other;
      ctx.fillRect(from, bbox.top, to - from, bbox.height);
    }
    for (const [i, each] of part.panel.series.entries()) {
      if (!each.look.filled || part.hidden.has(i)) continue;
      const py = (v) => plot.valToPos(v, "y", true);
      const list = part.slots.map((slot) => part.line.at[i][slot]).filter((at) => at >= 0);
      if (list.length === 0) continue;
      ctx.beginPath();
      for (const at of list) ctx.lineTo(px(columns[each.x][at]), py(columns[each.y][at]));
      for (const at of list.toReversed()) ctx.lineTo(px(columns[each.x][at]), py(each.base === null ? 0 : columns[each.base][at]));
      ctx.closePath();
      ctx.fillStyle = fillOf(each.look, false);
      ctx.fill();
    }
    ctx.font = `${11 * ratio}px ${FONT}`;
    ctx.textBaseline = "top";
    ctx.textAlign = "left";
    ctx.fillStyle = colours.quiet;
    if (part === parts[0]) {
      for (const place of regionLabels(px, bbox.left, bbox.left + bbox.width, ratio)) {
        ctx.fillText(place.text, place.x, bbox.top + 5 * ratio);
      }
    }
    ctx.restore();
  };

  /** Names of layers where they fit between the edges of their layer. */
  const regionLabels = (px, begin, end, ratio) => {
    const places = [];
    for (const region of regions) {
      const from = Math.max(state.xlog && region.from <= 0 ? begin : px(region.from), begin);
      const to = Math.min(px(region.to), end);
      const width = textWidth(visible(region.name), 11) * ratio;
      if (to - from >= width + 6 * ratio) places.push({ text: visible(region.name), x: from + (to - from - width) / 2 });
    }
    return places;
  };

  const overlay = (part) => (plot) => {
    const { ctx } = plot;
    const ratio = devicePixelRatio;
    for (const marker of part.panel.markers) {
      if (part.log && marker.y === 0) continue;
      const x = plot.valToPos(marker.x, "x", true);
      const y = plot.valToPos(part.log ? Math.abs(marker.y) : marker.y, "y", true);
      const { left, top, width, height } = plot.bbox;
      if (!(x >= left && x <= left + width && y >= top && y <= top + height)) continue;
      ctx.save();
      ctx.beginPath();
      ctx.arc(x, y, 4.5 * ratio, 0, 2 * Math.PI);
      ctx.fillStyle = theme(false).ground;
      ctx.strokeStyle = theme(false).ink;
      ctx.lineWidth = 1.5 * ratio;
      ctx.fill();
      ctx.stroke();
      ctx.font = `${11 * ratio}px ${FONT}`;
      ctx.fillStyle = theme(false).ink;
      const wide = textWidth(visible(marker.name), 11) * ratio;
      const right = x + 10 * ratio + wide < left + width;
      ctx.textAlign = right ? "left" : "right";
      ctx.textBaseline = "bottom";
      ctx.fillText(visible(marker.name), right ? x + 8 * ratio : x - 8 * ratio, y - 5 * ratio);
      ctx.restore();
    }
  };

  const height = (part, width) => Math.round(Math.min(Math.max(width * 0.62, 230), 380) * (panels.length > 1 ? Math.max(part.panel.share, 0.4) : 1));

  const build = (part) => {
    const width = Math.max(part.box.clientWidth, 200);
    if (part.plot) part.plot.destroy();
    const colours = () => theme(false);
    const axis = (own, log, range, most) => {
      let made = { ticks: [], labels: [] };
      return {
        stroke: () => colours().quiet,
        font: `12px ${FONT}`,
        labelFont: `12px ${FONT}`,
        grid: { stroke: () => colours().line, width: 0.75 },
        ticks: { show: false },
        border: { show: true, stroke: () => colours().quiet, width: 1 },
        splits: (plot, _, low, high) => {
          made = ticksOf(log, low, high, most(plot));
          return made.ticks;
        },
        filter: (_, splits) => splits,
        values: (_, splits) => splits.map((tick, i) => made.labels[i] ?? ""),
        ...own,
      };
    };
    const last = part === parts.at(-1);
    const series = part.panel.series.map((each, i) => ({
      label: each.name,
      scale: "y",
      show: !part.hidden.has(i),
      stroke: () => colourOf(each.look, false),
      width: each.look.filled ? 0.75 : 1.75,
      dash: DASHES[each.look.dash],
      points: { show: each.look.marks || part.slots?.length === 1, size: 6 },
      ...(each.look.filled ? { paths: () => null } : {}),
    }));
    const data = drawnData(part);
    part.plot = new uPlot({
      width,
      height: height(part, width) + (last ? 0 : -20),
      padding: [10, 22, 0, 0],
      legend: { show: false },
      scales: {
        x: { time: false, distr: state.xlog ? 3 : 1, range: () => xRange() },
        y: { distr: part.log ? 3 : 1, range: () => yRange(part) },
      },
      axes: [
        axis({ label: last ? axisText(xAxis, false) : "", labelSize: last ? 20 : 0, size: 26, gap: 4 }, state.xlog, xRange,
          (plot) => Math.max(Math.floor(plot.width / 90), 3)),
        axis({ label: visible(axisText(part.panel.y, magnitude(part))), labelSize: 22, gap: 5,
          size: (_, values) => Math.max(...(values || [""]).map((text) => textWidth(text, 12)), 24) + 10 }, part.log, () => yRange(part),
        (plot) => Math.max(Math.floor(plot.height / 42), 3)),
      ],
      series: [{}, ...series],
      cursor: {
        drag: { x: true, y: true, uni: 30, setScale: false },
        points: { size: 8, width: 1.5, stroke: (plot, i) => colourOf(part.panel.series[i - 1].look, false), fill: () => colours().ground },
        sync: { key, setSeries: false },
        bind: { dblclick: () => () => { whole(); } },
        dataIdx: (plot, i, near) => (i === 0 ? near : nearest(part, i - 1, state.forced ?? near)),
      },
      hooks: {
        drawClear: [underlay(part)],
        draw: [overlay(part)],
        setCursor: [(plot) => {
          if (plot.cursor.idx === null || plot.cursor.idx === undefined || plot.cursor.left < 0) {
            if (plot.cursor.event) quiet(part);
            return;
          }
          read(part, state.forced ?? plot.cursor.idx);
        }],
        setSelect: [(plot) => select(part, plot)],
      },
    }, data, part.box);
  };

  /** The drawn place nearest to a place at which this curve has a point. */
  const nearest = (part, i, place) => {
    const at = part.line.at[i];
    for (let far = 0; far < part.slots.length; far += 1) {
      for (const near of [place - far, place + far]) {
        if (near >= 0 && near < part.slots.length && at[part.slots[near]] >= 0) return near;
      }
    }
    return place;
  };

  const select = (part, plot) => {
    const { left, top, width, height: tall } = plot.select;
    if (width < 4 && tall < 4) return;
    const most = plot.over.clientHeight;
    if (width >= 4) state.x = [plot.posToVal(left, "x"), plot.posToVal(left + width, "x")];
    if (tall >= 4 && tall < most - 1) part.range = [plot.posToVal(top + tall, "y"), plot.posToVal(top, "y")];
    plot.setSelect({ left: 0, top: 0, width: 0, height: 0 }, false);
    redraw();
  };

  const redraw = () => {
    for (const part of parts) {
      if (!part.plot) continue;
      const [low, high] = xRange();
      part.plot.batch(() => {
        part.plot.setScale("x", { min: low, max: high });
        const [bottom, top] = yRange(part);
        part.plot.setScale("y", { min: bottom, max: top });
      });
    }
    remark();
  };

  const whole = () => {
    state.x = null;
    for (const part of parts) part.range = null;
    redraw();
  };

  const zoom = (factor) => {
    const [from, to] = xRange();
    const f = state.xlog ? Math.log10 : (v) => v;
    const back = state.xlog ? (v) => 10 ** v : (v) => v;
    const current = state.at === null ? null : parts[0].line.xs[parts[0].slots[Math.min(state.at, parts[0].slots.length - 1)]];
    const centre = current !== null && current >= from && current <= to ? f(current) : (f(from) + f(to)) / 2;
    const [least, most] = wholeX().map(f);
    const low = Math.max(centre - (centre - f(from)) * factor, least);
    const high = Math.min(centre + (f(to) - centre) * factor, most);
    state.x = low <= least && high >= most ? null : [back(low), back(high)];
    redraw();
  };

  // the reading: the archive's own numbers at the place of the cursor
  const outputs = [];
  const read = (part, place) => {
    const slot = part.slots[place];
    if (slot === undefined) return;
    state.at = place;
    const x = part.line.xs[slot];
    const region = regions.filter((each) => x >= each.from && x <= each.to);
    const words = region.length > 0 ? ` \u00b7 ${region.map((each) => visible(each.name)).join(" | ")}` : "";
    reading.textContent = `${xAxis.label} ${amount(x, xAxis.unit)}${words}`;
    for (const output of outputs) output.element.textContent = "";
    for (const output of outputs) {
      const { part: own, i, element } = output;
      const near = own === part ? nearest(own, i, place) : nearest(own, i, Math.min(place, own.slots.length - 1));
      const at = own.line.at[i][own.slots[near]];
      if (at === undefined || at < 0) continue;
      const each = own.panel.series[i];
      const value = columns[each.own ?? each.y][at];
      const error = each.error === null ? NaN : columns[each.error][at];
      const unit = own.panel.y.unit;
      const where = columns[each.x][at] === x ? "" : ` at ${digits(columns[each.x][at])}`;
      element.textContent = amount(value, unit) + (Number.isFinite(error) ? ` \u00b1 ${digits(error)}` : "") + where;
    }
  };
  const quiet = () => {
    state.at = null;
    reading.textContent = "\u00a0";
    for (const output of outputs) output.element.textContent = "";
  };

  const step = (part, by) => {
    const n = part.slots.length;
    if (n === 0) return;
    const [from, to] = xRange();
    const inside = part.slots.map((slot, place) => place).filter((place) => {
      const x = part.line.xs[part.slots[place]];
      return x >= from && x <= to;
    });
    if (inside.length === 0) return;
    const [first, end] = [inside[0], inside.at(-1)];
    const start = state.at === null ? (by > 0 ? first - 1 : end + 1) : state.at;
    const place = Math.min(Math.max(start + by, first), end);
    const x = part.line.xs[part.slots[place]];
    state.forced = place;
    part.plot.setCursor({ left: part.plot.valToPos(x, "x"), top: part.plot.over.clientHeight / 2 });
    read(part, place);
    state.forced = null;
  };

  const toggleLog = (part) => {
    part.log = !part.log;
    part.range = null;
    build(part);
    remark();
  };
  const toggleX = () => {
    state.xlog = !state.xlog;
    state.x = null;
    for (const part of parts) build(part);
    remark();
  };

  const press = (button, on) => button.setAttribute("aria-pressed", on ? "true" : "false");
  const tool = (text, title, click, id) => el("button", { type: "button", title, "data-tool": id, on: { click } }, text);
  const canLog = parts.filter((part) => part.panel.y.log);
  const logButtons = canLog.map((part) => {
    const text = canLog.length > 1 || parts.length > 1 ? `log: ${part.panel.y.label}` : "log";
    return [part, tool(text, "Logarithmic or linear (L)", () => toggleLog(part), "log")];
  });
  const xButton = xAxis.log ? tool(`log ${xAxis.label.toLowerCase()}`, "Logarithmic or linear along (X)", toggleX, "xlog") : null;
  const wholeButton = tool("all", "Show all (0)", whole, "all");
  const tools = el("div", { class: "tools" },
    logButtons.map(([, button]) => button), xButton,
    tool("\u2212", "Zoom out (\u2212)", () => zoom(2), "out"), tool("+", "Zoom in (+)", () => zoom(0.5), "in"), wholeButton,
    csv ? tool("CSV", csv.title, csv.click, "csv") : null,
    tool("SVG", "The drawing as a file, as it is shown", () =>
      download(`${fileName(name)}-${chart.kind}.svg`, svgFile(draw(640)), "image/svg+xml"), "svg"));

  /** What the reader must know of what is shown. */
  const remark = () => {
    for (const [part, button] of logButtons) press(button, part.log);
    if (xButton) press(xButton, state.xlog);
    wholeButton.disabled = !(state.x || parts.some((part) => part.range));
    const list = [...chart.notes];
    if (regions.length > 0) list.push(`layers, front first: ${[...new Set(regions.map((region) => region.name))].join(", ")}`);
    for (const part of parts) {
      const { y, series } = part.panel;
      if (magnitude(part)) list.push(`${y.label}: absolute values are drawn; the reading has the sign`);
      const zeros = part.log ? series.reduce((sum, each) => sum + columns[each.y].reduce((n, v) => n + (v === 0 ? 1 : 0), 0), 0) : 0;
      if (zeros > 0) list.push(`${count(zeros, "value is", "values are")} zero and not on the logarithmic axis`);
      // in the scale of the chart's own choice its notes tell
      if (!part.range && part.log && y.scale !== "Log") {
        const [low] = wholeY(part);
        const below = series.reduce((sum, each) => sum + columns[each.y].reduce((n, v) => n + (v !== 0 && Math.abs(v) < low ? 1 : 0), 0), 0);
        if (below > 0) list.push(`off-scale: ${count(below, "value", "values")} below ${low.toExponential(1).replace("e+", "e")} ${unitText(y.unit)}`);
      }
    }
    if (state.xlog) {
      const lost = parts[0].line.xs.filter((x) => x <= 0).length;
      if (lost > 0) list.push(`${count(lost, "point", "points")} at ${xAxis.label.toLowerCase()} 0 ${lost === 1 ? "is" : "are"} not on the logarithmic axis`);
    }
    if (state.x) list.push(`enlarged: ${xAxis.label.toLowerCase()} from ${Number(state.x[0].toPrecision(4))} to ${amount(Number(state.x[1].toPrecision(4)), xAxis.unit)}`);
    notes.replaceChildren(...[...new Set(list)].map(remarkOf));
  };

  const legend = el("ul", { class: "legend" });
  for (const part of parts) {
    for (const [i, each] of part.panel.series.entries()) {
      const output = el("output", {});
      outputs.push({ part, i, element: output });
      const button = el("button", { type: "button", "aria-pressed": "true", title: "Hide or show this curve", on: { click: () => {
        const hide = !part.hidden.has(i);
        if (hide) part.hidden.add(i);
        else part.hidden.delete(i);
        press(button, !hide);
        part.plot?.setSeries(i + 1, { show: !hide });
        redraw();
      } } }, swatch(each.look, false), el("span", {}, nameOf(part.panel, each)));
      legend.append(el("li", {}, button, output));
    }
  }

  for (const part of parts) {
    part.box.addEventListener("keydown", (event) => {
      if (event.ctrlKey || event.metaKey || event.altKey) return;
      const far = event.shiftKey ? 10 : 1;
      const keys = {
        ArrowRight: () => step(part, far), ArrowLeft: () => step(part, -far),
        Home: () => step(part, -1e9), End: () => step(part, 1e9),
        "+": () => zoom(0.5), "=": () => zoom(0.5), "-": () => zoom(2), 0: whole,
        l: () => part.panel.y.log && toggleLog(part), x: () => xAxis.log && toggleX(), Escape: () => quiet(),
      };
      const act = keys[event.key] || keys[event.key.toLowerCase()];
      if (act) {
        event.preventDefault();
        act();
      }
    });
  }

  /** The plot as a drawing on paper, as it is shown now. */
  const draw = (width, notes = chart.notes) => {
    const colours = PAPER;
    const items = [];
    const title = chart.conditions ? `${name} (${chart.conditions})` : name;
    let top = 26;
    const yMade = parts.map((part) => {
      const range = yRange(part);
      const tall = Math.round(Math.min(Math.max(width * 0.6, 220), 380) * (panels.length > 1 ? part.panel.share : 1));
      return { range, tall, ...ticksOf(part.log, range[0], range[1], Math.max(Math.floor(tall / 40), 3)) };
    });
    const left = Math.max(...yMade.map((made) => roomFor(made.labels)));
    const [from, to] = xRange();
    const inner = width - left - 24;
    const xTicks = ticksOf(state.xlog, from, to, Math.max(Math.floor(inner / 80), 3));
    items.push(label(left, 14, fitText(visible(title), inner, 13), { "font-size": 13, "font-weight": 600, fill: colours.ink }));
    for (const [p, part] of parts.entries()) {
      const made = yMade[p];
      const box = { left, top, width: inner, height: made.tall - 14 };
      const px = placer(state.xlog, from, to, left, left + inner);
      const py = placer(part.log, made.range[0], made.range[1], top + box.height, top);
      const clip = `${key}clip${p}`;
      items.push(svg("clipPath", { id: clip }, svg("rect", { x: left, y: top, width: inner, height: box.height })));
      const inside = [];
      for (const [i, region] of regions.entries()) {
        const a = Math.max(state.xlog && region.from <= 0 ? left : px(region.from), left);
        const b = Math.min(px(region.to), left + inner);
        if (b > a) inside.push(svg("rect", { x: a, y: top, width: b - a, height: box.height, fill: i % 2 === 0 ? colours.layer : colours.other }));
      }
      items.push(svg("g", {}, inside));
      items.push(...frame(box, { ...xTicks, place: px, text: axisText(xAxis, false), shown: p === parts.length - 1 },
        { ticks: made.ticks, labels: made.labels, place: py, text: axisText(part.panel.y, magnitude(part)) }, colours));
      const curves = [];
      for (const [i, each] of part.panel.series.entries()) {
        if (part.hidden.has(i)) continue;
        const list = part.line.at[i].filter((at) => at >= 0);
        const place = (at, of) => {
          const x = columns[each.x][at];
          const v = of[at];
          if (!Number.isFinite(v) || (part.log && v === 0) || (state.xlog && x <= 0)) return null;
          return `${px(x).toFixed(2)},${py(part.log ? Math.abs(v) : v).toFixed(2)}`;
        };
        if (each.look.filled) {
          const up = list.map((at) => place(at, columns[each.y])).filter(Boolean);
          const down = list.toReversed().map((at) => (each.base === null ? `${px(columns[each.x][at]).toFixed(2)},${py(0).toFixed(2)}` : place(at, columns[each.base]))).filter(Boolean);
          if (up.length > 0) curves.push(svg("path", { d: `M${[...up, ...down].join("L")}Z`, fill: fillOf(each.look, true), stroke: "none" }));
          continue;
        }
        let d = "";
        let pen = false;
        for (const at of list) {
          const point = place(at, columns[each.y]);
          if (point !== null) d += (pen ? "L" : "M") + point;
          pen = point !== null;
        }
        if (d) curves.push(svg("path", { d, fill: "none", stroke: colourOf(each.look, true), "stroke-width": 1.75, "stroke-linejoin": "round",
          "stroke-dasharray": DASHES[each.look.dash].join(" ") || null }));
        if (each.look.marks) {
          for (const at of list) {
            const point = place(at, columns[each.y]);
            if (point) curves.push(svg("circle", { cx: point.split(",")[0], cy: point.split(",")[1], r: 2.75, fill: colourOf(each.look, true) }));
          }
        }
      }
      items.push(svg("g", { "clip-path": `url(#${clip})` }, curves));
      if (p === 0) {
        for (const spot of regionLabels(px, left, left + inner, 1)) {
          items.push(label(spot.x, top + 14, spot.text, { "font-size": 11, fill: colours.quiet }));
        }
      }
      for (const marker of part.panel.markers) {
        const x = px(marker.x);
        const y = py(part.log ? Math.abs(marker.y) : marker.y);
        if (!(x >= left && x <= left + inner && y >= top && y <= top + box.height)) continue;
        const right = x + 12 + textWidth(visible(marker.name), 11) < left + inner;
        items.push(svg("circle", { cx: x, cy: y, r: 4, fill: colours.ground, stroke: colours.ink, "stroke-width": 1.5 }));
        items.push(label(right ? x + 8 : x - 8, y - 7, marker.name, { "font-size": 11, fill: colours.ink, "text-anchor": right ? "start" : "end" }));
      }
      top += made.tall + (p === parts.length - 1 ? 0 : 10);
    }
    top += 36;
    // the legend, as many in a row as fit
    let at = left;
    for (const part of parts) {
      for (const [i, each] of part.panel.series.entries()) {
        if (part.hidden.has(i)) continue;
        const text = fitText(visible(nameOf(part.panel, each)), inner - 40, 12);
        const wide = 32 + textWidth(text, 12) + 18;
        if (at + wide > width && at > left) {
          at = left;
          top += 18;
        }
        const look = swatch(each.look, true);
        look.setAttribute("x", at);
        look.setAttribute("y", top - 10);
        items.push(look, label(at + 32, top, text, { fill: colours.ink }));
        at += wide;
      }
    }
    top += 8;
    for (const note of notes) {
      top += 16;
      items.push(label(left, top, fitText(visible(note), inner, 11), { "font-size": 11, fill: colours.quiet }));
    }
    const made = drawing(width, top + 12, `${chart.title} of ${name}`, svg("rect", { width, height: top + 12, fill: colours.ground }), items);
    return made;
  };

  const plots = el("div", { class: "plots" }, parts.map((part) => part.box));
  root.append(el("figcaption", {}, el("span", { class: "title" }, chart.title), tools), plots, el("div", { class: "printed" }), reading, legend, notes);
  quiet();

  let width = 0;
  const watcher = new ResizeObserver(() => {
    const now = parts[0].box.clientWidth;
    if (now === 0 || now === width) return;
    const first = width === 0;
    width = now;
    if (first) {
      for (const part of parts) build(part);
      remark();
    } else {
      for (const part of parts) part.plot.setSize({ width: now, height: height(part, now) + (part === parts.at(-1) ? 0 : -20) });
    }
  });
  watcher.observe(plots);
  return {
    element: root,
    repaint: () => {
      for (const part of parts) part.plot?.redraw(false, true);
      for (const [place, image] of [...legend.querySelectorAll(".swatch")].entries()) {
        const all = parts.flatMap((part) => part.panel.series);
        image.replaceWith(swatch(all[place].look, false));
      }
    },
    print: () => root.querySelector(".printed").replaceChildren(draw(PRINTED, [])),
    end: () => {
      watcher.disconnect();
      for (const part of parts) part.plot?.destroy();
    },
  };
};
