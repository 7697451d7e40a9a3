//! `plot`, `show` and `picture(..)` through the command: every kind of chart in every format, read by other programs' code.

use resvg::{tiny_skia, usvg};

use crate::support::{Bench, SMALL_CELL};

/// Dots per mm of a PNG: 300 an inch.
const DOTS: f64 = 300.0 / 25.4;

/// What each kind of chart is made of, and words that its axes carry.
const CHARTS: &[(&str, &[&str], &[&str])] = &[
    ("jv", &["light"], &["Voltage / V", "Current density / mA cm^-2"]),
    ("jv", &["dark"], &["|Current density| / mA cm^-2", "Local ideality"]),
    ("jv", &["light", "thick"], &["Voltage / V"]),
    ("power", &["light"], &["Delivered power / mW cm^-2"]),
    ("cv", &["cv"], &["Capacitance / nF cm^-2", "1/C^2 / "]),
    ("eqe", &["response"], &["Wavelength / nm"]),
    ("bands", &["lit"], &["Depth", "Energy / eV"]),
    ("carriers", &["lit"], &["cm^-3"]),
    ("field", &["lit"], &["Electric field / V cm^-1"]),
    ("rates", &["lit"], &["cm^-3 s^-1"]),
    ("ledger", &["lit"], &["mA cm^-2"]),
    ("lines", &["map"], &["Short-circuit current density / mA cm^-2"]),
    ("map", &["map"], &["Base / nm", "Doping / cm^-3"]),
    ("histogram", &["yield"], &["Points"]),
];

