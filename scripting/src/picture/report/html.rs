//! The parts of the page that stand in it as plain markup: they show before the page's script has run, and without it.

use std::collections::BTreeMap;
use std::fmt::Write;

use crate::archive::{Figure, RunHeader, Status, Value};
use crate::figure_text::{significant, unit_symbol};
use crate::record_text::{figure_title, figure_value, value_text};

use super::contents::{Contents, Held};
use super::escape::escape;
use super::highlight::pieces;
use super::sweeps::HeldSweep;

/// Most columns of figures in the list of snapshots.
const MOST_FIGURES: usize = 8;

/// The title of the page: the script without its ending.
pub(super) fn title(contents: &Contents) -> String {
    let name = contents.run.as_ref().map_or(contents.file.as_str(), |run| run.script_name.as_str());
    name.strip_suffix(".rhai").unwrap_or(name).to_string()
}

/// The first line of the comment that a script begins with.
fn headline(run: &RunHeader) -> Option<&str> {
    let first = run.script_text.lines().find(|line| !line.trim().is_empty())?;
    let words = first.trim().strip_prefix("//")?.trim_start_matches(['/', '!']).trim();
    (!words.is_empty()).then_some(words)
}

/// Everything between the page's masthead and its end that is plain markup.
pub(super) fn body(contents: &Contents) -> String {
    let mut out = String::new();
    masthead(contents, &mut out);
    let warnings = warnings(contents);
    out.push_str("<div class=\"frame\"><nav id=\"contents\" aria-label=\"Contents\"><ol>");
    let mut sections = vec![("overview", "Results"), ("sweeps", "Sweeps"), ("snapshots", "Snapshots")];
    if !warnings.is_empty() {
        sections.push(("warnings", "Warnings"));
    }
    sections.extend([
        ("accuracy", "Numerical error"),
        ("materials", "Materials"),
        ("script", "Script and inputs"),
        ("replay", "Replay and versions"),
    ]);
    for (id, words) in sections {
        let absent = (id == "sweeps" && contents.sweeps.is_empty())
            || (id == "snapshots" && contents.snapshots.is_empty());
        if absent {
            continue;
        }
        let _ = write!(out, "<li><a href=\"#{id}\">{words}</a></li>");
    }
    out.push_str("</ol></nav><main>");
    overview(contents, &mut out);
    if !contents.sweeps.is_empty() {
        out.push_str("<section id=\"sweeps\"><h2>Sweeps</h2></section>");
    }
    let hidden = if contents.snapshots.is_empty() { " hidden" } else { "" };
    let _ = write!(
        out,
        "<section id=\"snapshots\"{hidden}><h2>Snapshots</h2><noscript><p class=\"note\">Plots, ledgers, tables and materials are \
         drawn by the script of this page, which this viewer does not run. Open the file in a browser.</p></noscript>\
         </section>",
    );
    out.push_str(&warnings);
    out.push_str("<section id=\"accuracy\"><h2>Numerical error</h2>");
    if let Some(run) = &contents.run {
        tolerances(run, &mut out);
    }
    out.push_str("</section><section id=\"materials\"><h2>Materials</h2></section>");
    script(contents, &mut out);
    replay(contents, &mut out);
    out.push_str("</main></div>");
    out
}

fn masthead(contents: &Contents, out: &mut String) {
    let _ = write!(out, "<header class=\"masthead\"><h1>{}</h1>", escape(&title(contents)));
    if let Some(words) = contents.run.as_ref().and_then(headline) {
        let _ = write!(out, "<p class=\"headline\">{}</p>", escape(words));
    }
    let count = contents.snapshots.len();
    let snapshots = if count == 1 { "1 snapshot".to_string() } else { format!("{count} snapshots") };
    let mut facts = Vec::new();
    for sweep in &contents.sweeps {
        let count = sweep.points.len();
        let points = if count == 1 { "1 point".to_string() } else { format!("{count} points") };
        // what the run will reach: its share of the plan, less what the filter leaves out where that is known
        let planned = sweep
            .planned
            .filter(|planned| !contents.finished && sweep.share.is_none() && *planned > count as u64);
        let of = planned.map_or_else(String::new, |planned| format!(" of {planned}"));
        facts.push(format!("sweep {}: {points}{of}", sweep.name));
    }
    if count > 0 || facts.is_empty() {
        facts.push(snapshots);
    }
    let failed = contents.snapshots.iter().filter(|held| held.status() != Status::Solved).count()
        + contents.sweeps.iter().map(HeldSweep::failed).sum::<usize>();
    if failed > 0 {
        facts.push(format!("{failed} failed"));
    }
    if let Some(run) = &contents.run {
        let changed = run.inputs.values().filter(|input| input.overridden).count();
        if changed > 0 {
            let word = if changed == 1 { "input" } else { "inputs" };
            facts.push(format!("{changed} {word} set from outside"));
        }
        facts.push(format!("Epiloom {}", run.program_version));
    }
    let _ = write!(out, "<p class=\"facts\">{}</p>", escape(&facts.join(" \u{b7} ")));
    if !contents.finished {
        let _ = write!(
            out,
            "<p class=\"state\" id=\"state\" role=\"status\">{}</p>",
            escape("The run has not ended: these are the snapshots that are finished.")
        );
    }
    for trouble in &contents.troubles {
        let _ = write!(out, "<p class=\"trouble\">{}</p>", escape(trouble));
    }
    out.push_str("</header>");
}

