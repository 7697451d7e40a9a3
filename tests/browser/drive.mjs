// Drives a report in a real browser and tells what it sees, as one line of JSON; the tests in Rust judge it.
//
//     EPILOOM_BROWSER=folder with node_modules/playwright-core  EPILOOM_CHROMIUM=program
//     node drive.mjs look PAGE FOLDER | keyboard PAGE | map PAGE | sizes PAGE FOLDER | rows PAGE FOLDER | leaks PAGE | print PAGE FOLDER | watch ADDRESS
//
// Everything that the browser asks of any network goes to a proxy in this process, which answers nothing and keeps count.

import { createRequire } from "node:module";
import { createServer } from "node:http";
import { mkdtempSync, readFileSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join, resolve } from "node:path";
import { pathToFileURL } from "node:url";
import { createInterface } from "node:readline";

const { chromium } = createRequire(`${process.env.EPILOOM_BROWSER}/`)("playwright-core");

// errands of the browser itself; what a page asks for there is seen by the page's own events all the same
const ERRANDS = /^(https?:\/\/)?([\w-]+\.)*(google|googleapis|gstatic)\.com[:/]/;

const FLAGS = ["--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
  "--disable-component-update", "--disable-sync"];

/** A proxy that lets nothing through and writes down what was asked of it. */
const deadEnd = async () => {
  const asked = [];
  const note = (address) => {
    if (!ERRANDS.test(address)) asked.push(address);
  };
  const server = createServer((request, response) => {
    note(request.url);
    response.writeHead(503).end();
  });
  server.on("connect", (request, socket) => {
    note(request.url);
    socket.on("error", () => {});
    socket.end("HTTP/1.1 503 No\r\n\r\n");
  });
  await new Promise((done) => { server.listen(0, "127.0.0.1", done); });
  return { asked, server, port: server.address().port };
};

/** A browser with an empty profile; `bypass`: an address that may be reached. */
const withBrowser = async (act, { colorScheme = "light", viewport = { width: 1200, height: 900 }, bypass } = {}) => {
  const proxy = await deadEnd();
  const folder = mkdtempSync(join(tmpdir(), "epiloom-browser-"));
  // "<-loopback>": addresses of this machine go to the proxy too
  const through = [`--proxy-server=http://127.0.0.1:${proxy.port}`, `--proxy-bypass-list=${bypass ? bypass : "<-loopback>"}`];
  const context = await chromium.launchPersistentContext(join(folder, "profile"), {
    // what the browser leaves behind goes with the folder
    env: { ...process.env, TMPDIR: folder },
    executablePath: process.env.EPILOOM_CHROMIUM,
    headless: true,
    args: [...FLAGS, ...through],
    colorScheme,
    viewport,
    acceptDownloads: true,
  });
  const seen = { console: [], requests: [], asked: proxy.asked, dialogs: 0 };
  context.on("request", (request) => {
    if (!/^(file|blob|data):/.test(request.url())) seen.requests.push(request.url());
  });
  const page = context.pages()[0] ?? (await context.newPage());
  // a machine that does much else must not fail a test
  page.setDefaultTimeout(120000);
  page.on("console", (message) => {
    if (message.type() === "error") seen.console.push(message.text());
  });
  page.on("pageerror", (error) => seen.console.push(String(error)));
  page.on("dialog", (dialog) => {
    seen.dialogs += 1;
    dialog.dismiss();
  });
  try {
    return await act(page, seen);
  } finally {
    await context.close();
    proxy.server.close();
    proxy.server.closeAllConnections();
    rmSync(folder, { recursive: true, force: true, maxRetries: 5 });
  }
};

const ready = (page) => page.waitForFunction(() => document.documentElement.dataset.ready !== undefined);
const open = async (page, file) => {
  await page.goto(pathToFileURL(resolve(file)).href);
  await ready(page);
};

/** What stands under a plot: the place and the number of each curve. */
const readingOf = (figure) => figure.evaluate((root) => ({
  place: root.querySelector(".reading").textContent,
  values: Object.fromEntries([...root.querySelectorAll(".legend li")].map((li) => [li.querySelector("button").textContent, li.querySelector("output").textContent])),
}));