fn script() -> String {
    format!(
        r#"{SMALL_CELL}
store("light", cell.jv(lamp));
store("dark", cell.jv(dark(), linear(-0.2.V, 1.1.V, 27)));
store("cv", cell.capacitance(dark(), linear(-2.V, 0.4.V, 13)));
store("response", cell.eqe(linear(400.nm, 850.nm, 46)));
store("lit", cell.at(0.5.V, lamp));
let thick = cell;
thick["base"].thickness = 1.um;
store("thick", thick.jv(lamp));
let plan = grid(#{{ base: linear(300.nm, 900.nm, 4), doping: logarithmic(1e16.per_cm3, 1e18.per_cm3, 3) }});
let map = plan.run("map", |p| {{
    cell["base"].thickness = p.base;
    cell["base"].doping = acceptors(p.doping);
    let at = cell.at(0.V, lamp);
    #{{ jsc: -at.current_density }}
}});
let lot = random(#{{ base: normal(500.nm, 5.percent) }}, 40).run("yield", |p| {{
    cell["base"].thickness = p.base;
    #{{ jsc: -cell.at(0.V, lamp).current_density }}
}});
picture("two.svg", [cell.jv(lamp), thick.jv(lamp)], #{{ names: ["500 nm", "1 um"] }});
picture("named.png", #{{ thin: cell.jv(lamp), thick: thick.jv(lamp) }}, #{{ title: "Two bases" }});
"#
    )
}

/// Width, height and the share of dots that are not paper.
fn looked_at(canvas: &tiny_skia::Pixmap) -> (u32, u32, f64) {
    let inked =
        canvas.pixels().iter().filter(|dot| dot.alpha() > 0 && (dot.red() < 200 || dot.green() < 200));
    let all = f64::from(canvas.width()) * f64::from(canvas.height());
    (canvas.width(), canvas.height(), inked.count() as f64 / all)
}

/// A drawing as a reader of SVG sees it: its width in mm and the share of it that is inked, by thirds of its height.
fn read_svg(text: &str) -> (f64, [f64; 3]) {
    let tree = usvg::Tree::from_str(text, &usvg::Options::default()).expect("an SVG that a reader takes");
    let size = tree.size();
    let mut canvas = tiny_skia::Pixmap::new(size.width() as u32, size.height() as u32).expect("a size");
    resvg::render(&tree, tiny_skia::Transform::identity(), &mut canvas.as_mut());
    let third = canvas.pixels().len().div_ceil(3);
    let mut shares = [0.0; 3];
    for (share, dots) in shares.iter_mut().zip(canvas.pixels().chunks(third)) {
        let inked = dots.iter().filter(|dot| dot.alpha() > 0 && dot.red().min(dot.blue()) < 200);
        *share = inked.count() as f64 / dots.len() as f64;
    }
    (f64::from(size.width()) / 96.0 * 25.4, shares)
}

/// Source of truth: readers of SVG and PNG that are not ours, the specification of PDF (ISO 32000, 7.5: header, trailer), and
/// the width asked for; ink in each third of the height says that no part is empty. Fonts are outlines: a PDF needs none.
#[test]
fn every_chart_is_drawn_in_every_format() {
    let bench = Bench::with("all.rhai", &script());
    bench.ends(0, &["run", "all.rhai", "--quiet"]);
    for (chart, of, words) in CHARTS {
        let plot = |name: &str, more: &[&str]| {
            let arguments = [&["plot", "all.epiloom"], *of, &["--chart", chart, "-o", name], more].concat();
            bench.ends(0, &arguments);
            bench.bytes(name)
        };
        let svg = String::from_utf8(plot("a.svg", &[])).expect("text");
        for word in *words {
            assert!(
                svg.contains(word),
                "{chart} of {of:?} without `{word}`:\n{}",
                &svg[..svg.len().min(1500)]
            );
        }
        let (width, shares) = read_svg(&svg);
        assert!((width - 85.0).abs() < 0.5, "{chart}: {width} mm");
        assert!(shares.iter().all(|share| *share > 0.002), "{chart} of {of:?}: {shares:?}");
        let png = tiny_skia::Pixmap::decode_png(&plot("a.png", &["--width", "60"])).expect("a PNG");
        let (across, _, share) = looked_at(&png);
        assert!((f64::from(across) - 60.0 * DOTS).abs() < 5.0, "{chart}: {across} dots");
        assert!((0.005..0.9).contains(&share), "{chart}: {share}");
        let pdf = plot("a.pdf", &[]);
        assert!(pdf.starts_with(b"%PDF-1.") && pdf.trim_ascii_end().ends_with(b"%%EOF"), "{chart}");
        let has = |word: &[u8]| pdf.windows(word.len()).any(|part| part == word);
        assert!(has(b"/MediaBox") && !has(b"/BaseFont") && pdf.len() > 3000, "{chart}: {}", pdf.len());
    }
    // from the script: several results with their names
    let two = String::from_utf8(bench.bytes("two.svg")).expect("text");
    assert!(
        two.contains("500 nm, 1 um") && read_svg(&two).1[1] > 0.002,
        "the snapshots laid over each other"
    );
    assert!(looked_at(&tiny_skia::Pixmap::decode_png(&bench.bytes("named.png")).expect("a PNG")).2 > 0.005);
    // what cannot be drawn is told
    let ran = bench.ends(2, &["plot", "all.epiloom", "light", "lit", "-o", "a.svg"]);
    assert!(ran.err.contains("E416"), "{}", ran.err);
    let ran = bench.ends(2, &["plot", "all.epiloom", "light", "--chart", "eqe", "-o", "a.svg"]);
    assert!(ran.err.contains("`jv`, `power`"), "{}", ran.err);
}

/// Source of truth: the specification of the terminal's view: the stack as a drawing with thicknesses and doping, figures with
/// units and errors, a plot in Braille letters; none of the drawings with `--plain`.
#[test]
fn show_draws_the_stack_and_a_curve() {
    let bench = Bench::with("all.rhai", &format!("{SMALL_CELL}store(\"light\", cell.jv(lamp));\n"));
    bench.ends(0, &["run", "all.rhai", "--quiet"]);
    let braille = |text: &str| text.chars().filter(|c| ('\u{2801}'..='\u{28ff}').contains(c)).count();
    let shown = bench.ends(0, &["show", "all.epiloom"]).out;
    for words in ["\u{250c}\u{2500}", "emitter", "100 nm", "1e18 cm^-3", "mA/cm2", "+-"] {
        assert!(shown.contains(words), "no `{words}`:\n{shown}");
    }
    assert!(braille(&shown) > 20, "{shown}");
    assert!(shown.lines().all(|line| line.chars().count() <= 120), "{shown}");
    let one = bench.ends(0, &["show", "all.epiloom", "light"]).out;
    assert!(braille(&one) > 20, "{one}");
    let plain = bench.ends(0, &["show", "all.epiloom", "--plain"]).out;
    assert!(braille(&plain) == 0 && !plain.contains('\u{2500}') && plain.contains("100 nm"), "{plain}");
}