/// The figures that the list of snapshots shows: those that most snapshots have.
fn chosen_figures(contents: &Contents) -> Vec<String> {
    let mut found: Vec<(String, usize)> = Vec::new();
    let mut places: BTreeMap<String, usize> = BTreeMap::new();
    for figure in contents.whole().flat_map(|snapshot| &snapshot.figures) {
        let place = *places.entry(figure.name.clone()).or_insert_with(|| {
            found.push((figure.name.clone(), 0));
            found.len() - 1
        });
        found[place].1 += 1;
    }
    // stable: as they come among equals
    found.sort_by_key(|(_, count)| std::cmp::Reverse(*count));
    found.truncate(MOST_FIGURES);
    found.into_iter().map(|(name, _)| name).collect()
}

/// The short name at the head of a column.
fn short(name: &str) -> String {
    match name {
        "jsc" => "Jsc".to_string(),
        "voc" => "Voc".to_string(),
        "ff" => "FF".to_string(),
        "mpp_voltage" => "V at max. power".to_string(),
        "mpp_current" | "mpp_current_density" => "J at max. power".to_string(),
        other => other.replace('_', " "),
    }
}

fn overview(contents: &Contents, out: &mut String) {
    out.push_str("<section id=\"overview\"><h2>Results</h2>");
    if contents.snapshots.is_empty() {
        let words = if contents.sweeps.is_empty() {
            "No snapshot is stored yet."
        } else {
            "All results are in the sweeps below."
        };
        let _ = write!(out, "<p class=\"note\">{words}</p></section>");
        return;
    }
    let names = chosen_figures(contents);
    out.push_str("<div class=\"scroll\"><table class=\"sortable\" data-name=\"results\"><thead><tr><th>snapshot</th><th>kind</th>");
    for name in &names {
        let _ = write!(
            out,
            "<th class=\"number\" title=\"{}\">{}</th>",
            escape(&figure_title(name)),
            escape(&short(name))
        );
    }
    out.push_str("</tr></thead><tbody>");
    for (place, held) in contents.snapshots.iter().enumerate() {
        let label = held.label();
        let _ = write!(
            out,
            "<tr><th scope=\"row\"><a href=\"#s{place}\">{}</a></th><td>{}",
            escape(&label.name),
            escape(&label.kind)
        );
        match (held, &label.status) {
            (Held::Damaged { reason, .. }, _) => {
                let _ = write!(out, " <strong class=\"bad\">damaged: {}</strong>", escape(reason));
            }
            (_, Status::Failed { reason }) => {
                let _ = write!(out, " <strong class=\"bad\" title=\"{}\">failed</strong>", escape(reason));
            }
            _ => {}
        }
        out.push_str("</td>");
        for name in &names {
            cell(held.snapshot().and_then(|snapshot| snapshot.figure(name)), out);
        }
        out.push_str("</tr>");
    }
    out.push_str("</tbody></table></div></section>");
}

