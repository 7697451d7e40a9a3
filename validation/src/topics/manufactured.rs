//! Order of accuracy of the coupled discrete equations on a manufactured solution: Fermi-Dirac statistics, a graded gap, all
//! three channels, non-uniform meshes, a heterointerface.
//!
//! The fields are imposed; what they fail to satisfy goes into the right-hand side of the solver's own residual, both ends
//! are fixed, and the solver's own Jacobian and factors bring the discrete solution. `manufactured.py` states the right-hand side.

use epiloom_solver::device::{Device, Stack, Statistics};
use epiloom_solver::discretise::{Coefficients, System, scales};
use epiloom_solver::linear::{Block, Factors, Triple};
use epiloom_solver::math::elementary::{cos, exp, exp_m1, ln, sin};
use epiloom_solver::math::fermi_dirac_half;
use epiloom_solver::mesh::Mesh;
use epiloom_solver::quantity::constants::{ELEMENTARY_CHARGE, VACUUM_PERMITTIVITY};
use serde::Deserialize;

use crate::bulk::{Bulk, device};
use crate::check::{Check, Checks, Source, Tolerance};
use crate::stored::Failure;

const STORED: &str = include_str!("../../reference/manufactured.json");

#[derive(Deserialize)]
struct Field {
    constant: f64,
    amplitude: f64,
    function: String,
    wavenumber: f64,
    phase: f64,
}

#[derive(Deserialize)]
#[allow(non_snake_case, reason = "names of the file, which end in a unit")]
struct Fields {
    unit_length_m: f64,
    psi_V: Field,
    phi_n_V: Field,
    phi_p_V: Field,
}

/// A layer whose gap and affinity go linearly from a front to a rear value.
#[derive(Deserialize)]
struct GradedLayer {
    thickness_m: f64,
    donors_per_m3: f64,
    acceptors_per_m3: f64,
    #[serde(rename = "gap_eV")]
    gap: [f64; 2],
    #[serde(rename = "affinity_eV")]
    affinity: [f64; 2],
    relative_permittivity: f64,
    nc_per_m3: f64,
    nv_per_m3: f64,
    #[serde(rename = "electron_mobility_m2_per_Vs")]
    electron_mobility: f64,
    #[serde(rename = "hole_mobility_m2_per_Vs")]
    hole_mobility: f64,
    electron_lifetime_s: f64,
    hole_lifetime_s: f64,
    radiative_coefficient_m3_per_s: f64,
    electron_auger_m6_per_s: f64,
    hole_auger_m6_per_s: f64,
}

#[derive(Deserialize)]
struct Place {
    layer: usize,
    x_m: f64,
    n_per_m3: String,
    p_per_m3: String,
    #[serde(rename = "displacement_C_per_m2")]
    displacement: String,
    #[serde(rename = "electron_current_A_per_m2")]
    electron_current: String,
    #[serde(rename = "hole_current_A_per_m2")]
    hole_current: String,
    shockley_read_hall_per_m3_s: String,
    radiative_per_m3_s: String,
    auger_per_m3_s: String,
}

/// Errors of the other program's discrete solution on a mesh.
#[derive(Deserialize)]
struct MeshErrors {
    cells: [usize; 2],
    #[serde(rename = "psi_V")]
    psi: f64,
    #[serde(rename = "phi_n_V")]
    phi_n: f64,
    #[serde(rename = "phi_p_V")]
    phi_p: f64,
    front_electron_current: f64,
}

#[derive(Deserialize)]
struct File {
    #[serde(rename = "temperature_K")]
    temperature: f64,
    fields: Fields,
    layers: Vec<GradedLayer>,
    points: Vec<Place>,
    meshes: Vec<MeshErrors>,
}

/// What the imposed fields make at one place: densities, the three fluxes, charge and the rates of the channels, SI.
struct Exact {
    n: f64,
    p: f64,
    fluxes: [f64; 3],
    charge: f64,
    rates: [f64; 3],
}

impl Field {
    /// Value in V and slope in V/m.
    fn at(&self, x: f64, unit: f64) -> (f64, f64) {
        let k = self.wavenumber / unit;
        let argument = k * x + self.phase;
        let (value, slope) = match self.function.as_str() {
            "cos" => (cos(argument), -sin(argument)),
            _ => (sin(argument), cos(argument)),
        };
        (self.constant + self.amplitude * value, self.amplitude * slope * k)
    }
}

