//! Current-voltage curves and their figures of merit, each solved for.

use crate::device::Device;
use crate::optics::Light;
use crate::solve::continuation::hermite;
use crate::solve::extrapolation::extrapolate;
use crate::solve::{Drive, Point, State};

use super::bias_point::conductance_error;
use super::figure::{Absent, Figure, Outcome};
use super::ladder::{AnalysisError, Correction, LARGEST_VOLTAGE, Ladder, MOST, check_voltage};
use super::results::{CurrentVoltage, JvPoint, Voltages};

/// Step of the scan that brackets open circuit and maximum power, V.
const SCAN: f64 = 0.05;
/// Step of automatic curves, V.
const AUTOMATIC: f64 = 0.02;
/// The maximum-power voltage is solved to this step, V, or this share of it; the power errs by its square.
const POWER_STEP: f64 = 1e-9;
const POWER_SHARE: f64 = 1e-6;
/// A step of the search for maximum power this small, V, that is not half the one before it is the rounding of the slopes.
const POWER_NOISE: f64 = 1e-4;
/// Points this far apart, V, tell how the slope of the current grows.
const TELLING: f64 = 1e-6;
/// What two sums that nearly cancel leave of their rounding, a share of their size.
const CANCELLATION: f64 = 4.0 * f64::EPSILON;
/// Voltage and current of maximum power are no extremes: their slopes change with the mesh less evenly than the figures
/// themselves, and this share of the last difference is added to their errors (empirical).
const UNEVEN: f64 = 1.0 / 64.0;
/// Points of a curve without figures are as accurate as asked for at so many times the accuracy ...
const POINTS: f64 = 10.0;
/// ... but for those that are this share of the largest: zero bias in the dark.
const NOTHING: f64 = 1e-30;

/// The solved points of one mesh.
#[derive(Default)]
struct Curve {
    points: Vec<Point>,
    short: Option<Point>,
    open: Option<Point>,
    power: Option<Point>,
    /// How fast the slope of the current grows with the voltage about maximum power, 1/V.
    bending: Option<f64>,
}

impl Curve {
    /// Voltage and current of maximum power: of the point solved there, and the last step, which it does not take.
    fn best(&self) -> Option<(f64, f64)> {
        let point = self.power.as_ref()?;
        let step = power_step(point, self.bending?);
        Some((point.voltage + step, point.current + point.conductance * step))
    }
    /// How far that voltage may be off, and its current: slopes err by the size of their state's last update, or by what kept
    /// the steps from shrinking.
    fn best_doubt(&self) -> Option<(f64, f64)> {
        let point = self.power.as_ref()?;
        let bending = self.bending?;
        let step = power_step(point, bending).abs();
        let slopes = (point.voltage * point.last_update / (2.0 + point.voltage * bending)).abs();
        let voltage = if step > POWER_STEP { slopes.max(step) } else { slopes };
        Some((voltage, voltage * point.conductance.abs()))
    }
}

/// A current-voltage curve under `light`, at terminal voltages given or automatic.
///
/// Jsc, Voc and maximum power are solved for on every mesh (Voc as a bordered system, maximum power as the root of
/// `J + V dJ/dV` by a guarded secant); curve points hold the finest mesh's values and their extrapolation.
pub fn current_voltage(
    device: &Device,
    light: &Light,
    voltages: &Voltages,
) -> Result<CurrentVoltage, AnalysisError> {
    if let Voltages::Given(list) = voltages {
        for &v in list {
            check_voltage(v)?;
        }
    }
    let mut ladder = Ladder::new(device, light)?;
    let lit = ladder.rungs[0].problem.is_lit();
    let junction = ladder.rungs[0].problem.coefficients.junction;

    let mut stopped = None;
    let (mut asked, mut curve) = coarse_curve(&mut ladder, voltages, lit && junction, &mut stopped)?;
    let mut curves: Vec<Curve> = Vec::new();
    let mut rung = 1;
    loop {
        let finer = match finer_curve(&mut ladder, rung, &curve, &mut stopped) {
            Ok(finer) => finer,
            // What the coarser meshes have is kept: their error says how good it is.
            Err(_) if rung > 1 => {
                ladder.rungs.truncate(rung);
                break;
            }
            Err(error) => return Err(error),
        };
        curves.push(std::mem::replace(&mut curve, finer));
        // Points beyond the first failure of any mesh are left out.
        let solved = curve.points.len();
        asked.truncate(solved);
        let worst = worst_error(&curves, &curve);
        rung += 1;
        if rung >= MOST || worst <= device.stack().accuracy {
            break;
        }
        ladder.refine()?;
    }
    curves.push(curve);

    ladder.not_stopped()?;
    Ok(collect(&ladder, curves, asked, lit, junction, stopped))
}

