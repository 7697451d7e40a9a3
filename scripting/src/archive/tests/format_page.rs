//! `FORMAT.md` against the code: its tables are generated here, and a drift fails the test.

use std::fmt::Write;

use crate::archive::blocks::{BlockLabel, PointBlock, PointColumn, RowSnapshot, RowTexts};
use crate::archive::encoding::{BlockPlace, Index, IndexEntry, SweepPlace};
use crate::archive::layout::*;
use crate::archive::model::*;
use crate::archive::{Share, SweepColumn, SweepRecord, SweepStart};

const PAGE: &str = concat!(env!("CARGO_MANIFEST_DIR"), "/FORMAT.md");

/// The page is the document of the format; its tables are compared with those made from the constants and
/// records that the code encodes with. `EPILOOM_WRITE_DOCS=1` rewrites them.
#[test]
fn the_tables_of_the_format_page_are_those_of_the_code() {
    let page = std::fs::read_to_string(PAGE).unwrap();
    let mut rewritten = page.clone();
    for (name, table) in tables() {
        let open = format!("<!-- generated: {name} -->\n");
        let begin = rewritten.find(&open).unwrap_or_else(|| panic!("no place for `{name}` in FORMAT.md"));
        let begin = begin + open.len();
        let end = begin + rewritten[begin..].find("<!-- end -->").unwrap();
        rewritten.replace_range(begin..end, &table);
    }
    assert_eq!(
        page.matches("<!-- generated: ").count(),
        tables().len(),
        "a table that the code does not make"
    );
    if page != rewritten && std::env::var_os("EPILOOM_WRITE_DOCS").is_some() {
        std::fs::write(PAGE, &rewritten).unwrap();
        return;
    }
    assert!(
        page == rewritten,
        "FORMAT.md has drifted; EPILOOM_WRITE_DOCS=1 cargo test -p epiloom rewrites it"
    );
}

fn tables() -> Vec<(&'static str, String)> {
    vec![
        ("constants", constants()),
        ("start", start_table()),
        ("header", header_table()),
        ("footer", footer_table()),
        ("kinds", kinds()),
        ("unions", unions()),
        ("records", records()),
    ]
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02X}")).collect::<Vec<_>>().join(" ")
}

fn constants() -> String {
    let mut out = "\n| constant | value |\n|---|---|\n".to_owned();
    for (name, value) in [
        ("first 8 bytes of a file", hex(&MAGIC)),
        ("first 8 bytes of a frame", hex(&FRAME_MAGIC)),
        ("first 8 bytes of the footer", hex(&FOOTER_MAGIC)),
        ("container version", CONTAINER_VERSION.to_string()),
        ("length of the start", START_LENGTH.to_string()),
        ("length of a frame header", HEADER_LENGTH.to_string()),
        ("length of the footer", FOOTER_LENGTH.to_string()),
        ("length of a digest", DIGEST_LENGTH.to_string()),
        ("longest label", LABEL_LIMIT.to_string()),
    ] {
        writeln!(out, "| {name} | {value} |").unwrap();
    }
    out.push('\n');
    out
}

/// One row a field, each ending where the next begins; the last one ends at `length`.
fn fields(length: usize, rows: &[(usize, &str, &str)]) -> String {
    let mut out = "\n| offset | bytes | type | meaning |\n|---|---|---|---|\n".to_owned();
    for (place, (offset, kind, meaning)) in rows.iter().enumerate() {
        let next = rows.get(place + 1).map_or(length, |row| row.0);
        writeln!(out, "| {offset} | {} | {kind} | {meaning} |", next - offset).unwrap();
    }
    out.push('\n');
    out
}

fn start_table() -> String {
    fields(
        START_LENGTH,
        &[
            (start::MAGIC, "bytes", "the magic"),
            (start::VERSION, "u32", "container version"),
            (start::ZERO, "bytes", "zero"),
            (start::DIGEST, "digest", "of all bytes before it"),
        ],
    )
}

fn header_table() -> String {
    fields(
        HEADER_LENGTH,
        &[
            (header::MAGIC, "bytes", "the magic of a frame"),
            (header::KIND, "u16", "kind"),
            (header::SCHEMA, "u16", "schema of the payload"),
            (header::LABEL, "u32", "length of the label without padding"),
            (header::PAYLOAD, "u64", "length of the payload without padding"),
            (header::NUMBERS, "u64", "count of f64 numbers in the number block"),
            (header::ORDINAL, "u64", "number of the frame in the file, from 0"),
            (header::RUN, "digest", "the run: the body digest of frame 0 of the same file"),
            (header::LABEL_DIGEST, "digest", "of the padded label"),
            (header::BODY_DIGEST, "digest", "of the padded payload and the number block, together"),
            (header::DIGEST, "digest", "of all header bytes before it"),
        ],
    )
}

