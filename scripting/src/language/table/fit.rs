//! Least squares: a line or a parabola through the rows of a table.

use epiloom_solver::math::sum;

/// A value with its standard error, which only more points than coefficients can give.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Estimate {
    /// The value.
    pub value: f64,
    /// Its standard error.
    pub error: Option<f64>,
}

/// What came of a fit `y = offset + slope x + curvature x^2`.
#[derive(Clone, Debug)]
pub struct Fit {
    /// Offset, slope and, for a parabola, curvature.
    pub coefficients: Vec<Estimate>,
    /// Where a parabola has its extremum, and how high it is.
    pub extremum: Option<(Estimate, Estimate)>,
    /// Standard deviation of the points about the curve.
    pub spread: Option<f64>,
    /// Share of the variance of y that the curve takes up; nothing where y does not vary.
    pub determination: Option<f64>,
}

/// Fits a polynomial of degree 1 or 2; nothing when the points have too few different abscissae.
///
/// The polynomials are made orthogonal over the points, so that the coefficients are independent and no matrix is
/// solved: G. E. Forsythe, J. Soc. Indust. Appl. Math. 5, 74 (1957). The standard errors assume independent
/// deviations of one size.
pub fn fit(x: &[f64], y: &[f64], degree: usize) -> Option<Fit> {
    let count = x.len() as f64;
    if x.len() <= degree {
        return None;
    }
    let (low, high) = x.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), v| (l.min(*v), h.max(*v)));
    let (middle, half) = (0.5 * (low + high), 0.5 * (high - low));
    if half <= 0.0 || !half.is_finite() {
        return None;
    }
    let t: Vec<f64> = x.iter().map(|x| (x - middle) / half).collect();
    let a1 = sum(t.iter().copied()) / count;
    let p1 = |t: f64| t - a1;
    let s1 = sum(t.iter().map(|t| p1(*t) * p1(*t)));
    let a2 = sum(t.iter().map(|t| t * p1(*t) * p1(*t))) / s1;
    let b = s1 / count;
    let p2 = |t: f64| (t - a2) * p1(t) - b;
    let s2 = sum(t.iter().map(|t| p2(*t) * p2(*t)));
    if degree == 2 && s2 <= 1e-20 * count {
        return None;
    }
    let project = |p: &dyn Fn(f64) -> f64, s: f64| sum(t.iter().zip(y).map(|(t, y)| p(*t) * y)) / s;
    let c0 = sum(y.iter().copied()) / count;
    let c1 = project(&p1, s1);
    let c2 = if degree == 2 { project(&p2, s2) } else { 0.0 };
    let curve = |t: f64| c0 + c1 * p1(t) + c2 * p2(t);
    let rest = sum(t.iter().zip(y).map(|(t, y)| (y - curve(*t)) * (y - curve(*t))));
    let about_mean = sum(y.iter().map(|y| (y - c0) * (y - c0)));
    let freedom = x.len() - degree - 1;
    let variance = (freedom > 0).then(|| rest / freedom as f64);
    // each number below is a sum of the independent c0, c1, c2 with these weights
    let estimate = |value: f64, weights: [f64; 3]| Estimate {
        value,
        error: variance.map(|v| {
            let third = if degree == 2 { weights[2] * weights[2] / s2 } else { 0.0 };
            (v * (weights[0] * weights[0] / count + weights[1] * weights[1] / s1 + third)).sqrt()
        }),
    };
    let combine = |weights: [f64; 3]| estimate(c0 * weights[0] + c1 * weights[1] + c2 * weights[2], weights);
    let m = middle / half;
    let mut coefficients = vec![combine([1.0, -a1 - m, a1 * a2 - b + m * (a1 + a2) + m * m])];
    coefficients.push(combine([0.0, 1.0 / half, -(a1 + a2 + 2.0 * m) / half]));
    let mut extremum = None;
    if degree == 2 {
        coefficients.push(combine([0.0, 0.0, 1.0 / (half * half)]));
        if c2 != 0.0 {
            let top = 0.5 * (a1 + a2) - 0.5 * c1 / c2;
            let at = estimate(middle + half * top, [0.0, -0.5 * half / c2, 0.5 * half * c1 / (c2 * c2)]);
            extremum = Some((at, estimate(curve(top), [1.0, p1(top), p2(top)])));
        }
    }
    Some(Fit {
        coefficients,
        extremum,
        spread: variance.map(f64::sqrt),
        determination: (about_mean > 0.0).then(|| 1.0 - rest / about_mean),
    })
}