/// Solves on the coarsest mesh by continuation: the scan, the figures and the points.
fn coarse_curve(
    ladder: &mut Ladder,
    voltages: &Voltages,
    photovoltaic: bool,
    stopped: &mut Option<String>,
) -> Result<(Vec<f64>, Curve), AnalysisError> {
    let tolerances = ladder.tolerances;
    let start = ladder.coarse(0.0)?;
    let mut curve = Curve { short: photovoltaic.then(|| start.clone()), ..Curve::default() };
    if photovoltaic && start.current < 0.0 {
        let mut scan = vec![start.clone()];
        let problem = &mut ladder.rungs[0].problem;
        let limit = (problem.built_in_voltage() + 1.0).clamp(1.0, LARGEST_VOLTAGE);
        while let Some(last) = scan.last() {
            if last.current > 0.0 || last.voltage > limit {
                break;
            }
            let before = scan.len().checked_sub(2).map(|k| &scan[k]);
            match problem.advance(before, last, SCAN * scan.len() as f64, &tolerances) {
                Ok(point) => scan.push(point),
                Err(_) => break,
            }
        }
        let crossing = scan.windows(2).position(|w| w[0].current <= 0.0 && w[1].current > 0.0);
        if let Some(k) = crossing {
            let (a, b) = (&scan[k], &scan[k + 1]);
            let share = a.current / (a.current - b.current);
            // The current rises like an exponential: start nearer the far end than the chord says.
            let guess = hermite(a, b, a.state.voltage + (b.state.voltage - a.state.voltage) * share.max(0.5));
            problem.grant();
            let open = problem
                .newton(&guess, Drive::Current(0.0), &tolerances)
                .or_else(|_| problem.newton(&b.state, Drive::Current(0.0), &tolerances));
            curve.open = open.ok();
            if let Some((power, bending)) = best_power(ladder, &scan[..=k + 1]) {
                curve.power = Some(power);
                curve.bending = Some(bending);
            }
        }
    }
    let asked = match voltages {
        Voltages::Given(list) => list.clone(),
        Voltages::Automatic => automatic(ladder, &curve, photovoltaic),
    };
    // Outwards from zero, so that each point starts next to a solved one; then back into the order asked for.
    let mut order: Vec<usize> = (0..asked.len()).collect();
    order.sort_by(|&a, &b| {
        (asked[a] < 0.0)
            .cmp(&(asked[b] < 0.0))
            .then(asked[a].abs().total_cmp(&asked[b].abs()))
            .then(a.cmp(&b))
    });
    let mut solved: Vec<Option<Point>> = vec![None; asked.len()];
    for negative in [false, true] {
        let (mut before, mut here): (Option<Point>, Point) = (None, start.clone());
        for &k in order.iter().filter(|&&k| (asked[k] < 0.0) == negative) {
            if asked[k] != here.voltage {
                match ladder.rungs[0].problem.advance(before.as_ref(), &here, asked[k], &tolerances) {
                    Ok(point) => before = Some(std::mem::replace(&mut here, point)),
                    Err(error) => {
                        stopped.get_or_insert(ladder.located(0, error).to_string());
                        break;
                    }
                }
            }
            solved[k] = Some(here.clone());
        }
    }
    let mut kept = Vec::new();
    for (voltage, point) in asked.iter().zip(solved) {
        if let Some(point) = point {
            kept.push(*voltage);
            curve.points.push(point);
        }
    }
    Ok((kept, curve))
}