impl File {
    fn start(&self, layer: usize) -> f64 {
        self.layers[..layer].iter().map(|l| l.thickness_m).sum()
    }

    fn thermal_voltage(&self) -> f64 {
        epiloom_solver::quantity::constants::BOLTZMANN * self.temperature / ELEMENTARY_CHARGE
    }

    /// Affinity and gap at a depth, eV.
    fn edges(&self, layer: usize, x: f64) -> (f64, f64) {
        let l = &self.layers[layer];
        let share = (x - self.start(layer)) / l.thickness_m;
        let between = |[front, rear]: [f64; 2]| front + (rear - front) * share;
        (between(l.affinity), between(l.gap))
    }

    fn imposed(&self, x: f64) -> [(f64, f64); 3] {
        let f = &self.fields;
        [&f.psi_V, &f.phi_n_V, &f.phi_p_V].map(|field| field.at(x, f.unit_length_m))
    }

    fn exact(&self, layer: usize, x: f64) -> Exact {
        let l = &self.layers[layer];
        let vt = self.thermal_voltage();
        let [(psi, psi_x), (phi_n, n_x), (phi_p, p_x)] = self.imposed(x);
        let (affinity, gap) = self.edges(layer, x);
        let n = l.nc_per_m3 * fermi_dirac_half((psi - phi_n + affinity) / vt);
        let p = l.nv_per_m3 * fermi_dirac_half((phi_p - psi - affinity - gap) / vt);
        let driving = -n * p * exp_m1((phi_n - phi_p) / vt);
        let intrinsic = (l.nc_per_m3 * l.nv_per_m3).sqrt() * exp(-0.5 * gap / vt);
        Exact {
            n,
            p,
            fluxes: [
                l.relative_permittivity * VACUUM_PERMITTIVITY * psi_x,
                -ELEMENTARY_CHARGE * l.electron_mobility * n * n_x,
                -ELEMENTARY_CHARGE * l.hole_mobility * p * p_x,
            ],
            charge: ELEMENTARY_CHARGE * (p - n + l.donors_per_m3 - l.acceptors_per_m3),
            rates: [
                driving / (l.hole_lifetime_s * (n + intrinsic) + l.electron_lifetime_s * (p + intrinsic)),
                l.radiative_coefficient_m3_per_s * driving,
                (l.electron_auger_m6_per_s * n + l.hole_auger_m6_per_s * p) * driving,
            ],
        }
    }

    fn device(&self) -> Result<Device, Failure> {
        let layers = self.layers.iter().enumerate().map(|(k, l)| {
            let bulk = Bulk {
                gap: l.gap[0],
                affinity: l.affinity[0],
                permittivity: l.relative_permittivity,
                nc: l.nc_per_m3,
                nv: l.nv_per_m3,
                electron_mobility: l.electron_mobility,
                hole_mobility: l.hole_mobility,
                electron_lifetime: l.electron_lifetime_s,
                hole_lifetime: l.hole_lifetime_s,
                radiative: l.radiative_coefficient_m3_per_s,
                electron_auger: l.electron_auger_m6_per_s,
                hole_auger: l.hole_auger_m6_per_s,
                absorption: 0.0,
            };
            bulk.layer(&format!("layer {k}"), l.thickness_m, l.donors_per_m3, l.acceptors_per_m3)
        });
        let mut stack = Stack::new("manufactured", layers.collect());
        stack.temperature = self.temperature;
        stack.statistics = Statistics::FermiDirac;
        device(stack)
    }

    /// The solver's coefficients on a mesh, with the grading put in.
    fn coefficients(&self, cells: [usize; 2]) -> Result<Coefficients<f64>, Failure> {
        const PI: f64 = std::f64::consts::PI;
        let fractions = |count: usize| -> Vec<f64> {
            let place = |k: usize| {
                let s = k as f64 / count as f64;
                if k == count { 1.0 } else { s + 0.15 * sin(2.0 * PI * s) / PI }
            };
            (0..=count).map(place).collect()
        };
        let mesh = Mesh::from_fractions(cells.iter().map(|c| fractions(*c)).collect());
        let mut c = Coefficients::new(&self.device()?, &mesh);
        let vt = self.thermal_voltage();
        for layer in 0..self.layers.len() {
            for e in c.first[layer]..c.first[layer + 1] {
                let (affinity, gap) = self.edges(layer, c.depths[e]);
                let entry = &mut c.entries[e];
                entry.affinity = affinity / vt;
                entry.affinity_and_gap = (affinity + gap) / vt;
                let intrinsic = exp(0.5 * (entry.ln_conduction + entry.ln_valence - gap / vt));
                (entry.level.n1, entry.level.p1) = (intrinsic, intrinsic);
            }
        }
        Ok(c)
    }

