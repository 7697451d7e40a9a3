//! Benchmarks of the main job on the reference cell: 500 nodes, Fermi-Dirac statistics, one thread.

use std::collections::BTreeMap;
use std::hint::black_box;

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use epiloom_solver::analysis::collection::collection_probability;
use epiloom_solver::device::{Contact, Device, Layer, LayerOptics, Profile, Stack, Statistics};
use epiloom_solver::discretise::Coefficients;
use epiloom_solver::linear::{Factors, Triple};
use epiloom_solver::materials::{Material, Parameter};
use epiloom_solver::mesh::{Grading, Mesh};
use epiloom_solver::optics::{Light, LitStack};
use epiloom_solver::quantity::constants::ELEMENTARY_CHARGE;
use epiloom_solver::solve::{Point, Problem, Tolerances};

/// A layer in um, eV, cm^-3 (negative: acceptors), cm^2/Vs, s.
fn layer(
    name: &str,
    thickness: f64,
    doping: f64,
    bands: [f64; 5],
    mobility: [f64; 2],
    lifetime: [f64; 2],
) -> Layer {
    use Parameter::*;
    let values: BTreeMap<Parameter, f64> = [
        (Gap, bands[0] * ELEMENTARY_CHARGE),
        (Affinity, bands[1] * ELEMENTARY_CHARGE),
        (Permittivity, bands[2]),
        (ConductionDensity, bands[3] * 1e6),
        (ValenceDensity, bands[4] * 1e6),
        (ElectronMobility, mobility[0] * 1e-4),
        (HoleMobility, mobility[1] * 1e-4),
        (ElectronLifetime, lifetime[0]),
        (HoleLifetime, lifetime[1]),
        (RadiativeCoefficient, 2e-16),
        (ElectronAuger, 1e-42),
        (HoleAuger, 1e-42),
        (Absorption, 1e6),
    ]
    .into();
    Layer {
        name: name.to_string(),
        material: Material::custom(name, values),
        thickness: thickness * 1e-6,
        donors: Profile::Constant(doping.max(0.0) * 1e6),
        acceptors: Profile::Constant((-doping).max(0.0) * 1e6),
        composition: None,
        optics: LayerOptics::Absorbing,
    }
}

/// The reference cell: p on n GaAs between a window and a back surface field; round numbers, not measured data.
fn reference_cell() -> Device {
    let gaas = [1.424, 4.07, 12.9, 4.7e17, 9e18];
    let mut stack = Stack::new(
        "reference cell",
        vec![
            layer("window", 0.03, -3e18, [1.88, 3.95, 11.8, 6.5e17, 1.45e19], [500.0, 40.0], [1e-9, 1e-9]),
            layer("emitter", 0.5, -2e18, gaas, [3000.0, 200.0], [5e-9, 2e-8]),
            layer("base", 3.0, 2e17, gaas, [3000.0, 200.0], [5e-9, 2e-8]),
            layer("bsf", 0.05, 2e18, [1.8, 3.83, 12.0, 7.5e17, 1.1e19], [1000.0, 80.0], [1e-9, 1e-9]),
        ],
    );
    stack.statistics = Statistics::FermiDirac;
    let contact = Contact { recombination_velocity: Some(1e5) };
    (stack.front, stack.rear) = (contact, contact);
    Device::new(stack).unwrap_or_else(|faults| panic!("{faults:?}"))
}

/// A mesh of about so many nodes.
fn mesh(device: &Device, nodes: usize) -> Mesh {
    let with = |growth: f64| {
        let grading = Grading { spacing: 3e-9_f64.min(1.5e-6 / nodes as f64), growth, most_cells: 20_000 };
        Mesh::new(device, &grading, 0)
    };
    let (mut fine, mut coarse) = (1e-4, 1.0);
    for _ in 0..40 {
        let middle = f64::sqrt(fine * coarse);
        if with(middle).nodes() > nodes { fine = middle } else { coarse = middle }
    }
    with(coarse)
}