/// The voltages of an automatic curve.
fn automatic(ladder: &Ladder, curve: &Curve, photovoltaic: bool) -> Vec<f64> {
    let built_in = ladder.rungs[0].problem.built_in_voltage();
    let steps = |from: f64, to: f64| {
        let (a, b) = ((from / AUTOMATIC).round() as i64, (to / AUTOMATIC).ceil() as i64);
        // Divided, so that 0.3 V is the number nearest to 0.3.
        (a..=b).map(|k| k as f64 / (1.0 / AUTOMATIC).round()).collect()
    };
    match (&curve.open, photovoltaic) {
        (Some(open), true) if open.voltage > 0.0 => steps(0.0, open.voltage + 2.0 * AUTOMATIC),
        (_, true) => steps(0.0, built_in.clamp(0.1, LARGEST_VOLTAGE)),
        _ if ladder.rungs[0].problem.coefficients.junction => {
            steps(-0.5, built_in.clamp(0.1, LARGEST_VOLTAGE))
        }
        _ => steps(-0.5, 0.5),
    }
}

/// The point of maximum power from a scan that passes it: the best interval of the whole scan, then the exact root.
fn best_power(ladder: &mut Ladder, scan: &[Point]) -> Option<(Point, f64)> {
    let k = (0..scan.len()).max_by(|&a, &b| power(&scan[a]).total_cmp(&power(&scan[b])))?;
    let (low, high) = (k.saturating_sub(1), (k + 1).min(scan.len() - 1));
    // Keep the two neighbours between which the slope of the power changes sign.
    let (a, b) = if power_slope(&scan[k]) < 0.0 { (k, high) } else { (low, k) };
    if a == b {
        return None;
    }
    maximum_power(ladder, 0, scan[a].clone(), scan[b].clone())
}

fn power(p: &Point) -> f64 {
    -p.current * p.voltage
}

/// `J + V dJ/dV`: minus the slope of the delivered power.
fn power_slope(p: &Point) -> f64 {
    p.current + p.voltage * p.conductance
}

/// The root of [`power_slope`] between two points of a mesh: Newton steps with the curvature of an exponential through the
/// last two points, kept inside a bracket in which a greatest power lies.
///
/// The power rises at the bracket's lower end; at its upper end it falls, or is less than at the lower one (a curve with a
/// step may rise at both).
fn maximum_power(ladder: &mut Ladder, rung: usize, mut a: Point, mut b: Point) -> Option<(Point, f64)> {
    if power_slope(&a) > 0.0 || power_slope(&b) < 0.0 && power(&b) > power(&a) {
        return None;
    }
    let tolerances = ladder.tolerances;
    let mut here = if power_slope(&a).abs() < power_slope(&b).abs() { a.clone() } else { b.clone() };
    let mut other = if here.voltage == a.voltage { b.clone() } else { a.clone() };
    let (mut rate, mut before) = (bending(&here, &other), f64::INFINITY);
    // The last two steps asked for: where they do not shrink, the bracket is halved.
    let mut steps = [f64::INFINITY; 2];
    for _ in 0..60 {
        // Nearer points say nothing but the rounding of their slopes, which counts where the curve is nearly straight.
        if (here.voltage - other.voltage).abs() >= TELLING {
            rate = bending(&here, &other);
        }
        let step = power_step(&here, rate);
        let mut next = here.voltage + step;
        let (low, high) = (a.voltage.min(b.voltage), a.voltage.max(b.voltage));
        // Rounding of the slope may keep the step above what the bracket allows.
        if arrived(step, here.voltage, &mut before) || high - low <= POWER_STEP {
            return Some((here, rate));
        }
        if !(next > low && next < high) || step.abs() > 0.5 * steps[0] {
            next = 0.5 * (low + high);
        }
        steps = [steps[1], step.abs()];
        let problem = &mut ladder.rungs[rung].problem;
        let share = (next - a.voltage) / (b.voltage - a.voltage);
        let guess = hermite(&a, &b, a.state.voltage + share * (b.state.voltage - a.state.voltage));
        let drive = problem.drive(next);
        problem.grant();
        let point = match problem.newton(&guess, drive, &tolerances) {
            Ok(point) => point,
            Err(_) => problem.advance(None, &here, next, &tolerances).ok()?,
        };
        if power_slope(&point) < 0.0 && power(&point) >= power(&a) {
            a = point.clone();
        } else {
            b = point.clone();
        }
        other = std::mem::replace(&mut here, point);
    }
    None
}