const saved = async (page, folder, name, click) => {
  const [download] = await Promise.all([page.waitForEvent("download"), click()]);
  const path = join(folder, name);
  await download.saveAs(path);
  return { path, suggested: download.suggestedFilename() };
};

/** Plots that show something: canvases on which more than one colour is. */
const empties = (page) => page.evaluate(() => [...document.querySelectorAll(".plot canvas")].filter((canvas) => {
  const pixels = new Uint32Array(canvas.getContext("2d").getImageData(0, 0, canvas.width, canvas.height).data.buffer);
  return new Set(pixels).size < 12;
}).length);

/** Opens a page, points, switches, downloads. */
const look = (file, folder) => withBrowser(async (page, seen) => {
  await open(page, file);
  const told = { title: await page.title(), text: await page.evaluate(() => document.body.innerText) };
  told.scripts = await page.evaluate(() => document.scripts.length);
  told.images = await page.evaluate(() => document.images.length);
  const opened = page.locator(".snapshot.open").first();
  const figure = opened.locator("figure[data-kind=jv]").first();
  await figure.scrollIntoViewIfNeeded();
  const plot = figure.locator(".plot .u-over").first();
  const box = await plot.boundingBox();
  told.hover = [];
  for (const share of [0.2, 0.45, 0.7]) {
    await page.mouse.move(box.x + box.width * share, box.y + box.height * 0.5);
    told.hover.push(await readingOf(figure));
  }
  await page.mouse.move(2, 2);
  const before = await saved(page, folder, "linear.svg", () => figure.locator("[data-tool=svg]").click());
  await figure.locator("[data-tool=log]").click();
  told.pressed = await figure.locator("[data-tool=log]").getAttribute("aria-pressed");
  const after = await saved(page, folder, "log.svg", () => figure.locator("[data-tool=svg]").click());
  told.svg = [readFileSync(before.path, "utf8"), readFileSync(after.path, "utf8")];
  told.notes = await figure.locator(".notes").innerText();
  await figure.locator("[data-tool=log]").click();
  // zoom by dragging, then all again
  await page.mouse.move(box.x + box.width * 0.3, box.y + box.height * 0.5);
  await page.mouse.down();
  await page.mouse.move(box.x + box.width * 0.6, box.y + box.height * 0.5 + 2, { steps: 4 });
  await page.mouse.up();
  told.zoomed = await figure.locator(".notes").innerText();
  await figure.locator("[data-tool=all]").click();
  told.unzoomed = await figure.locator(".notes").innerText();
  const curve = figure.locator(".legend button").first();
  await curve.click();
  told.hidden = await curve.getAttribute("aria-pressed");
  await curve.click();
  told.files = [];
  for (const place of (await page.locator(".snapshot").all()).keys()) {
    const section = page.locator(`#s${place}`);
    if (!(await section.evaluate((each) => each.classList.contains("open")))) await section.locator("h3 button").click();
    const buttons = section.locator("[data-file]");
    for (let i = 0; i < (await buttons.count()); i += 1) {
      const file = await saved(page, folder, `s${place}-${i}.csv`, () => buttons.nth(i).click());
      told.files.push({ snapshot: place, place: i, ...file });
    }
  }
  told.empty = await empties(page);
  // a table sorts and filters
  const table = page.locator("#accuracy .table");
  await table.locator("thead button").nth(2).click();
  told.sorted = await table.locator("tbody tr td:nth-child(3)").allInnerTexts();
  if (await table.locator("input").count()) {
    await table.locator("input").fill("value > 1");
    told.filtered = await table.locator("tbody tr td:nth-child(3)").allInnerTexts();
  }
  return { ...told, seen };
});