fn footer_table() -> String {
    fields(
        FOOTER_LENGTH,
        &[
            (footer::MAGIC, "bytes", "the magic of the footer"),
            (footer::INDEX, "u64", "where the index frame begins"),
            (footer::LENGTH, "u64", "length of the whole file, footer included"),
            (footer::SNAPSHOTS, "u64", "number of snapshots"),
            (footer::INDEX_DIGEST, "digest", "the last 16 bytes of the header of the index frame"),
            (footer::DIGEST, "digest", "of all footer bytes before it"),
        ],
    )
}

fn kinds() -> String {
    let mut out =
        "\n| kind | schema | holds | label | payload | longest payload |\n|---|---|---|---|---|---|\n"
            .to_owned();
    for kind in Kind::ALL {
        let (holds, label, payload) = match kind {
            Kind::Run => ("the description of the run", "none", "RunHeader"),
            Kind::Snapshot => ("one snapshot", "Label", "Snapshot"),
            Kind::Index => ("the index of a finished file", "none", "Index"),
            Kind::Sweep => ("the description of a sweep", "text: its name", "SweepRecord"),
            Kind::Points => ("points of a sweep", "BlockLabel", "PointBlock"),
        };
        let (number, schema, limit) = (kind.number(), kind.schema(), kind.payload_limit());
        writeln!(out, "| {number} | {schema} | {holds} | {label} | {payload} | {limit} |").unwrap();
    }
    out.push('\n');
    out
}

/// The tag that a value is really written with.
fn tag(value: &impl serde::Serialize) -> u32 {
    let bytes = bincode::serde::encode_to_vec(value, bincode::config::legacy()).unwrap();
    u32::from_le_bytes(bytes[..4].try_into().unwrap())
}

fn unions() -> String {
    let mut out = "\n| union | tag | variant | then |\n|---|---|---|---|\n".to_owned();
    for (union, tag, variant, then) in [
        ("Value", tag(&Value::number(1.0, "")), "number", "value f64, unit text"),
        ("Value", tag(&Value::text("")), "text", "text"),
        ("Value", tag(&Value::Flag(true)), "flag", "flag"),
        ("Status", tag(&Status::Solved), "solved", "nothing"),
        ("Status", tag(&Status::Failed { reason: String::new() }), "failed", "reason text"),
    ] {
        writeln!(out, "| {union} | {tag} | {variant} | {then} |").unwrap();
    }
    out.push('\n');
    out
}

/// The name of a Rust type in the words of the page.
fn wire(kind: &str) -> String {
    let kind: String = kind.split_whitespace().collect();
    let inside = |outer: &str| kind.strip_prefix(outer).and_then(|rest| rest.strip_suffix('>'));
    if let Some(of) = inside("Vec<") {
        format!("list of {}", wire(of))
    } else if let Some(of) = inside("Option<") {
        format!("optional {}", wire(of))
    } else if let Some((key, of)) = inside("BTreeMap<").and_then(|pair| pair.split_once(',')) {
        format!("map of {} to {}", wire(key), wire(of))
    } else {
        match kind.as_str() {
            "String" => "text".to_owned(),
            "bool" => "flag".to_owned(),
            "Digest" => "digest".to_owned(),
            _ => kind,
        }
    }
}

fn records() -> String {
    let mut out = String::new();
    for (name, list) in [
        ("RunHeader", RunHeader::FIELDS),
        ("Input", Input::FIELDS),
        ("DataFile", DataFile::FIELDS),
        ("Label", Label::FIELDS),
        ("OrderKey", OrderKey::FIELDS),
        ("Snapshot", Snapshot::FIELDS),
        ("Condition", Condition::FIELDS),
        ("Figure", Figure::FIELDS),
        ("MeshValue", MeshValue::FIELDS),
        ("Table", Table::FIELDS),
        ("Column", Column::FIELDS),
        ("Ledger", Ledger::FIELDS),
        ("LedgerLine", LedgerLine::FIELDS),
        ("Stack", Stack::FIELDS),
        ("Layer", Layer::FIELDS),
        ("MaterialValue", MaterialValue::FIELDS),
        ("SweepRecord", SweepRecord::FIELDS),
        ("SweepStart", SweepStart::FIELDS),
        ("SweepColumn", SweepColumn::FIELDS),
        ("Share", Share::FIELDS),
        ("BlockLabel", BlockLabel::FIELDS),
        ("PointBlock", PointBlock::FIELDS),
        ("PointColumn", PointColumn::FIELDS),
        ("RowTexts", RowTexts::FIELDS),
        ("RowSnapshot", RowSnapshot::FIELDS),
        ("Index", Index::FIELDS),
        ("IndexEntry", IndexEntry::FIELDS),
        ("SweepPlace", SweepPlace::FIELDS),
        ("BlockPlace", BlockPlace::FIELDS),
    ] {
        write!(out, "\n### {name}\n\n| field | type | meaning |\n|---|---|---|\n").unwrap();
        for (field, kind, meaning, mark) in list {
            let kind = if *mark == "skip" { "(number block)".to_owned() } else { wire(kind) };
            writeln!(out, "| {field} | {kind} | {} |", meaning.trim()).unwrap();
        }
    }
    out.push('\n');
    out
}