/// A cell with a figure: rounded to its error, the whole number for whoever points at it and for sorting.
fn cell(figure: Option<&Figure>, out: &mut String) {
    let Some(figure) = figure else {
        out.push_str("<td class=\"number none\"></td>");
        return;
    };
    let shown = figure_value(figure);
    match figure.value {
        Some(value) => {
            let exact = exact(&Value::number(value, figure.unit.clone()));
            let short = shown.split(" +- ").next().unwrap_or(&shown).replace("/cm2", "/cm\u{b2}");
            let _ = write!(
                out,
                "<td class=\"number\" data-sort=\"{value:?}\" title=\"{} ({})\">{}</td>",
                escape(&exact),
                escape(&shown),
                escape(&short)
            );
        }
        None => {
            let _ = write!(out, "<td class=\"number none\" title=\"{}\">none</td>", escape(&shown));
        }
    }
}

/// A value with all its digits.
fn exact(value: &Value) -> String {
    match value {
        Value::Number { value, unit } => {
            format!("{} {}", significant(*value, 17), unit_symbol(unit)).trim_end().to_string()
        }
        other => value_text(other),
    }
}

/// Every warning once, with the snapshots that it stands on; empty without any.
fn warnings(contents: &Contents) -> String {
    let mut order: Vec<(&str, Vec<usize>)> = Vec::new();
    let mut places: BTreeMap<&str, usize> = BTreeMap::new();
    for (snapshot, held) in contents.snapshots.iter().enumerate() {
        for warning in held.snapshot().map(|each| each.warnings.as_slice()).unwrap_or_default() {
            let place = *places.entry(warning).or_insert_with(|| {
                order.push((warning, Vec::new()));
                order.len() - 1
            });
            order[place].1.push(snapshot);
        }
    }
    if order.is_empty() {
        return String::new();
    }
    let mut out = String::from("<section id=\"warnings\"><h2>Warnings</h2><ul class=\"warnings\">");
    for (warning, on) in order {
        let (code, words) = match warning.strip_prefix('[').and_then(|rest| rest.split_once("] ")) {
            Some((code, words)) => (code, words),
            None => ("", warning),
        };
        let _ = write!(out, "<li><span class=\"code\">{}</span> {}", escape(code), escape(words));
        let names = on.iter().map(|place| {
            let name = &contents.snapshots[*place].label().name;
            format!("<a href=\"#s{place}\">{}</a>", escape(name))
        });
        let where_to = if on.len() == contents.snapshots.len() && on.len() > 1 {
            "all snapshots".to_string()
        } else {
            names.collect::<Vec<_>>().join(", ")
        };
        let _ = write!(out, " <span class=\"where\">{where_to}</span></li>");
    }
    out.push_str("</ul></section>");
    out
}

fn pairs<'a>(rows: impl Iterator<Item = (&'a str, String)>, out: &mut String) {
    out.push_str("<dl class=\"pairs\">");
    for (name, value) in rows {
        let _ = write!(out, "<div><dt>{}</dt><dd>{}</dd></div>", escape(name), escape(&value));
    }
    out.push_str("</dl>");
}

fn tolerances(run: &RunHeader, out: &mut String) {
    if !run.tolerances.is_empty() {
        pairs(run.tolerances.iter().map(|each| (each.name.as_str(), value_text(&each.value))), out);
    }
}

fn script(contents: &Contents, out: &mut String) {
    out.push_str("<section id=\"script\"><h2>Script and inputs</h2>");
    let Some(run) = &contents.run else {
        out.push_str("<p class=\"trouble\">The description of the run is damaged.</p></section>");
        return;
    };
    if run.inputs.is_empty() {
        out.push_str("<p class=\"note\">The script declares no inputs.</p>");
    } else {
        out.push_str(
            "<div class=\"scroll\"><table class=\"sortable\" data-name=\"inputs\"><thead><tr><th>input</th><th>used</th>\
             <th>in the script</th><th>set from outside</th></tr></thead><tbody>",
        );
        for (name, input) in &run.inputs {
            let _ = write!(
                out,
                "<tr><th scope=\"row\">{}</th><td>{}</td><td>{}</td><td>{}</td></tr>",
                escape(name),
                escape(&exact(&input.used)),
                escape(&exact(&input.default)),
                if input.overridden { "yes" } else { "no" }
            );
        }
        out.push_str("</tbody></table></div>");
    }
    if !run.data_files.is_empty() {
        out.push_str(
            "<h3>Data files</h3><div class=\"scroll\"><table class=\"sortable\" data-name=\"data files\"><thead><tr>\
             <th>file</th><th class=\"number\">bytes</th><th>BLAKE3</th></tr></thead><tbody>",
        );
        for (name, file) in &run.data_files {
            let _ = write!(
                out,
                "<tr><th scope=\"row\">{}</th><td class=\"number\" data-sort=\"{1}\">{1}</td><td class=\"digest\">{2}</td></tr>",
                escape(name),
                file.length,
                escape(&file.blake3)
            );
        }
        out.push_str("</tbody></table></div>");
    }
    let _ = write!(
        out,
        "<h3>{}</h3><pre class=\"script\" tabindex=\"0\" aria-label=\"Text of the script\"><code>",
        escape(&run.script_name)
    );
    let text = run.script_text.replace("\r\n", "\n");
    out.push_str("<span class=\"line\">");
    for (class, piece) in pieces(text.strip_suffix('\n').unwrap_or(&text)) {
        for (index, part) in piece.split('\n').enumerate() {
            if index > 0 {
                out.push_str("\n</span><span class=\"line\">");
            }
            match class.style() {
                Some(style) if !part.is_empty() => {
                    let _ = write!(out, "<span class=\"{style}\">{}</span>", escape(part));
                }
                _ => out.push_str(&escape(part)),
            }
        }
    }
    out.push_str("</span></code></pre></section>");
}

