//! Electrostatics of junctions: built-in voltage, depletion width and peak field of worked examples, Debye tails.

use epiloom_solver::analysis::{bias_point, capacitance, equilibrium};
use epiloom_solver::device::Device;
use epiloom_solver::discretise::Coefficients;
use epiloom_solver::math::elementary::{exp, ln};
use epiloom_solver::mesh::{Grading, Mesh};
use epiloom_solver::optics::Light;
use epiloom_solver::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE, VACUUM_PERMITTIVITY};
use epiloom_solver::solve::Problem;

use crate::bulk::{Bulk, VT, device, stack};
use crate::check::{Check, Checks, Source};
use crate::stored::Failure;

/// An abrupt junction of a textbook problem, in the units of the trade, with the depletion approximation's answers.
struct Example {
    name: &'static str,
    source: Source,
    acceptors: f64,
    donors: f64,
    intrinsic: f64,
    permittivity: f64,
    thermal_voltage: f64,
    built_in: f64,
    /// Voltage, width in um, peak field in V/cm where the source has it.
    states: &'static [(f64, f64, Option<f64>)],
}

const VT300: f64 = VT;
const EXAMPLES: [Example; 6] = [
    Example {
        name: "Si 1e16/5e16",
        source: Source::Published(
            "worked problem in open course notes (tutorsglobe), depletion approximation",
        ),
        acceptors: 1e16,
        donors: 5e16,
        intrinsic: 1e10,
        permittivity: 11.9,
        thermal_voltage: VT300,
        built_in: 0.75592,
        states: &[
            (0.0, 0.3454, Some(0.4377e5)),
            (0.5, 0.2010, Some(0.2547e5)),
            (-2.5, 0.7169, Some(0.9084e5)),
        ],
    },
    Example {
        name: "Si 4e17/8e17",
        source: Source::Published(
            "worked problem in open course notes (garytuttle.ee), depletion approximation",
        ),
        acceptors: 4e17,
        donors: 8e17,
        intrinsic: 6e9,
        permittivity: 11.8,
        thermal_voltage: VT300,
        built_in: 0.94938,
        states: &[(0.0, 0.06814, Some(2.786e5))],
    },
    Example {
        name: "Si 3e18/5e15",
        source: Source::Published(
            "worked problem in open course notes (ele.uri.edu), depletion approximation; ni and permittivity assumed",
        ),
        acceptors: 3e18,
        donors: 5e15,
        intrinsic: 1e10,
        permittivity: 11.7,
        thermal_voltage: VT300,
        built_in: 0.84385,
        states: &[(0.0, 0.4676, Some(3.610e4))],
    },
    Example {
        name: "Si 1e16/1e15, kT/q 25 mV",
        source: Source::Published(
            "worked problem in open course notes (coursehero), depletion approximation",
        ),
        acceptors: 1e16,
        donors: 1e15,
        intrinsic: 1e10,
        permittivity: 11.7,
        thermal_voltage: 0.025,
        built_in: 0.633,
        states: &[(0.0, 0.949, None), (-10.0, 3.89, None)],
    },
    Example {
        name: "GaAs 1e17/1e17",
        source: Source::Algebra("depletion approximation, worked by hand"),
        acceptors: 1e17,
        donors: 1e17,
        intrinsic: 2.1e6,
        permittivity: 12.9,
        thermal_voltage: VT300,
        built_in: 1.27122,
        states: &[(0.0, 0.19039, None)],
    },
    Example {
        name: "GaAs 1e17/2e18",
        source: Source::Algebra("depletion approximation, worked by hand"),
        acceptors: 1e17,
        donors: 2e18,
        intrinsic: 2.1e6,
        permittivity: 12.9,
        thermal_voltage: VT300,
        built_in: 1.34867,
        states: &[(0.0, 0.14209, None)],
    },
];