/** The same steps without a pointer. */
const keyboard = (file) => withBrowser(async (page, seen) => {
  await open(page, file);
  const told = { visited: [] };
  const focused = () => page.evaluate(() => {
    const at = document.activeElement;
    const visible = at.matches(":focus-visible") && getComputedStyle(at).outlineStyle !== "none";
    return { tag: at.tagName, name: at.className, words: (at.getAttribute("aria-label") || at.textContent || at.placeholder || "").slice(0, 60), visible };
  });
  const until = async (wanted, most = 400) => {
    for (let i = 0; i < most; i += 1) {
      await page.keyboard.press("Tab");
      const at = await focused();
      told.visited.push(at);
      if (wanted(at)) return at;
    }
    return null;
  };
  told.theme = await until((at) => at.name === "theme");
  const paper = await page.evaluate(() => getComputedStyle(document.body).backgroundColor);
  await page.keyboard.press("Enter");
  await page.keyboard.press("Enter");
  told.grounds = [paper, await page.evaluate(() => getComputedStyle(document.body).backgroundColor)];
  told.plot = await until((at) => at.name.split(" ").includes("plot"));
  const figure = page.locator("figure", { has: page.locator(":focus") });
  await page.keyboard.press("ArrowRight");
  const first = await readingOf(figure);
  await page.keyboard.press("ArrowRight");
  const second = await readingOf(figure);
  await page.keyboard.press("End");
  told.steps = [first, second, await readingOf(figure)];
  await page.keyboard.press("l");
  told.log = await figure.locator("[data-tool=log]").first().getAttribute("aria-pressed");
  await page.keyboard.press("+");
  told.zoomed = await figure.locator(".notes").innerText();
  await page.keyboard.press("0");
  told.curve = await until((at) => at.tag === "BUTTON");
  await page.keyboard.press("Space");
  told.hidden = await page.evaluate(() => document.activeElement.getAttribute("aria-pressed"));
  told.fold = await until((at) => at.tag === "SUMMARY");
  await page.keyboard.press("Enter");
  told.unfolded = await page.evaluate(() => document.activeElement.parentElement.open);
  return { ...told, seen };
});

/** Chooses points on the map of a sweep, with the pointer and with keys: what the page shows of them. */
const map = (file) => withBrowser(async (page, seen) => {
  await open(page, file);
  const sweep = page.locator(".sweep").first();
  const cells = sweep.locator(".cell");
  await cells.first().waitFor();
  const shown = async () => ({
    title: await sweep.locator(".point > h4").first().innerText(),
    words: await sweep.locator(".point").innerText(),
    figures: await sweep.locator(".point figure[data-kind]").evaluateAll((all) => all.map((each) => each.dataset.kind)),
  });
  const told = { cells: await cells.count(), points: [] };
  for (const place of [0, (told.cells - 1)]) {
    const cell = cells.nth(place);
    const [label, row] = [await cell.getAttribute("aria-label"), await cell.getAttribute("data-point")];
    await cell.click();
    await sweep.locator(".point figure").first().waitFor();
    told.points.push({ label, row, ...(await shown()) });
  }
  // the chosen cell has the focus: one to the left, by keys
  const before = told.points[1].title;
  await page.keyboard.press("ArrowLeft");
  await page.keyboard.press("Enter");
  await page.waitForFunction((title) => document.querySelector(".sweep .point > h4").textContent !== title, before);
  await sweep.locator(".point figure").first().waitFor();
  told.byKeys = await shown();
  told.empty = await empties(page);
  return { ...told, seen };
});