/// How fast the slope J' grows with the voltage, as that of an exponential through two points: `ln(J'_1/J'_2)/(V_1 - V_2)`.
fn bending(here: &Point, other: &Point) -> f64 {
    let distance = here.voltage - other.voltage;
    let ratio = here.conductance / other.conductance;
    if ratio > 0.0 && distance != 0.0 { crate::math::elementary::ln(ratio) / distance } else { 0.0 }
}

/// Whether a step from a voltage towards maximum power says that it is reached; `before` holds the size of the step before it.
fn arrived(step: f64, voltage: f64, before: &mut f64) -> bool {
    let size = step.abs();
    let noise = size <= POWER_NOISE && size > 0.5 * *before;
    *before = size;
    size <= POWER_STEP.min(POWER_SHARE * voltage.abs()) || noise
}

/// Newton step on the power's slope, with `J'' = J'` times the bending.
fn power_step(here: &Point, bending: f64) -> f64 {
    let slope = 2.0 * here.conductance + here.voltage * here.conductance * bending;
    -power_slope(here) / slope
}

/// Solves on a finer mesh, each point from the coarser mesh's and its neighbour's correction.
fn finer_curve(
    ladder: &mut Ladder,
    rung: usize,
    coarse: &Curve,
    stopped: &mut Option<String>,
) -> Result<Curve, AnalysisError> {
    let mut curve = Curve { bending: coarse.bending, ..Curve::default() };
    let drive_of = |ladder: &Ladder, p: &Point| ladder.rungs[rung].problem.drive(p.voltage);
    let (mut before, mut last): (Option<Correction>, Option<Correction>) = (None, None);
    if let Some(p) = &coarse.short {
        let drive = drive_of(ladder, p);
        let interpolated = ladder.prolonged(rung, p);
        let point = ladder.solve_from(rung, &interpolated, drive, p.voltage)?;
        last = Some(Correction::new(ladder, rung, p, &interpolated.nodes, &point));
        curve.short = Some(point);
    }
    if let Some(p) = &coarse.open {
        let guess = expected(ladder, rung, p, last.as_ref());
        curve.open = Some(ladder.solve_from(rung, &guess, Drive::Current(0.0), p.voltage)?);
    }
    if let (Some(p), Some(bending)) = (&coarse.power, coarse.bending) {
        let guess = expected(ladder, rung, p, last.as_ref());
        curve.power = finer_power(ladder, rung, p, &guess, bending)?;
    }
    for p in &coarse.points {
        let interpolated = ladder.prolonged(rung, p);
        let known = curve.short.as_ref().filter(|short| short.voltage == p.voltage);
        let solved = match known {
            Some(short) => Ok(short.clone()),
            None => {
                let mut guess = interpolated.clone();
                if let Some(last) = &last {
                    Correction::extend(last, before.as_ref(), p.state.voltage, &mut guess.nodes);
                }
                let drive = drive_of(ladder, p);
                ladder.solve_from(rung, &guess, drive, p.voltage)
            }
        };
        match solved {
            Ok(point) => {
                before = last.replace(Correction::new(ladder, rung, p, &interpolated.nodes, &point));
                curve.points.push(point);
            }
            Err(error) => {
                stopped.get_or_insert(error.to_string());
                break;
            }
        }
    }
    Ok(curve)
}

/// The state expected on a finer mesh at a coarser mesh's point, with the correction of another point.
fn expected(ladder: &Ladder, rung: usize, coarse: &Point, correction: Option<&Correction>) -> State {
    let mut guess = ladder.prolonged(rung, coarse);
    if let Some(correction) = correction {
        Correction::extend(correction, None, coarse.state.voltage, &mut guess.nodes);
    }
    guess
}

/// Maximum power on a finer mesh, from the coarser mesh's point with the rate at which its slope grows; where that does not
/// get there, in a bracket.
fn finer_power(
    ladder: &mut Ladder,
    rung: usize,
    coarse: &Point,
    guess: &State,
    bending: f64,
) -> Result<Option<Point>, AnalysisError> {
    let drive = ladder.rungs[rung].problem.drive(coarse.voltage);
    let start = ladder.solve_from(rung, guess, drive, coarse.voltage)?;
    let tolerances = ladder.tolerances;
    let mut before = f64::INFINITY;
    let mut here = start.clone();
    for _ in 0..20 {
        let step = power_step(&here, bending);
        if !step.is_finite() {
            break;
        }
        if arrived(step, here.voltage, &mut before) {
            return Ok(Some(here));
        }
        let aim = here.voltage + step.clamp(-SCAN, SCAN);
        match ladder.rungs[rung].problem.advance(None, &here, aim, &tolerances) {
            Ok(point) => here = point,
            Err(_) => break,
        }
    }
    Ok(bracketed_power(ladder, rung, &start))
}

