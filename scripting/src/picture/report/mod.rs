//! The report: one archive as one page that stands alone, for whoever is sent it.
//!
//! The page asks nothing of any network, and its content-security policy forbids it to: only the two scripts and the style
//! whose digests the policy names may act. Everything that comes from an archive goes in as escaped text ([`escape`]) or
//! inside a packed block of base64, where no markup can stand.

mod contents;
mod escape;
mod highlight;
mod html;
mod numbers;
mod sweeps;
mod thin;
mod view;

use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;
use serde_json::json;
use sha2::{Digest, Sha256};

use crate::picture::palette;

pub use contents::{Contents, Held};
pub use escape::escape;
pub use sweeps::{HeldPoint, HeldSweep};

/// Version of the plotting library.
pub const UPLOT_VERSION: &str = "1.6.32";

/// Its licence.
pub const UPLOT_LICENCE: &str = include_str!("vendor/uplot/LICENSE");

const UPLOT: &str = include_str!("vendor/uplot/uPlot.iife.min.js");
const UPLOT_STYLE: &str = include_str!("vendor/uplot/uPlot.min.css");
const STYLE: &str = include_str!("page/page.css");

/// The page's own script, in the order in which its parts build on each other.
const SCRIPT: [&str; 10] = [
    include_str!("page/numbers.js"),
    include_str!("page/words.js"),
    include_str!("page/ticks.js"),
    include_str!("page/drawing.js"),
    include_str!("page/tables.js"),
    include_str!("page/curves.js"),
    include_str!("page/bars.js"),
    include_str!("page/map.js"),
    include_str!("page/sweeps.js"),
    include_str!("page/page.js"),
];

/// The size that a page may have: what mail takes without a question.
pub const SIZE: usize = 1_990_000;

/// Fewest rows that a table is thinned to, however large the page stays.
const FEWEST_ROWS: usize = 40;

/// How a page is made.
#[derive(Clone, Copy, Debug)]
pub struct Options {
    /// Bytes that it may have; beyond that, long tables lose rows. None for as many as it takes.
    pub size: Option<usize>,
    /// Whether it asks the server that it came from for news.
    pub watching: bool,
    /// The state of the run that it shows, for a page that asks for news.
    pub version: u64,
}

impl Default for Options {
    fn default() -> Self {
        Options { size: Some(SIZE), watching: false, version: 0 }
    }
}

/// A page, and what had to be left out of it.
#[derive(Clone, Debug)]
pub struct Page {
    /// The whole file.
    pub html: String,
    /// Its content-security policy, for a server's header.
    pub policy: String,
    /// Most rows of a table that it holds, where rows had to be left out.
    pub rows: Option<usize>,
    /// How many tables have lost rows.
    pub thinned: usize,
    /// It holds the snapshots of every so many points of a sweep.
    pub every: usize,
}

/// The packed part of a page.
struct Data {
    meta: String,
    blocks: Vec<String>,
    thinned: usize,
}

impl Data {
    fn length(&self) -> usize {
        // some bytes of markup around each block
        self.meta.len() + self.blocks.iter().map(|block| block.len() + 64).sum::<usize>()
    }
}

/// What a page holds of an archive.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
struct Part {
    /// Most rows of a table.
    rows: usize,
    /// Of the points of sweeps, the snapshots of every so many.
    every: usize,
}

impl Part {
    /// Everything.
    const WHOLE: Part = Part { rows: usize::MAX, every: 1 };
}