fn replay(contents: &Contents, out: &mut String) {
    let file = shell_word(&contents.file);
    out.push_str("<section id=\"replay\"><h2>Replay and versions</h2>");
    out.push_str(
        "<p>The archive holds the script, its inputs and the digests of its data files. This command runs it again and \
         compares every number, bit by bit:</p>",
    );
    let _ = write!(out, "<pre class=\"command\"><code>epiloom replay {}</code></pre>", escape(&file));
    if let Some(run) = &contents.run {
        if !run.data_files.is_empty() {
            out.push_str("<p>It reads the data files again and says so where their digests differ.</p>");
        }
        let mut command = format!("epiloom run {}", shell_word(&run.script_name));
        for (name, input) in run.inputs.iter().filter(|(_, input)| input.overridden) {
            let value = match &input.used {
                Value::Number { value, unit } => format!("{value:?}{unit}"),
                other => other.to_string(),
            };
            let value = if matches!(&input.used, Value::Flag(true)) { "true".to_string() } else { value };
            let value = if matches!(&input.used, Value::Flag(false)) { "false".to_string() } else { value };
            let _ = write!(command, " --set {}", shell_word(&format!("{name}={value}")));
        }
        let _ = write!(
            out,
            "<p>The same run from the script:</p><pre class=\"command\"><code>{}</code></pre>",
            escape(&command)
        );
    }
    out.push_str("<p>One snapshot as a file, with every digit:</p>");
    let first = contents.snapshots.first().map_or("SNAPSHOT", |held| held.label().name.as_str());
    let _ = write!(
        out,
        "<pre class=\"command\"><code>epiloom export {} {} --to csv --out snapshot.csv</code></pre>",
        escape(&file),
        escape(&shell_word(first))
    );
    let version = contents.run.as_ref().map_or("unknown", |run| run.program_version.as_str());
    let rows = [
        ("run by", format!("Epiloom {version}")),
        ("page by", format!("Epiloom {}", env!("CARGO_PKG_VERSION"))),
        ("plots by", format!("uPlot {} (MIT)", super::UPLOT_VERSION)),
        ("colours of curves", crate::picture::palette::SOURCE.to_string()),
        ("archive", contents.file.clone()),
    ];
    pairs(rows.into_iter(), out);
    let _ = write!(
        out,
        "<details><summary>Licence of uPlot</summary><pre class=\"licence\">{}</pre></details></section>",
        escape(super::UPLOT_LICENCE)
    );
}

/// A word as a shell takes it: in quotes where it needs them.
fn shell_word(word: &str) -> String {
    let plain = |c: char| c.is_ascii_alphanumeric() || "._-/=+,:@".contains(c);
    if !word.is_empty() && word.chars().all(plain) && !word.starts_with('-') {
        return word.to_string();
    }
    format!("'{}'", word.replace('\'', "'\\''"))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the quoting rules of the POSIX shell, by hand.
    #[test]
    fn words_for_a_shell_are_quoted_where_they_need_it() {
        assert_eq!(shell_word("a_b.epiloom"), "a_b.epiloom");
        assert_eq!(shell_word("light J-V"), "'light J-V'");
        assert_eq!(shell_word("it's $x"), "'it'\\''s $x'");
        assert_eq!(shell_word(""), "''");
    }
}
