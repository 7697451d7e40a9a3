//! What a person may ask of a drawing: its size, scales and ranges.

use crate::picture::chart::{Axis, Body, Chart, Scale};
use crate::picture::error::PictureError;

/// Width of one column of print, mm.
pub const COLUMN: f64 = 85.0;

/// Size, scales and ranges of a drawing.
#[derive(Clone, Debug, PartialEq)]
pub struct View {
    /// Width in mm.
    pub width: f64,
    /// Height in mm; what the content needs where none is given.
    pub height: Option<f64>,
    /// Scale of the axis along, instead of what suits the data.
    pub x_scale: Option<Scale>,
    /// Scale of the axis up.
    pub y_scale: Option<Scale>,
    /// Range of the axis along, in its unit.
    pub x_range: Option<(f64, f64)>,
    /// Range of the axis up (of the first panel), in its unit.
    pub y_range: Option<(f64, f64)>,
    /// Whether the title and the conditions are drawn.
    pub titled: bool,
}

impl Default for View {
    fn default() -> Self {
        View {
            width: COLUMN,
            height: None,
            x_scale: None,
            y_scale: None,
            x_range: None,
            y_range: None,
            titled: true,
        }
    }
}

impl View {
    /// The chart with the scales and ranges asked for; what they leave out is said in its notes.
    ///
    /// # Errors
    /// A scale or range that the data cannot have.
    pub fn apply(&self, chart: &Chart) -> Result<Chart, PictureError> {
        let mut chart = chart.clone();
        let mut notes = Vec::new();
        match &mut chart.body {
            Body::Curves(curves) => {
                let along: Vec<f64> =
                    curves.panels.iter().flat_map(|p| &p.series).flat_map(|s| s.x.iter().copied()).collect();
                adjust(&mut curves.x, &along, self.x_scale, self.x_range, &mut notes)?;
                for (index, panel) in curves.panels.iter_mut().enumerate() {
                    let up: Vec<f64> = panel.series.iter().flat_map(|s| s.y.iter().copied()).collect();
                    let (scale, range) = if index == 0 { (self.y_scale, self.y_range) } else { (None, None) };
                    adjust(&mut panel.y, &up, scale, range, &mut notes)?;
                }
            }
            Body::Map(map) => {
                let along: Vec<f64> = map.points.iter().map(|point| point.x).collect();
                let up: Vec<f64> = map.points.iter().map(|point| point.y).collect();
                adjust(&mut map.x, &along, self.x_scale, self.x_range, &mut notes)?;
                adjust(&mut map.y, &up, self.y_scale, self.y_range, &mut notes)?;
            }
            Body::Histogram(histogram) => {
                let edges: Vec<f64> = histogram.groups.iter().flat_map(|g| g.edges.iter().copied()).collect();
                adjust(&mut histogram.x, &edges, None, self.x_range, &mut notes)?;
                let counts: Vec<f64> =
                    histogram.groups.iter().flat_map(|g| g.counts.iter().map(|c| *c as f64)).collect();
                adjust(&mut histogram.count, &counts, None, self.y_range, &mut notes)?;
                self.refuse("a histogram", self.x_scale.or(self.y_scale).is_some())?;
            }
            Body::Waterfall(_) => {
                let asked =
                    self.x_scale.or(self.y_scale).is_some() || self.x_range.or(self.y_range).is_some();
                self.refuse("a ledger", asked)?;
            }
        }
        chart.notes.extend(notes);
        Ok(chart)
    }

    fn refuse(&self, what: &str, asked: bool) -> Result<(), PictureError> {
        if asked {
            let reason = "its axes begin at zero in equal steps".to_string();
            return Err(PictureError::BadAxis { what: what.to_string(), reason });
        }
        Ok(())
    }
}

fn adjust(
    axis: &mut Axis,
    numbers: &[f64],
    scale: Option<Scale>,
    range: Option<(f64, f64)>,
    notes: &mut Vec<String>,
) -> Result<(), PictureError> {
    let fault = |reason: String| PictureError::BadAxis { what: axis.label.to_lowercase(), reason };
    let magnitudes = || numbers.iter().map(|v| v.abs()).filter(|v| v.is_finite() && *v > 0.0);
    match scale {
        Some(Scale::Log) if axis.scale == Scale::Linear => {
            let Some(least) = magnitudes().min_by(f64::total_cmp) else {
                return Err(fault(
                    "a logarithmic scale has nothing to show, all values are zero".to_string(),
                ));
            };
            let most = magnitudes().max_by(f64::total_cmp).unwrap_or(least);
            axis.magnitude = numbers.iter().any(|v| *v < 0.0);
            axis.scale = Scale::Log;
            axis.range = (least, most);
            let zeros = numbers.iter().filter(|v| **v == 0.0).count();
            if zeros > 0 && axis.label != "Depth" {
                notes.push(format!(
                    "not on a logarithmic scale: {zeros} values of {} that are zero",
                    axis.label.to_lowercase()
                ));
            }
        }
        Some(Scale::Linear) if axis.scale == Scale::Log => {
            axis.scale = Scale::Linear;
            axis.magnitude = false;
            let finite = || numbers.iter().copied().filter(|v| v.is_finite());
            axis.range = (
                finite().min_by(f64::total_cmp).unwrap_or(0.0),
                finite().max_by(f64::total_cmp).unwrap_or(1.0),
            );
        }
        _ => {}
    }
    if let Some((from, to)) = range {
        if !(from.is_finite() && to.is_finite() && from < to) {
            return Err(fault(format!("a range goes from a lower to a higher number, not {from} to {to}")));
        }
        if axis.scale == Scale::Log && from <= 0.0 {
            return Err(fault(format!("a logarithmic scale begins above zero, not at {from}")));
        }
        axis.range = (from, to);
        let of = |v: f64| if axis.magnitude { v.abs() } else { v };
        let outside = numbers.iter().filter(|v| v.is_finite() && !(from..=to).contains(&of(**v))).count();
        if outside > 0 {
            let all = numbers.iter().filter(|v| v.is_finite()).count();
            notes.push(format!("off-scale: {outside} of {all} values of {}", axis.label.to_lowercase()));
        }
    }
    Ok(())
}