/// Makes the page of an archive.
pub fn page(contents: &Contents, options: Options) -> Page {
    let body = html::body(contents);
    let script = format!("\"use strict\";(() => {{\n{}}})();\n", SCRIPT.concat());
    let fixed = body.len() + script.len() + UPLOT.len() + UPLOT_STYLE.len() + STYLE.len() + 4096;
    let (data, part) = fitted(contents, options.size.map(|size| size.saturating_sub(fixed)));
    let policy = policy(&[UPLOT, &script], &[UPLOT_STYLE, STYLE], options.watching);
    let mut html = String::with_capacity(fixed + data.length());
    html.push_str("<!doctype html>\n<html lang=\"en\"><head><meta charset=\"utf-8\">");
    html.push_str(&format!("<meta http-equiv=\"Content-Security-Policy\" content=\"{}\">", escape(&policy)));
    html.push_str("<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">");
    html.push_str(
        "<meta name=\"color-scheme\" content=\"light dark\"><meta name=\"referrer\" content=\"no-referrer\">",
    );
    html.push_str(&format!("<title>{} \u{b7} Epiloom</title>", escape(&html::title(contents))));
    html.push_str(&format!("<style>{UPLOT_STYLE}</style><style>{STYLE}</style></head>"));
    if options.watching {
        html.push_str(&format!("<body data-watching=\"{}\">", options.version));
    } else {
        html.push_str("<body>");
    }
    html.push_str(&body);
    html.push_str(&format!("<script type=\"text/plain\" id=\"records\">{}</script>", data.meta));
    for (place, block) in data.blocks.iter().enumerate() {
        html.push_str(&format!("<script type=\"text/plain\" id=\"block{place}\">{block}</script>"));
    }
    html.push_str(&format!("<script>{UPLOT}</script><script>{script}</script></body></html>\n"));
    Page {
        html,
        policy,
        rows: part.map(|part| part.rows),
        thinned: data.thinned,
        every: part.map_or(1, |part| part.every),
    }
}

/// The packed part with as much as fits into `room` bytes: rows go first, then snapshots of points.
fn fitted(contents: &Contents, room: Option<usize>) -> (Data, Option<Part>) {
    let all = contents.snapshots.iter().chain(&contents.inner);
    let rank = |held: &Held| {
        held.snapshot().map_or_else(Vec::new, |each| each.tables.iter().map(thin::rank).collect())
    };
    let rankings: Vec<Vec<thin::Ranking>> = all.map(rank).collect();
    let whole = data(contents, &rankings, Part::WHOLE);
    let Some(room) = room.filter(|room| whole.length() > *room) else { return (whole, None) };
    let tables = contents
        .snapshots
        .iter()
        .chain(&contents.inner)
        .filter_map(Held::snapshot)
        .flat_map(|each| &each.tables);
    let longest = tables.map(|table| usize::try_from(table.rows).unwrap_or(usize::MAX)).max().unwrap_or(0);
    let mut part = Part { rows: FEWEST_ROWS.min(longest), every: 1 };
    let mut best = data(contents, &rankings, part);
    while best.length() > room && part.every < contents.inner.len() {
        part.every *= 2;
        best = data(contents, &rankings, part);
    }
    if best.length() > room {
        // what is left cannot be thinned
        return (best, Some(part));
    }
    // the most rows that fit lie between these; the length grows nearly in proportion to them
    let (mut high, mut too_long) = (longest.max(FEWEST_ROWS), whole.length());
    while high > part.rows + 1 + part.rows / 16 {
        let share = (room - best.length()) as f64 / (too_long - best.length()).max(1) as f64;
        let guess = part.rows + (0.97 * share * (high - part.rows) as f64) as usize;
        let trial = Part { rows: guess.clamp(part.rows + 1, high - 1), ..part };
        let made = data(contents, &rankings, trial);
        if made.length() <= room {
            // a page that is nearly full is full enough
            let full = made.length() + room / 32 > room;
            part = trial;
            best = made;
            if full {
                break;
            }
        } else {
            too_long = made.length();
            high = trial.rows;
        }
    }
    (best, Some(part))
}

fn data(contents: &Contents, rankings: &[Vec<thin::Ranking>], part: Part) -> Data {
    let mut shared = view::Shared::default();
    let (mut snapshots, mut blocks, mut thinned) = (Vec::new(), Vec::new(), 0);
    let mut add = |held: &Held, rankings: &[thin::Ranking]| {
        match held {
            Held::Whole(snapshot) => {
                let view = view::snapshot(snapshot, rankings, part.rows, &mut shared);
                snapshots.push(view.json);
                blocks.push(view.block);
                thinned += view.thinned;
            }
            Held::Damaged { label, reason } => {
                snapshots.push(json!({ "name": label.name, "kind": label.kind, "damaged": reason }));
                blocks.push(String::new());
            }
        }
        snapshots.len() - 1
    };
    for (held, rankings) in contents.snapshots.iter().zip(rankings) {
        add(held, rankings);
    }
    let inner = &rankings[contents.snapshots.len()..];
    let mut places = vec![None; contents.inner.len()];
    for sweep in &contents.sweeps {
        for point in sweep.points.iter().step_by(part.every) {
            for at in &point.snapshots {
                places[*at] = Some(add(&contents.inner[*at], &inner[*at]));
            }
        }
    }
    let mut sweeps = Vec::new();
    for sweep in &contents.sweeps {
        let (mut json, block) = sweep.view(|at| places[at]);
        json["block"] = json!(blocks.len());
        blocks.push(block);
        sweeps.push(json);
    }
    let meta = json!({
        "file": contents.file,
        "finished": contents.finished,
        "palette": { "light": palette::CURVES, "dark": palette::CURVES_ON_DARK },
        "listed": contents.snapshots.len(),
        "snapshots": snapshots,
        "sweeps": sweeps,
        "shared": shared.json(),
    });
    Data { meta: numbers::pack(meta.to_string().as_bytes()), blocks, thinned }
}

/// The policy that lets these scripts and styles act, and nothing else; no request may leave.
fn policy(scripts: &[&str], styles: &[&str], watching: bool) -> String {
    let digests = |texts: &[&str]| {
        let each = texts.iter().map(|text| format!("'sha256-{}'", STANDARD.encode(Sha256::digest(text))));
        each.collect::<Vec<_>>().join(" ")
    };
    let news = if watching { " connect-src 'self';" } else { "" };
    format!(
        "default-src 'none'; script-src {}; style-src {};{news} base-uri 'none'; form-action 'none'",
        digests(scripts),
        digests(styles)
    )
}

#[cfg(test)]
mod tests;
