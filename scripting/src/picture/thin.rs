//! Fewer points for the same drawing: of each narrow column the first, least, greatest and last point are kept.

/// Curves with no more points than this are drawn as they are.
pub const ENOUGH: usize = 4000;

/// Width of a column, in points of the drawing: below what print resolves.
pub const COLUMN: f64 = 0.1;

/// What was done to a curve.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Thinned {
    /// How many points it had.
    pub before: usize,
    /// How many are drawn.
    pub after: usize,
}

/// Runs of consecutive points in one column of the drawing, each replaced by its first, least, greatest and last point
/// in their order. A curve with few points stays whole. The extremes of the curve are always among the points kept.
pub fn thinned(points: Vec<(f64, f64)>) -> (Vec<(f64, f64)>, Thinned) {
    let before = points.len();
    if before <= ENOUGH {
        return (points, Thinned { before, after: before });
    }
    let mut kept = Vec::with_capacity(ENOUGH);
    let mut start = 0;
    while start < before {
        let column = (points[start].0 / COLUMN).floor();
        let mut end = start + 1;
        let (mut least, mut most) = (start, start);
        while end < before && (points[end].0 / COLUMN).floor() == column {
            if points[end].1 < points[least].1 {
                least = end;
            }
            if points[end].1 > points[most].1 {
                most = end;
            }
            end += 1;
        }
        let mut marks = [start, least, most, end - 1];
        marks.sort_unstable();
        let mut last = usize::MAX;
        for index in marks {
            if index != last {
                kept.push(points[index]);
                last = index;
            }
        }
        start = end;
    }
    let after = kept.len();
    (kept, Thinned { before, after })
}

/// Points for marks: of those that fall into one cell of the drawing only the first is kept.
pub fn thinned_marks(points: Vec<(f64, f64)>) -> (Vec<(f64, f64)>, Thinned) {
    let before = points.len();
    if before <= ENOUGH {
        return (points, Thinned { before, after: before });
    }
    let cell = 2.5 * COLUMN;
    let mut taken = std::collections::BTreeSet::new();
    let kept: Vec<(f64, f64)> = points
        .into_iter()
        .filter(|(x, y)| taken.insert(((x / cell).floor() as i64, (y / cell).floor() as i64)))
        .collect();
    let after = kept.len();
    (kept, Thinned { before, after })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the points themselves; extremes, ends and order must be among them to the bit.
    #[test]
    fn thinning_keeps_extremes_ends_and_order() {
        let mut points: Vec<(f64, f64)> =
            (0..20_000).map(|k| (f64::from(k) * 1e-2, f64::from((k * 7919) % 1000) * 1e-3)).collect();
        points[16_180].1 = 1e9;
        points[2_718].1 = -1e9;
        let (kept, told) = thinned(points.clone());
        assert_eq!((told.before, told.after), (20_000, kept.len()));
        assert!(kept.len() <= 4 * 2001, "{}", kept.len());
        assert!(kept.contains(&points[16_180]) && kept.contains(&points[2_718]));
        assert_eq!((kept.first(), kept.last()), (points.first(), points.last()));
        assert!(kept.windows(2).all(|w| w[0].0 <= w[1].0), "the order changed");
        assert!(kept.iter().all(|point| points.contains(point)), "a point that was not there");
        let few = points[..ENOUGH].to_vec();
        assert_eq!(thinned(few.clone()).0, few);
    }
}