/** Widths and colours; pictures of each go to the folder. */
const sizes = async (file, folder) => {
  const told = [];
  for (const colorScheme of ["light", "dark"]) {
    await withBrowser(async (page, seen) => {
      await open(page, file);
      for (const width of [400, 1600]) {
        await page.setViewportSize({ width, height: 900 });
        await page.waitForTimeout(250);
        const found = await page.evaluate(() => {
          const plain = (colour) => colour.match(/[\d.]+/g).slice(0, 3).map(Number);
          const light = (colour) => plain(colour).map((v) => v / 255).map((v) => (v <= 0.03928 ? v / 12.92 : ((v + 0.055) / 1.055) ** 2.4))
            .reduce((sum, v, i) => sum + v * [0.2126, 0.7152, 0.0722][i], 0);
          const contrast = (a, b) => (Math.max(light(a), light(b)) + 0.05) / (Math.min(light(a), light(b)) + 0.05);
          const ground = getComputedStyle(document.body).backgroundColor;
          const worst = ["body", ".facts", ".lead", ".kind", ".told", ".reading", ".script .c", ".script .t", ".script .n", ".script .u", ".script .k", ".tools button", "a", ".code"]
            .map((name) => document.querySelector(name)).filter(Boolean).map((each) => [each.className || each.tagName, contrast(getComputedStyle(each).color, ground)])
            .sort((a, b) => a[1] - b[1])[0];
          const wide = [...document.querySelectorAll("main *, header *")].filter((each) => {
            if (each.closest(".scroll, pre, .plot, .drawn, details:not([open])") || each.offsetParent === null) return false;
            const box = each.getBoundingClientRect();
            return box.width > 0 && (box.right > innerWidth + 1 || box.left < -1);
          }).map((each) => `${each.tagName}.${each.className}`).slice(0, 5);
          const plots = [...document.querySelectorAll(".plot .uplot, .drawn svg")].filter((each) => each.getBoundingClientRect().width > 0)
            .map((each) => Math.round(each.getBoundingClientRect().width));
          return { ground, overflow: document.documentElement.scrollWidth - innerWidth, wide, plots, worst };
        });
        await page.screenshot({ path: join(folder, `${colorScheme}-${width}.png`), fullPage: true });
        told.push({ colorScheme, width, ...found, empty: await empties(page), seen });
      }
    }, { colorScheme });
  }
  return told;
};

/** A page of many snapshots: a table that has lost rows. */
const rows = (file, folder) => withBrowser(async (page, seen) => {
  await open(page, file);
  const section = page.locator(".snapshot").last();
  await section.locator("h3 button").click();
  await section.locator("figure").first().waitFor();
  const name = await section.locator(".name").innerText();
  const said = await section.locator(".inside > .note").first().innerText();
  const { path } = await saved(page, folder, "part.csv", () => section.locator("[data-file='0']").click());
  return { rows: await page.locator("#overview tbody tr").count(), name, said, path, seen };
});

/** A page that tries to send something out: what of it arrives. */
const leaks = (file) => withBrowser(async (page, seen) => {
  await page.goto(pathToFileURL(resolve(file)).href);
  await page.waitForTimeout(1200);
  return { acted: await page.evaluate(() => document.documentElement.dataset.acted ?? null), seen };
});

const print = (file, folder) => withBrowser(async (page, seen) => {
  await open(page, file);
  await page.pdf({ path: join(folder, "page.pdf"), format: "A4", printBackground: false });
  return { drawings: await page.evaluate(() => document.querySelectorAll(".printed > svg").length), plots: await page.locator("figure.chart").count(), seen };
}, { colorScheme: "dark" });

/** Follows a run: tells each change, and goes on when a line comes in. */
const watch = (address) => withBrowser(async (page, seen) => {
  const lines = createInterface({ input: process.stdin })[Symbol.asyncIterator]();
  const rows = () => page.evaluate(() => document.querySelectorAll("#overview tbody tr").length);
  const tell = (what) => process.stdout.write(`${JSON.stringify(what)}\n`);
  await page.goto(address);
  await ready(page);
  let before = await rows();
  tell({ rows: before, state: await page.locator("#state").innerText() });
  for (;;) {
    const { value, done } = await lines.next();
    if (done || value === "end") break;
    if (value === "more") {
      await page.waitForFunction((n) => document.querySelectorAll("#overview tbody tr").length > n, before);
      await ready(page);
      before = await rows();
      tell({ rows: before, state: await page.locator("#state").innerText() });
    } else {
      await page.waitForFunction(() => /has ended/.test(document.getElementById("state")?.textContent ?? ""));
      tell({ rows: await rows(), state: await page.locator("#state").innerText(), open: await page.locator(".snapshot.open").count() });
    }
  }
  return { seen: { ...seen, requests: seen.requests.filter((url) => !url.startsWith(address)) } };
}, { bypass: "127.0.0.1" });

const [what, ...rest] = process.argv.slice(2);
const told = await { look, keyboard, map, sizes, rows, leaks, print, watch }[what](...rest);
process.stdout.write(`${JSON.stringify(told)}\n`);
process.exit(0);