impl Example {
    /// The junction, each side as thick as its depletion at the largest reverse and a dozen Debye lengths.
    fn device(&self) -> Result<Device, Failure> {
        let gap = 1.4;
        let density = self.intrinsic * 1e6 * exp(0.5 * gap / self.thermal_voltage);
        let bulk = Bulk { gap, permittivity: self.permittivity, nc: density, nv: density, ..Bulk::default() };
        let widest = self.states.iter().map(|s| s.1).fold(0.0, f64::max) * 1e-6;
        let side = |doping: f64, other: f64| {
            let debye = (self.permittivity * VACUUM_PERMITTIVITY * self.thermal_voltage
                / (ELEMENTARY_CHARGE * doping * 1e6))
                .sqrt();
            widest * other / (doping + other) + 12.0 * debye
        };
        let (p, n) = (side(self.acceptors, self.donors), side(self.donors, self.acceptors));
        let layers =
            vec![bulk.layer("p", p, 0.0, self.acceptors * 1e6), bulk.layer("n", n, self.donors * 1e6, 0.0)];
        let mut stack = stack(layers, [None, None]);
        stack.temperature = self.thermal_voltage * ELEMENTARY_CHARGE / BOLTZMANN;
        device(stack)
    }

    /// The field at the junction, V/m: on either side the first integral of Poisson's equation gives
    /// `E^2 = (2 kT/eps) (N (e^-u - 1 + u) + m (e^u - 1 - u))`, u the drop there over kT/q, N the doping and m the
    /// minority carriers of its bulk; the two drops make up the whole.
    fn peak_field(&self, voltage: f64) -> f64 {
        let vt = self.thermal_voltage;
        let square = self.intrinsic * self.intrinsic;
        let total = ln(self.acceptors * self.donors / square) - voltage / vt;
        let side = |doping: f64, other: f64, u: f64| {
            doping * (exp(-u) - 1.0 + u) + other * exp(-total) * (exp(u) - 1.0 - u)
        };
        let (mut low, mut high) = (0.0, total);
        for _ in 0..100 {
            let u = 0.5 * (low + high);
            let more = side(self.acceptors, self.donors, u) < side(self.donors, self.acceptors, total - u);
            if more { low = u } else { high = u }
        }
        let value = side(self.acceptors, self.donors, low) * 1e6;
        (2.0 * vt * ELEMENTARY_CHARGE / (self.permittivity * VACUUM_PERMITTIVITY) * value).sqrt()
    }

    fn checks(&self, checks: &mut Checks) -> Result<(), Failure> {
        let device = self.device()?;
        checks.source(self.source);
        let printed = "the digits printed";
        checks.absolute(
            format!("{}, built-in voltage, V", self.name),
            self.built_in,
            built_in_voltage(&device),
            if self.built_in == 0.633 { 5e-4 } else { 1e-5 },
            printed,
        );
        let voltages: Vec<f64> = self.states.iter().map(|s| s.0).collect();
        let ours = capacitance(&device, &Light::Dark, &voltages)?;
        for ((voltage, width, field), point) in self.states.iter().zip(&ours.points) {
            // The carriers' tails take 2 kT/q off the voltage that the depletion approximation drops over the layer.
            let drop = self.built_in - voltage;
            let tails = ((drop - 2.0 * self.thermal_voltage) / drop).sqrt();
            let ours = self.permittivity * VACUUM_PERMITTIVITY / point.capacitance.value;
            let unequal = self.acceptors / self.donors > 100.0;
            let (share, reason) = match (unequal, *voltage > 0.0) {
                (true, _) => (
                    6e-2,
                    "2 % asked; with dopings of 600 to 1 holes spill over the junction, which the approximation leaves out",
                ),
                (_, true) => (
                    4e-2,
                    "2 % asked; the tails' correction is to first order, and the drop is 10 kT/q alone",
                ),
                _ => (2e-2, "the tails' correction is to first order in kT/q over the drop"),
            };
            checks.relative(
                format!(
                    "{} at {voltage} V, depletion width from C, less 2 kT/q for the tails, um",
                    self.name
                ),
                width * tails,
                ours * 1e6,
                share,
                reason,
            );
            let state = bias_point(&device, &Light::Dark, *voltage)?;
            let ours = state.profiles.field.iter().fold(0.0, |a: f64, f| a.max(f.abs())) * 1e-2;
            if let (Some(field), false) = (field, unequal) {
                checks.relative(
                    format!("{} at {voltage} V, peak field, less 2 kT/q for the tails, V/cm", self.name),
                    field * tails,
                    ours,
                    if *voltage > 0.0 { 5e-2 } else { 3e-2 },
                    reason,
                );
            }
            checks
                .source(Source::Algebra("first integral of Poisson's equation with flat levels, both sides"));
            checks.relative(
                format!("{} at {voltage} V, peak field, V/cm", self.name),
                self.peak_field(*voltage) * 1e-2,
                ours,
                1e-2,
                "the field is that of the edge beside the junction",
            );
            checks.source(self.source);
        }
        Ok(())
    }
}