/// Maximum power about a point, between two voltages with a greatest power between them.
fn bracketed_power(ladder: &mut Ladder, rung: usize, start: &Point) -> Option<Point> {
    let tolerances = ladder.tolerances;
    let mut reach = 0.2 * SCAN;
    while reach < 1.0 {
        let problem = &mut ladder.rungs[rung].problem;
        let low = problem.advance(None, start, (start.voltage - reach).max(0.0), &tolerances).ok()?;
        let high = problem.advance(None, start, start.voltage + reach, &tolerances).ok()?;
        if power_slope(&low) <= 0.0 && power_slope(&high) >= 0.0 {
            return maximum_power(ladder, rung, low, high).map(|(point, _)| point);
        }
        reach *= 3.0;
    }
    None
}

fn levels(curves: &[Curve], read: impl Fn(&Curve) -> Option<f64>) -> Vec<f64> {
    curves.iter().filter_map(read).collect()
}

/// The largest relative error of the figures, or of the points where there are none.
fn worst_error(done: &[Curve], last: &Curve) -> f64 {
    let read = |f: &dyn Fn(&Curve) -> Option<f64>| -> Option<f64> {
        let list: Vec<f64> = done.iter().chain(std::iter::once(last)).filter_map(f).collect();
        (list.len() == done.len() + 1).then(|| {
            let e = extrapolate(&list);
            e.error / e.value.abs()
        })
    };
    let figures = [
        read(&|c| c.short.as_ref().map(|p| p.current)),
        read(&|c| c.open.as_ref().map(|p| p.voltage)),
        read(&|c| c.power.as_ref().map(power)),
    ];
    let worst = figures.iter().flatten().fold(f64::NAN, |a: f64, b| a.max(*b));
    if !worst.is_nan() {
        return worst;
    }
    let scale = last.points.iter().map(|p| p.current.abs()).fold(0.0, f64::max);
    (0..last.points.len())
        .filter_map(|k| read(&|c| c.points.get(k).map(|p| p.current)).map(|e| (e, last.points[k].current)))
        // A point that is nothing beside the curve (zero bias in the dark) asks for no finer mesh.
        .filter(|(_, current)| current.abs() > NOTHING * scale)
        .map(|(error, _)| error / POINTS)
        .fold(0.0, f64::max)
}

/// What is less accurate than asked for on the finest mesh that is tried: figures of merit, or points where there are none.
fn missed_accuracy(accuracy: f64, figures: &[(&str, &Outcome)], points: &[JvPoint]) -> Vec<String> {
    let words = |name: &str, figure: &Figure| format!("{name} to {:.0e}", figure.error / figure.value.abs());
    if figures.iter().any(|(_, outcome)| outcome.is_ok()) {
        return figures
            .iter()
            .filter_map(|(name, outcome)| Some((name, outcome.as_ref().ok()?)))
            .filter(|(_, figure)| figure.error > accuracy * figure.value.abs())
            .map(|(name, figure)| words(name, figure))
            .collect();
    }
    let scale = points.iter().map(|p| p.current_density.abs()).fold(0.0, f64::max);
    points
        .iter()
        .filter(|p| p.current_density.abs() > NOTHING * scale)
        .filter(|p| p.extrapolated.error > POINTS * accuracy * p.extrapolated.value.abs())
        .map(|p| words(&format!("the current at {} V", p.voltage), &p.extrapolated))
        .collect()
}

