//! The page as bytes; what a browser makes of it is tested end to end.

use super::*;

/// Source of truth: the digests that the vendor folder's table gives, and the version that the library itself states.
#[test]
fn the_vendored_library_is_the_recorded_one() {
    let table = include_str!("vendor/README.md");
    for (name, text) in [("uPlot.iife.min.js", UPLOT), ("uPlot.min.css", UPLOT_STYLE), ("LICENSE", UPLOT_LICENCE)] {
        let digest: String = Sha256::digest(text).iter().map(|byte| format!("{byte:02x}")).collect();
        assert!(table.contains(&format!("{digest}  uplot/{name}")), "{name} is {digest}");
    }
    assert!(UPLOT.contains(&format!("(v{UPLOT_VERSION})")) && table.contains(UPLOT_VERSION));
    assert!(UPLOT_LICENCE.contains("MIT"));
}
