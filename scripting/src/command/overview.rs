//! What an archive holds at a glance: the stack as a drawing, figures of merit with their errors, a small J-V plot.

use std::fmt::Write;

use crate::archive::{Archive, Snapshot, Stack, Status};
use crate::picture::charts::{self, Choice};
use crate::picture::{Kind, terminal};

use super::report::{figures_text, stack_text};

/// Stacks that are drawn; further ones are counted.
const MOST_STACKS: usize = 2;

/// Snapshots whose figures are shown; further ones are counted.
const MOST_FIGURES: usize = 6;

/// How an archive or snapshot is shown.
#[derive(Clone, Copy, Debug)]
pub struct Look {
    /// No drawings.
    pub plain: bool,
    /// Columns of the terminal.
    pub width: usize,
}

/// The stacks, the figures of merit of the curves, and a plot of the first curve in light.
pub fn overview(archive: &Archive, look: Look) -> String {
    let mut text = String::new();
    let mut stacks: Vec<Stack> = Vec::new();
    let (mut shown, mut left_out, mut plotted) = (0, 0, false);
    let mut figures = String::new();
    for index in 0..archive.entries().len() {
        // damaged ones are named elsewhere
        let Ok(snapshot) = archive.snapshot_at(index) else { continue };
        if !snapshot.stack.layers.is_empty() && !stacks.contains(&snapshot.stack) {
            stacks.push(snapshot.stack.clone());
        }
        if snapshot.label.kind != "light J-V" {
            continue;
        }
        if shown == MOST_FIGURES {
            left_out += 1;
            continue;
        }
        shown += 1;
        let _ = writeln!(figures, "{}", snapshot.label.name);
        if let Status::Failed { reason } = &snapshot.label.status {
            // writing to a text cannot fail, here and below
            let _ = writeln!(figures, "  failed: {reason}");
        }
        figures.push_str(&figures_text(&snapshot.figures));
        if !plotted {
            let plot = small_plot(&snapshot, look);
            plotted = !plot.is_empty();
            if plotted {
                figures.push('\n');
                figures.push_str(&plot);
            }
        }
        figures.push('\n');
    }
    for stack in stacks.iter().take(MOST_STACKS) {
        text.push_str(&stack_picture(stack, look));
        text.push('\n');
    }
    if stacks.len() > MOST_STACKS {
        let more = stacks.len() - MOST_STACKS;
        let _ = writeln!(text, "and {more} more {}\n", if more == 1 { "stack" } else { "stacks" });
    }
    text.push_str(&figures);
    if left_out > 0 {
        let _ = writeln!(text, "and figures of {left_out} curves more\n");
    }
    text
}

/// A stack as a drawing, or as a table where drawings are not wanted.
pub fn stack_picture(stack: &Stack, look: Look) -> String {
    if look.plain {
        return stack_text(stack);
    }
    let drawing = terminal::stack(stack, look.width);
    if drawing.is_empty() {
        return stack_text(stack);
    }
    format!("stack `{}`, thicknesses not to scale\n{drawing}", stack.name)
}

/// A small plot of a current-voltage curve; empty for other snapshots, narrow terminals and logs.
pub fn small_plot(snapshot: &Snapshot, look: Look) -> String {
    if look.plain {
        return String::new();
    }
    match charts::chart(snapshot, Kind::CurrentVoltage, &Choice::default()) {
        Ok(chart) => terminal::plot(&chart, look.width),
        Err(_) => String::new(),
    }
}