    /// What the imposed fields fail to satisfy, in the scaled rows of each node.
    fn source(&self, c: &Coefficients<f64>) -> Vec<Triple> {
        // Six-point Gauss rule on 0..1: places and weights.
        const RULE: [(f64, f64); 6] = [
            (0.033_765_242_898_423_99, 0.085_662_246_189_585_18),
            (0.169_395_306_766_867_74, 0.180_380_786_524_069_3),
            (0.380_690_406_958_401_54, 0.233_956_967_286_345_52),
            (0.619_309_593_041_598_5, 0.233_956_967_286_345_52),
            (0.830_604_693_233_132_3, 0.180_380_786_524_069_3),
            (0.966_234_757_101_576, 0.085_662_246_189_585_18),
        ];
        let mut rows = vec![[0.0; 3]; c.nodes()];
        for layer in 0..c.layers() {
            for right in c.first[layer] + 1..c.first[layer + 1] {
                let (left, i) = (right - 1, right - layer);
                let (a, b) = (c.depths[left], c.depths[right]);
                let middle = 0.5 * (a + b);
                let through = self.exact(layer, middle).fluxes;
                for (node, low, high, sign) in [(i - 1, a, middle, 1.0), (i, middle, b, -1.0)] {
                    let (mut charge, mut rate) = (0.0, 0.0);
                    for (place, weight) in RULE {
                        let here = self.exact(layer, low + (high - low) * place);
                        charge += here.charge * weight * (high - low);
                        rate += here.rates.iter().sum::<f64>() * weight * (high - low);
                    }
                    let inside = [charge, -ELEMENTARY_CHARGE * rate, ELEMENTARY_CHARGE * rate];
                    for row in 0..3 {
                        rows[node][row] += sign * through[row] + inside[row];
                    }
                }
            }
        }
        // Nothing enters beyond the ends.
        let last = c.nodes() - 1;
        let ends =
            (self.exact(0, 0.0).fluxes, self.exact(c.layers() - 1, c.depths[c.entries.len() - 1]).fluxes);
        for (row, (front, rear)) in ends.0.into_iter().zip(ends.1).enumerate() {
            rows[0][row] -= front;
            rows[last][row] += rear;
        }
        let charge = ELEMENTARY_CHARGE * scales::DENSITY * scales::LENGTH;
        rows.iter()
            .map(|r| Triple::new(r[0] / charge, r[1] / scales::CURRENT, r[2] / scales::CURRENT))
            .collect()
    }

    /// Root mean square errors of the three potentials, V, and the relative error of the electron current at the front.
    fn errors(&self, cells: [usize; 2]) -> Result<[f64; 4], Failure> {
        let c = self.coefficients(cells)?;
        let vt = self.thermal_voltage();
        let source = self.source(&c);
        let nodes: Vec<usize> = c.places().map(|(_, _, i)| i).collect();
        let mut depth = vec![0.0; c.nodes()];
        let mut volume = vec![0.0; c.nodes()];
        for (e, i) in nodes.iter().enumerate() {
            depth[*i] = c.depths[e];
            volume[*i] += c.entries[e].volume;
        }
        let wanted: Vec<[f64; 3]> =
            depth.iter().map(|x| self.imposed(*x).map(|(value, _)| value / vt)).collect();
        let mut state = wanted.clone();
        let remainders = vec![[0.0; 2]; state.len()];
        let generation = vec![0.0; c.entries.len()];
        let mut system = System::new(&c);
        let mut factors = Factors::default();
        let last = c.nodes() - 1;
        for _ in 0..30 {
            // The rear level is zero, so that the stored potentials are the potentials themselves.
            system.assemble(&c, &state, &remainders, 0.0, &generation, 0.0);
            let mut update: Vec<Triple> = system.residual.iter().zip(&source).map(|(r, s)| s - r).collect();
            for (i, wanted) in [(0, wanted[0]), (last, wanted[last])] {
                system.jacobian.diagonal[i] = Block::identity();
                let coupling =
                    if i == 0 { &mut system.jacobian.upper[0] } else { &mut system.jacobian.lower[last] };
                *coupling = Block::zeros();
                update[i] = Triple::from_fn(|row, _| wanted[row] - state[i][row]);
            }
            // The column sums belong to the contacts' own laws: eliminate by rows.
            system.jacobian.sums.clear();
            system.jacobian.factor(&mut factors).map_err(|s| format!("singular at node {}", s.node))?;
            factors.solve(&mut update);
            let size = update.iter().fold(0.0, |a: f64, u| a.max(u.amax()));
            for (x, u) in state.iter_mut().zip(&update) {
                for k in 0..3 {
                    x[k] += u[k];
                }
            }
            if size < 1e-11 {
                break;
            }
        }
        system.assemble(&c, &state, &remainders, 0.0, &generation, 0.0);
        let total: f64 = volume.iter().sum();
        let rms = |k: usize| {
            let sum: f64 = (0..=last)
                .map(|i| {
                    let off = state[i][k] - wanted[i][k];
                    volume[i] * off * off
                })
                .sum();
            vt * (sum / total).sqrt()
        };
        // The front node's electron row lacks nothing but the current through the front.
        let front = (system.electron_flux[0] - system.net[0] - source[0][1]) * scales::CURRENT;
        let current = self.exact(0, 0.0).fluxes[1];
        Ok([rms(0), rms(1), rms(2), (front / current - 1.0).abs()])
    }
}