fn collect(
    ladder: &Ladder,
    curves: Vec<Curve>,
    asked: Vec<f64>,
    lit: bool,
    junction: bool,
    stopped: Option<String>,
) -> CurrentVoltage {
    let finest = &curves[curves.len() - 1];
    let count = curves.iter().map(|c| c.points.len()).min().unwrap_or(0);
    let points: Vec<JvPoint> = (0..count)
        .map(|k| {
            let p = &finest.points[k];
            JvPoint {
                voltage: asked[k],
                junction_voltage: p.state.voltage,
                current_density: p.current,
                conductance: p.conductance,
                conductance_error: conductance_error(curves.iter().filter_map(|c| c.points.get(k))),
                extrapolated: Figure::from_levels(levels(&curves, |c| c.points.get(k).map(|p| p.current))),
            }
        })
        .collect();
    let reason = |text: &str| Absent { reason: text.to_string() };
    let why_none = if !junction {
        Some("the outermost layers make no junction")
    } else if !lit {
        Some("no light is absorbed")
    } else if finest.short.as_ref().is_some_and(|p| p.current >= 0.0) {
        Some("the photocurrent does not flow against the forward diode current")
    } else {
        None
    };
    let figure = |what: &str, read: &dyn Fn(&Curve) -> Option<f64>| -> Outcome {
        if let Some(text) = why_none {
            return Err(reason(text));
        }
        let list = levels(&curves, read);
        if list.len() == curves.len() {
            Ok(Figure::from_levels(list))
        } else {
            Err(reason(&format!("{what} was not reached within the voltages that could be solved")))
        }
    };
    // Beside the mesh: rounding of a current that is the difference of what is generated and what recombines, carried on to
    // each figure.
    let rounding = CANCELLATION * ladder.rungs[0].problem.generated();
    let voltage_of = |p: &Option<Point>| p.as_ref().map_or(0.0, |p| p.voltage.abs());
    let open_rounding = finest.open.as_ref().map_or(0.0, |p| rounding / p.conductance.abs());
    let power_rounding = rounding * voltage_of(&finest.power);
    let jsc = figure("short circuit", &|c| c.short.as_ref().map(|p| -p.current)).map(|f| f.besides(rounding));
    let voc =
        figure("open circuit", &|c| c.open.as_ref().map(|p| p.voltage)).map(|f| f.besides(open_rounding));
    let max_power =
        figure("maximum power", &|c| c.power.as_ref().map(power)).map(|f| f.besides(power_rounding));
    let doubt = curves.iter().filter_map(Curve::best_doubt).fold((0.0, 0.0), |a: (f64, f64), b| {
        // The last mesh counts four thirds in the extrapolation, the one before one third.
        (a.0.max(2.0 * b.0), a.1.max(2.0 * b.1))
    });
    let uneven = |f: Figure, doubt: f64| {
        let error = doubt + UNEVEN * f.last_difference();
        f.besides(error)
    };
    let mpp_voltage =
        figure("maximum power", &|c| c.best().map(|(voltage, _)| voltage)).map(|f| uneven(f, doubt.0));
    let mpp_current = figure("maximum power", &|c| c.best().map(|(_, current)| -current))
        .map(|f| uneven(f, doubt.1 + rounding));
    let fill_factor = figure("maximum power", &|c| {
        Some(power(c.power.as_ref()?) / (-c.short.as_ref()?.current * c.open.as_ref()?.voltage))
    })
    .map(|f| {
        let share = |figure: &Outcome, error: f64| figure.as_ref().map_or(0.0, |g| error / g.value.abs());
        let shares = share(&jsc, rounding) + share(&voc, open_rounding) + share(&max_power, power_rounding);
        let error = f.value.abs() * shares;
        f.besides(error)
    });
    let input_power = ladder.rungs[0].illumination.input_power;
    let efficiency = match input_power {
        Some(input) => figure("maximum power", &|c| Some(power(c.power.as_ref()?) / input))
            .map(|f| f.besides(power_rounding / input)),
        None => Err(reason(why_none.unwrap_or("the light has no wavelength, so its photons have no energy"))),
    };
    let mut warnings = ladder.warnings();
    let figures = [("jsc", &jsc), ("voc", &voc), ("max_power", &max_power)];
    warnings.extend(ladder.missed(&missed_accuracy(ladder.device.stack().accuracy, &figures, &points)));
    CurrentVoltage {
        points,
        jsc,
        voc,
        max_power,
        mpp_voltage,
        mpp_current,
        fill_factor,
        efficiency,
        input_power,
        nodes: ladder.nodes(),
        counts: ladder.work(),
        warnings,
        stopped,
    }
}
