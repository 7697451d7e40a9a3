// Bars: accounts that lose length from stage to stage, and how often values occur.

/** A figure whose drawing is made anew for each width; `draw(width, paper)` gives an SVG element. */
const drawnFigure = (chart, { name, csv, draw, legend }) => {
  const plot = el("div", { class: "drawn" });
  const reading = el("p", { class: "reading", "aria-live": "polite" }, "\u00a0");
  const tell = (text) => {
    reading.textContent = text ? visible(text) : "\u00a0";
  };
  const tools = el("div", { class: "tools" },
    csv ? el("button", { type: "button", title: csv.title, "data-tool": "csv", on: { click: csv.click } }, "CSV") : null,
    el("button", { type: "button", title: "The drawing as a file", "data-tool": "svg", on: { click: () =>
      download(`${fileName(name)}-${chart.kind}.svg`, svgFile(draw(640, true, () => {})), "image/svg+xml") } }, "SVG"));
  const notes = el("div", { class: "notes" }, chart.notes.map(remarkOf));
  const root = el("figure", { class: "chart", "data-kind": chart.kind }, el("figcaption", {}, el("span", { class: "title" }, chart.title), tools),
    plot, el("div", { class: "printed" }), reading, legend, notes);
  let width = 0;
  const paint = () => {
    if (width > 0) plot.replaceChildren(draw(width, false, tell));
  };
  const watcher = new ResizeObserver(() => {
    const now = Math.floor(plot.clientWidth);
    if (now === 0 || now === width) return;
    width = now;
    paint();
  });
  watcher.observe(plot);
  return {
    element: root,
    repaint: paint,
    print: () => root.querySelector(".printed").replaceChildren(draw(PRINTED, true, () => {})),
    end: () => watcher.disconnect(),
  };
};

/** The colour of a bar by what it is. */
const barColour = (role, paper) => {
  const colours = isNight() && !paper ? palette.dark : palette.light;
  return { income: theme(paper).quiet, loss: colours[1], gain: colours[2], left: colours[0] }[role];
};

const barsFigure = (chart, columns, context) => {
  const stages = chart.body.bars;
  const draw = (width, paper, tell) => {
    const colours = theme(paper);
    const items = [];
    const names = stages.flatMap((stage) => stage.bars.map((bar) => visible(bar.name)));
    const numbers = Math.max(...stages.flatMap((stage) => stage.bars.map((bar) => textWidth(shownBar(bar), 12))), 40);
    // where names would be cut they stand above their bars
    const widest = Math.max(...names.map((text) => textWidth(text, 12))) + 10;
    const above = widest > width * 0.42;
    const left = above ? 0 : widest;
    const right = width - numbers - 10;
    const high = above ? 38 : 20;
    let top = 6;
    for (const stage of stages) {
      const [low, high] = stage.axis.range;
      const px = placer(false, Math.min(low, 0), high, left, right);
      const unit = stage.axis.unit ? ` / ${unitText(stage.axis.unit)}` : "";
      items.push(label(0, top + 12, `${stage.title}${unit}`, { "font-weight": 600, fill: colours.ink }));
      top += 20;
      let before = null;
      for (const bar of stage.bars) {
        const [a, b] = [px(Math.min(bar.from, bar.to)), px(Math.max(bar.from, bar.to))];
        if (before !== null) items.push(svg("line", { x1: before, x2: before, y1: top - 5, y2: top + high - 5, stroke: colours.line, "stroke-width": 1 }));
        const words = `${bar.name}: ${amount(bar.value, stage.axis.unit)}${bar.share ? ` (${bar.share})` : ""}`;
        const shape = svg("rect", { x: a, y: top + (above ? 17 : 0), width: Math.max(b - a, 1), height: 15, fill: barColour(bar.role, paper), rx: 1, tabindex: paper ? null : 0,
          role: paper ? null : "listitem", "aria-label": paper ? null : visible(words),
          on: { pointerenter: () => tell(words), pointerleave: () => tell(""), focus: () => tell(words), blur: () => tell("") } }, svg("title", {}, words));
        items.push(above ? label(0, top + 12, fitText(visible(bar.name), width, 12), { fill: colours.ink })
          : label(left - 8, top + 12, visible(bar.name), { "text-anchor": "end", fill: colours.ink }));
        items.push(shape, label(right + 8, top + (above ? 29 : 12), shownBar(bar), { fill: colours.quiet }));
        before = px(bar.to);
        top += high;
      }
      top += 12;
    }
    return drawing(width, top, `${chart.title} of ${context.name}`, paper ? svg("rect", { width, height: top, fill: colours.ground }) : null,
      svg("g", { role: paper ? null : "list" }, items));
  };
  return drawnFigure(chart, { ...context, draw });
};