fn positions(c: &Coefficients<f64>) -> Vec<Vec<f64>> {
    c.first.windows(2).map(|range| c.depths[range[0]..range[1]].to_vec()).collect()
}

fn problem(device: &Device, nodes: usize) -> Problem {
    let c = Coefficients::new(device, &mesh(device, nodes));
    let light = Light::Monochromatic { photon_flux: 2e21, wavelength: None };
    let lit = LitStack::new(device.stack(), device, &light).unwrap();
    let illumination = lit.illuminate(&positions(&c)).unwrap();
    Problem::new(c, &illumination.generation, 0.0, 0.0)
}

/// 60 points from 0 V in steps of 20 mV.
fn curve(problem: &mut Problem, start: &Point, polish: bool) -> f64 {
    let tolerances = Tolerances { polish, ..Tolerances::default() };
    let mut before: Option<Point> = None;
    let mut here = start.clone();
    let mut sum = here.current;
    for k in 1..60 {
        let next = problem.advance(before.as_ref(), &here, 0.02 * f64::from(k), &tolerances).unwrap();
        sum += next.current;
        before = Some(std::mem::replace(&mut here, next));
    }
    sum
}

fn current_voltage(c: &mut Criterion) {
    let device = reference_cell();
    let mut group = c.benchmark_group("60-point J-V");
    group.sample_size(20);
    for nodes in [100, 500, 2000, 10_000] {
        let mut problem = problem(&device, nodes);
        let start = problem.short_circuit(&Tolerances::default()).unwrap();
        for polish in [false, true] {
            problem.work = Default::default();
            curve(&mut problem, &start, polish);
            let count = problem.coefficients.nodes();
            eprintln!("{count} nodes, 59 steps of 20 mV, polished {polish}: {:?}", problem.work);
            let name = if polish { "polished, nodes" } else { "nodes" };
            group.bench_function(BenchmarkId::new(name, nodes), |b| {
                b.iter(|| black_box(curve(&mut problem, &start, polish)))
            });
        }
    }
    group.finish();
}

fn spectral_response(c: &mut Criterion) {
    let device = reference_cell();
    let mut problem = problem(&device, 500);
    let point = problem.short_circuit(&Tolerances::default()).unwrap();
    let wavelengths: Vec<f64> = (0..100).map(|k| 300e-9 + 5.5e-9 * f64::from(k)).collect();
    c.bench_function("100-point EQE at 500 nodes, generation included", |b| {
        b.iter(|| {
            let probe = LitStack::probed(device.stack(), &device, &wavelengths).unwrap();
            let (operator, _) = probe.operator(&positions(&problem.coefficients)).unwrap();
            let collection = collection_probability(&mut problem, &point).unwrap_or_default();
            let per_entry: Vec<f64> = problem.coefficients.places().map(|(_, _, i)| collection[i]).collect();
            black_box(operator.apply_transposed(&per_entry))
        })
    });
}

fn pieces(c: &mut Criterion) {
    let device = reference_cell();
    let mut problem = problem(&device, 500);
    let point = problem.short_circuit(&Tolerances::default()).unwrap();
    c.bench_function("assembly at 500 nodes", |b| {
        b.iter(|| {
            problem.assemble(&point.state);
        })
    });
    problem.assemble(&point.state);
    let matrix = problem.system().jacobian.clone();
    let rhs: Vec<Triple> = (0..matrix.nodes()).map(|i| Triple::repeat(i as f64)).collect();
    let mut factors = Factors::default();
    c.bench_function("factor and solve at 500 nodes", |b| {
        b.iter(|| {
            matrix.factor(&mut factors).unwrap();
            let mut x = rhs.clone();
            factors.solve(&mut x);
            black_box(x)
        })
    });
    c.bench_function("set-up at 500 nodes: mesh, coefficients, light, equilibrium, short circuit", |b| {
        b.iter(|| {
            let mut p = self::problem(&device, 500);
            black_box(p.short_circuit(&Tolerances::default()).unwrap())
        })
    });
}

criterion_group!(benches, current_voltage, spectral_response, pieces);
criterion_main!(benches);
