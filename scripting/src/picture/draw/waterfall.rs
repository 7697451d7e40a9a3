//! The ledger as bars that lose length: names at the left, bars in the middle, numbers at the right.

use crate::figure_text::significant;
use crate::picture::chart::{BarRole, Dash, Stage, Waterfall};
use crate::picture::font::Weight;
use crate::picture::svg::{Align, Stroke, TextLook};

use super::frame::Laid;
use super::{EDGE, HAIR, INK, LABEL, NOTE, Page, QUIET, SMALL, colour, look};

/// Height of a bar.
const BAR: f64 = 6.4;

/// Widest column of names, in widths of the page.
const NAMES: f64 = 0.40;

/// Draws the stages below each other.
pub(super) fn draw(page: &mut Page, waterfall: &Waterfall) {
    for stage in &waterfall.stages {
        draw_stage(page, stage);
        page.y += 6.0;
    }
    page.y -= 3.0;
}

fn draw_stage(page: &mut Page, stage: &Stage) {
    let most = NAMES * page.width;
    let lines: Vec<Vec<String>> =
        stage.bars.iter().map(|bar| page.sheet.font.wrap(&bar.name, SMALL, most)).collect();
    let names = lines
        .iter()
        .flatten()
        .map(|line| page.sheet.font.width(line, Weight::Regular, SMALL))
        .fold(0.0_f64, f64::max)
        .min(most);
    let value = |v: f64| significant(v, 4).replace('-', "\u{2212}");
    let share = |share: Option<f64>| {
        share.map_or(String::new(), |s| crate::figure_text::percent(s).replace('-', "\u{2212}"))
    };
    let widest = |page: &Page, texts: &mut dyn Iterator<Item = String>| {
        texts.map(|text| page.sheet.font.width(&text, Weight::Regular, SMALL)).fold(0.0_f64, f64::max)
    };
    let values = widest(page, &mut stage.bars.iter().map(|bar| value(bar.value)));
    let shares = widest(page, &mut stage.bars.iter().map(|bar| share(bar.share)));
    let left = EDGE + names + 6.0;
    let right = page.width - EDGE - values - shares - 12.0;
    // heading: the account and its unit
    page.y += LABEL;
    let heading = TextLook { weight: Weight::SemiBold, ..look(LABEL, INK, Align::Start) };
    page.sheet.text((EDGE, page.y), &stage.title, heading);
    let unit = stage.axis.unit_symbol();
    page.sheet.text((page.width - EDGE - shares - 6.0, page.y), &unit, look(NOTE, QUIET, Align::End));
    if shares > 0.0 {
        page.sheet.text((page.width - EDGE, page.y), "share", look(NOTE, QUIET, Align::End));
    }
    page.y += 4.0;
    let x = Laid::new(&stage.axis, (0.0, 0.0), left, right);
    let zero = x.clamped(0.0);
    let top = page.y;
    let mut before: Option<(f64, f64)> = None;
    for (bar, name) in stage.bars.iter().zip(&lines) {
        let height = (SMALL + 1.2) * name.len().max(1) as f64 + 2.2;
        let middle = page.y + 0.5 * height;
        let mut base = middle - 0.5 * (SMALL + 1.2) * (name.len().max(1) - 1) as f64 + 0.34 * SMALL;
        let strong = matches!(bar.role, BarRole::Income | BarRole::Left);
        let weight = if strong { Weight::SemiBold } else { Weight::Regular };
        for line in name {
            let style = TextLook { weight, ..look(SMALL, INK, Align::Start) };
            page.sheet.text((EDGE, base), line, style);
            base += SMALL + 1.2;
        }
        let (from, to) = (x.clamped(bar.from), x.clamped(bar.to));
        let (low, high) = (from.min(to), from.max(to));
        let fill = match bar.role {
            BarRole::Income => "#4A4A4A",
            BarRole::Loss => colour(Some(1)),
            BarRole::Gain => colour(Some(2)),
            BarRole::Left => colour(Some(0)),
        };
        // a loss too small to be seen still has a line
        page.sheet.rectangle(low, middle - 0.5 * BAR, (high - low).max(0.5), BAR, fill);
        if let Some((at, height)) = before {
            let hair = Stroke { colour: HAIR, width: 0.5, dash: Dash::Solid };
            page.sheet.line((at, height), (at, middle - 0.5 * BAR), hair);
        }
        before = (bar.role != BarRole::Left).then_some((to, middle + 0.5 * BAR));
        let base = middle + 0.34 * SMALL;
        let style = TextLook { weight, ..look(SMALL, INK, Align::End) };
        page.sheet.text((page.width - EDGE - shares - 6.0, base), &value(bar.value), style);
        page.sheet.text((page.width - EDGE, base), &share(bar.share), look(SMALL, QUIET, Align::End));
        page.y += height;
    }
    page.sheet.line((zero, top), (zero, page.y), Stroke { colour: INK, width: 0.6, dash: Dash::Solid });
}