/// Difference of the contacts' neutral potentials.
fn built_in_voltage(device: &Device) -> f64 {
    let mesh = Mesh::new(device, &Grading::default(), 0);
    let coefficients = Coefficients::new(device, &mesh);
    let generation = vec![0.0; mesh.entries()];
    Problem::new(coefficients, &generation, 0.0, 0.0).built_in_voltage()
}

fn built_in(checks: &mut Checks) -> Result<(), Failure> {
    checks.source(Source::Algebra("kT/q ln(Na Nd / ni^2)"));
    let bulk = Bulk::default();
    let intrinsic_square = bulk.nc * bulk.nv * exp(-bulk.gap / VT);
    for (acceptors_cm3, donors_cm3) in [(1e17, 1e17), (1e17, 2e18), (1e15, 1e15)] {
        let (acceptors, donors) = (acceptors_cm3 * 1e6, donors_cm3 * 1e6);
        let layers = vec![bulk.layer("p", 1e-6, 0.0, acceptors), bulk.layer("n", 1e-6, donors, 0.0)];
        let ours = built_in_voltage(&device(stack(layers, [None, None]))?);
        let expected = VT * ln(acceptors * donors / intrinsic_square);
        let what = format!("built-in voltage, {acceptors_cm3:e} and {donors_cm3:e} per cm3, V");
        checks.relative(what, expected, ours, 1e-12, "rounding; minority carriers count 1e-17 of the doping");
    }
    Ok(())
}

/// How fast the potential falls back to its bulk value behind a step of the doping, between two distances in Debye lengths
/// of the lower side.
fn debye_tail(checks: &mut Checks) -> Result<(), Failure> {
    checks.source(Source::Algebra("sqrt(eps kT / q^2 N)"));
    for (doping_cm3, ratio, near, far, share, reason) in [
        (1e16, 1.001, 0.5, 2.5, 1e-3, "the step of 0.1 % leaves the tail linear to 5e-4"),
        (1e17, 1.001, 0.5, 2.5, 1e-3, "the step of 0.1 % leaves the tail linear to 5e-4"),
        (
            1e16,
            30.0,
            6.0,
            9.0,
            2e-2,
            "where the tail has fallen to some thousandths of kT/q it is linear to that",
        ),
    ] {
        let doping = doping_cm3 * 1e6;
        let bulk = Bulk::default();
        let debye = (bulk.permittivity * VACUUM_PERMITTIVITY * VT / (ELEMENTARY_CHARGE * doping)).sqrt();
        let length = 16.0 * debye;
        let mut stack = stack(
            vec![bulk.layer("higher", length, doping * ratio, 0.0), bulk.layer("lower", length, doping, 0.0)],
            [None, None],
        );
        stack.accuracy = 1e-9;
        let point = equilibrium(&device(stack)?)?;
        let p = &point.profiles;
        let bulk = p.potential[p.potential.len() - 1];
        let behind = |distance: f64| {
            let wanted = length + distance * debye;
            let found = (0..p.depth.len())
                .filter(|e| p.layer[*e] == 1)
                .min_by(|a, b| (p.depth[*a] - wanted).abs().total_cmp(&(p.depth[*b] - wanted).abs()));
            found.map_or((f64::NAN, f64::NAN), |e| (p.depth[e], p.potential[e] - bulk))
        };
        let ((x1, y1), (x2, y2)) = (behind(near), behind(far));
        let ours = (x2 - x1) / ln(y1 / y2);
        let what = format!("Debye length from the tail of a step of {ratio}, {doping_cm3:e} per cm3, nm");
        checks.relative(what, debye * 1e9, ours * 1e9, share, reason);
    }
    Ok(())
}

/// All of them.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("junctions", Source::Algebra("kT/q ln(Na Nd / ni^2)"));
    built_in(&mut checks)?;
    for example in &EXAMPLES {
        example.checks(&mut checks)?;
    }
    debye_tail(&mut checks)?;
    Ok(checks.done())
}
