//! Benchmarks of the main job on the reference cell: 500 nodes, one thread, Fermi-Dirac statistics where nothing is said.

use std::collections::BTreeMap;
use std::hint::black_box;

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use epiloom_solver::analysis::collection::collection_probability;
use epiloom_solver::analysis::{Voltages, current_voltage as analysed};
use epiloom_solver::device::{Contact, Device, Layer, LayerOptics, Profile, Stack, Statistics};
use epiloom_solver::discretise::Coefficients;
use epiloom_solver::linear::{Factors, Triple};
use epiloom_solver::materials::{Material, Parameter};
use epiloom_solver::math::lanes::Width;
use epiloom_solver::mesh::{Grading, Mesh};
use epiloom_solver::optics::{Light, LitStack, Spectrum};
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
        defects: Vec::new(),
    }
}

/// The reference cell: p on n GaAs between a window and a back surface field; round numbers, not measured data.
fn reference_cell() -> Device {
    reference_cell_with(Statistics::FermiDirac)
}

fn reference_cell_with(statistics: Statistics) -> Device {
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
    stack.statistics = statistics;
    let contact = Contact::Ohmic { recombination_velocity: Some(1e5) };
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
    problem_on(device, &mesh(device, nodes))
}

fn problem_on(device: &Device, mesh: &Mesh) -> Problem {
    let c = Coefficients::new(device, mesh);
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

/// An AlGaAs and GaAs cell of library materials, under whose light absorption has to be looked up and followed.
fn library_cell() -> Device {
    let layer = |name: &str, material: &str, x: Option<f64>, thickness: f64, doping: f64| Layer {
        name: name.to_string(),
        material: Material::library(material, x),
        thickness: thickness * 1e-6,
        donors: Profile::Constant(doping.max(0.0) * 1e6),
        acceptors: Profile::Constant((-doping).max(0.0) * 1e6),
        composition: None,
        optics: LayerOptics::Absorbing,
        defects: Vec::new(),
    };
    let mut stack = Stack::new(
        "library cell",
        vec![
            layer("window", "AlGaAs", Some(0.8), 0.03, 2e18),
            layer("emitter", "GaAs", None, 0.12, 2e18),
            layer("base", "GaAs", None, 3.0, -1e17),
            layer("bsf", "AlGaAs", Some(0.3), 0.08, -2e18),
            layer("buffer", "GaAs", None, 0.3, -5e18),
        ],
    );
    stack.front = Contact::Ohmic { recombination_velocity: Some(1e4) };
    stack.rear = Contact::Ohmic { recombination_velocity: Some(1e5) };
    Device::new(stack).unwrap_or_else(|faults| panic!("{faults:?}"))
}

/// What a point of a sweep costs: a curve on one mesh with all of its set-up, and the whole analysis with its errors.
fn sweep_points(c: &mut Criterion) {
    let mut group = c.benchmark_group("point of a sweep");
    group.sample_size(20);
    for statistics in [Statistics::FermiDirac, Statistics::Boltzmann] {
        let device = reference_cell_with(statistics);
        // The mesh whose growth gives 500 nodes is sought once; the sweep makes it anew at each point.
        let mesh = mesh(&device, 500);
        for polish in [false, true] {
            let name = format!("60-point J-V with set-up, 500 nodes, {statistics:?}, polished {polish}");
            group.bench_function(name, |b| {
                b.iter(|| {
                    let device = reference_cell_with(statistics);
                    let mut problem = problem_on(&device, &mesh);
                    let start = problem.short_circuit(&Tolerances::default()).unwrap();
                    black_box(curve(&mut problem, &start, polish))
                })
            });
        }
    }
    let sun = Light::Spectrum { spectrum: Spectrum::standard("AM1.5G").unwrap(), suns: 1.0 };
    let beam = Light::Monochromatic { photon_flux: 2e21, wavelength: None };
    for (name, device, light) in [("reference", reference_cell(), beam), ("library", library_cell(), sun)] {
        let result = analysed(&device, &light, &Voltages::Automatic).unwrap();
        eprintln!(
            "{name} cell: meshes of {:?} nodes, {} points, {:?}",
            result.nodes,
            result.points.len(),
            result.counts
        );
        group.bench_function(format!("whole analysis of the {name} cell, errors included"), |b| {
            b.iter(|| black_box(analysed(&device, &light, &Voltages::Automatic).unwrap()))
        });
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
    for width in Width::ALL.into_iter().filter(|width| width.available()) {
        problem.set_width(width);
        c.bench_function(&format!("assembly at 500 nodes, width {width:?}"), |b| {
            b.iter(|| {
                problem.assemble(&point.state);
            })
        });
    }
    problem.set_width(Width::widest());
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
    let mesh = mesh(&device, 500);
    c.bench_function("set-up at 500 nodes: device, coefficients, light, equilibrium", |b| {
        b.iter(|| {
            let device = reference_cell();
            let mut p = problem_on(&device, &mesh);
            black_box(p.equilibrium(&Tolerances::default()).unwrap())
        })
    });
    c.bench_function("one mesh of the reference cell", |b| {
        b.iter(|| black_box(Mesh::new(&device, &Grading::default(), 2)))
    });
    let library = library_cell();
    let sun = Light::Spectrum { spectrum: Spectrum::standard("AM1.5G").unwrap(), suns: 1.0 };
    let c2 = Coefficients::new(&library, &Mesh::new(&library, &Grading::default(), 2));
    let nodes = positions(&c2);
    let prepared = || LitStack::new(library.stack(), &library, &sun).unwrap();
    c.bench_function("sun on the library cell, 537 nodes: prepared", |b| b.iter(|| black_box(prepared())));
    let lit = prepared();
    c.bench_function("sun on the library cell, 537 nodes: followed", |b| {
        b.iter(|| black_box(lit.illuminate(&nodes).unwrap()))
    });
    c.bench_function("sun on the library cell, 537 nodes: remembered", |b| {
        b.iter(|| {
            let lit = prepared();
            black_box(lit.illuminate_known(lit.key().as_ref(), &nodes).unwrap())
        })
    });
}

criterion_group!(benches, current_voltage, sweep_points, spectral_response, pieces);
criterion_main!(benches);