/** A bar's value and share, short. */
const shownBar = (bar) => (bar.share ? `${bar.shown}  ${bar.share}` : bar.shown);

const histogramFigure = (chart, columns, context) => {
  const { x: xAxis, groups } = chart.body.histogram;
  const draw = (width, paper, tell) => {
    const colours = theme(paper);
    const height = Math.round(Math.min(Math.max(width * 0.6, 230), 360));
    const edges = groups.flatMap((group) => group.edges);
    const [from, to] = [Math.min(...edges), Math.max(...edges)];
    const most = Math.max(...groups.flatMap((group) => group.counts), 1);
    const y = ticksOf(false, 0, most * 1.06, 5);
    const whole = { ...y, ticks: y.ticks.filter(Number.isInteger), labels: y.labels.filter((_, i) => Number.isInteger(y.ticks[i])) };
    const left = roomFor(whole.labels);
    const box = { left, top: 12, width: width - left - 14, height: height - 60 };
    const px = placer(false, from, to, box.left, box.left + box.width);
    const py = placer(false, 0, most * 1.06, box.top + box.height, box.top);
    const x = ticksOf(false, from, to, Math.max(Math.floor(box.width / 80), 3));
    const items = frame(box, { ...x, place: px, text: axisText(xAxis, false) }, { ...whole, place: py, text: "Count" }, colours);
    for (const group of groups) {
      for (const [i, n] of group.counts.entries()) {
        const words = `${n} of ${group.counts.reduce((a, b) => a + b, 0)}: ${amount(group.edges[i], "")} to ${amount(group.edges[i + 1], xAxis.unit)}`;
        const a = px(group.edges[i]);
        items.push(svg("rect", { x: a + 0.5, y: py(n), width: Math.max(px(group.edges[i + 1]) - a - 1, 0.5), height: py(0) - py(n),
          fill: fillOf({ ...group.look, filled: true }, paper), stroke: colourOf(group.look, paper), tabindex: paper || n === 0 ? null : 0,
          on: { pointerenter: () => tell(words), pointerleave: () => tell(""), focus: () => tell(words), blur: () => tell("") } }, svg("title", {}, words)));
      }
      for (const [place, value] of group.quantiles.entries()) {
        if (!Number.isFinite(value)) continue;
        items.push(svg("line", { x1: px(value), x2: px(value), y1: box.top, y2: box.top + box.height, stroke: colours.ink,
          "stroke-width": 1, "stroke-dasharray": place === 0 ? null : "4 3" }));
      }
    }
    return drawing(width, height, `${chart.title} of ${context.name}`, paper ? svg("rect", { width, height, fill: colours.ground }) : null, items);
  };
  const legend = el("ul", { class: "facts" }, groups.map((group) => el("li", {},
    `${group.name ? `${group.name}: ` : ""}median ${amount(group.quantiles[0], xAxis.unit)}, 5 % below ${digits(group.quantiles[1])}, 95 % below ${digits(group.quantiles[2])}, mean ${digits(group.mean)}`)));
  return drawnFigure(chart, { ...context, draw, legend });
};