const WHAT: [&str; 4] = [
    "potential",
    "electrons' quasi-Fermi potential",
    "holes' quasi-Fermi potential",
    "electron current at the front",
];

fn number(text: &str) -> f64 {
    text.parse().unwrap_or(f64::NAN)
}

/// Imposed fields, errors on five meshes, orders over three halvings.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let stored: File = serde_json::from_str(STORED)?;
    let exactly = Source::Computed("imposed fields, 18 digits (mpmath, manufactured.py)");
    let mut checks = Checks::new("manufactured", exactly);
    let mut pairs = Vec::new();
    for place in &stored.points {
        let ours = stored.exact(place.layer, place.x_m);
        for (what, text, value) in [
            ("electrons", &place.n_per_m3, ours.n),
            ("holes", &place.p_per_m3, ours.p),
            ("displacement", &place.displacement, ours.fluxes[0]),
            ("electron current", &place.electron_current, ours.fluxes[1]),
            ("hole current", &place.hole_current, ours.fluxes[2]),
            ("Shockley-Read-Hall", &place.shockley_read_hall_per_m3_s, ours.rates[0]),
            ("radiative", &place.radiative_per_m3_s, ours.rates[1]),
            ("Auger", &place.auger_per_m3_s, ours.rates[2]),
        ] {
            pairs.push((format!("{what} at {:e} m", place.x_m), number(text), value));
        }
    }
    let rounding = "rounding of energies of 200 kT/q in an exponent";
    checks.worst("imposed densities, fluxes and rates", &pairs, Tolerance::Relative(2e-12), rounding);

    checks
        .source(Source::Computed("same discrete equations, errors to three digits (numpy, manufactured.py)"));
    for mesh in &stored.meshes {
        let ours = stored.errors(mesh.cells)?;
        let pairs: Vec<(String, f64, f64)> = [mesh.psi, mesh.phi_n, mesh.phi_p, mesh.front_electron_current]
            .into_iter()
            .zip(ours)
            .zip(WHAT)
            .map(|((reference, ours), what)| (what.to_string(), reference, ours))
            .collect();
        let what = format!("errors on {} cells", mesh.cells[0] + mesh.cells[1]);
        checks.worst(&what, &pairs, Tolerance::Relative(1e-2), "the three digits stored");
    }
    checks.source(Source::Algebra("order of the scheme: 2"));
    let meshes = [[80, 120], [160, 240], [320, 480], [640, 960]];
    let errors: Vec<[f64; 4]> = meshes.iter().map(|m| stored.errors(*m)).collect::<Result<_, _>>()?;
    for (k, what) in WHAT.into_iter().enumerate() {
        for (halving, pair) in errors.windows(2).enumerate() {
            checks.absolute(
                format!("{what}, observed order from {} cells", meshes[halving][0] + meshes[halving][1]),
                2.0,
                ln(pair[0][k] / pair[1][k]) / std::f64::consts::LN_2,
                0.1,
                "asked of every halving",
            );
        }
    }
    Ok(checks.done())
}
