//! The contacts at the two ends of a stack.

use epiloom_solver::device::{Barrier, Contact};
use rhai::Dynamic;

use crate::diagnostics::codes;
use crate::language::device_value::ContactValue;
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Faults, Place};
use crate::language::quantity::Quantity;
use crate::language::value::Options;
use crate::language::vocabulary::{Answer, OptionRow, function, topic};

use super::layers::velocity;

topic! {
    "Contacts",
    "`cell.front` and `cell.rear` are ohmic and recombine without limit until a script sets them. A contact holds the potential; \
     a carrier either keeps to the contact's Fermi level or passes with the flux q v (n - n0), n0 its density at equilibrium.";

    Function "ohmic" {
        forms: ["ohmic()", "ohmic(#{ options })"],
        doc: "An ohmic contact: neutral, the majority carrier pinned to the contact's Fermi level; the minority carrier \
              recombines with the given velocity, without limit if none is given.",
        options: &[
            OptionRow { key: "recombination_velocity", takes: "a velocity", doc: "Recombination velocity of the minority carrier." },
        ],
        example: "let contact = ohmic(#{ recombination_velocity: 1e6.cm_per_s });",
        register: |engine, session| {
            engine.register_type_with_name::<ContactValue>("contact");
            function(engine, session, "ohmic", 0..=1, |_, arguments| {
                let options = options(arguments, "`ohmic`", &["recombination_velocity"])?;
                let recombination_velocity = velocity(&options, "recombination_velocity", true)?;
                contact(Contact::Ohmic { recombination_velocity })
            });
        },
    }
    Function "selective" {
        forms: ["selective(#{ options })"],
        doc: "A contact that passes each carrier with a velocity of its own: neutral like an ohmic one, but neither carrier is \
              pinned where its velocity is given. One that passes majority carriers too slowly costs fill factor.",
        options: &[
            OptionRow { key: "electron_velocity", takes: "a velocity", doc: "Velocity of electrons; without limit if none is given." },
            OptionRow { key: "hole_velocity", takes: "a velocity", doc: "Velocity of holes; without limit if none is given." },
        ],
        example: "let contact = selective(#{ electron_velocity: 1.cm_per_s, hole_velocity: 1e7.cm_per_s });",
        register: |engine, session| {
            function(engine, session, "selective", 1..=1, |_, arguments| {
                let options = options(arguments, "`selective`", &["electron_velocity", "hole_velocity"])?;
                contact(Contact::Selective {
                    electron_velocity: velocity(&options, "electron_velocity", true)?,
                    hole_velocity: velocity(&options, "hole_velocity", true)?,
                })
            });
        },
    }
    Function "schottky" {
        forms: ["schottky(#{ options })"],
        doc: "A metal that holds the bands at a barrier; both carriers pass by thermionic emission, with A* T^2/(q N) of the \
              material's density of states N where no velocity is given. A barrier against the majority carrier lowers the \
              fill factor; one high enough makes a junction of its own, whose p side is the end with the higher barrier for \
              electrons. Neither the image force nor tunnelling lowers the barrier.",
        options: &[
            OptionRow { key: "electron_barrier", takes: "an energy", doc: "Conduction edge at the contact over the metal's Fermi level, 0 to 5 eV." },
            OptionRow { key: "hole_barrier", takes: "an energy", doc: "The metal's Fermi level over the valence edge at the contact, 0 to 5 eV; instead of `electron_barrier`." },
            OptionRow { key: "work_function", takes: "an energy", doc: "Work function of the metal, 1 to 8 eV, for a barrier by the rule of Schottky and Mott; real surfaces keep to it seldom." },
            OptionRow { key: "electron_emission_velocity", takes: "a velocity", doc: "Emission velocity of electrons." },
            OptionRow { key: "hole_emission_velocity", takes: "a velocity", doc: "Emission velocity of holes." },
        ],
        example: "let contact = schottky(#{ electron_barrier: 0.8.eV });",
        register: |engine, session| function(engine, session, "schottky", 1..=1, schottky),
    }
}

const BARRIERS: [&str; 3] = ["electron_barrier", "hole_barrier", "work_function"];
const VELOCITIES: [&str; 2] = ["electron_emission_velocity", "hole_emission_velocity"];

fn contact(contact: Contact<Quantity>) -> Answer {
    Ok(Dynamic::from(ContactValue(contact)))
}

fn options(arguments: &[&mut Dynamic], what: &str, keys: &[&'static str]) -> Result<Options, Faults> {
    match arguments.first() {
        Some(map) => Options::new(map, what, keys.iter().copied()).map_err(Faults),
        None => Ok(Options::none()),
    }
}

fn schottky(_: &crate::language::vocabulary::Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let keys = [&BARRIERS[..], &VELOCITIES[..]].concat();
    let options = options(arguments, "`schottky`", &keys)?;
    let mut given = Vec::new();
    for key in BARRIERS {
        if let Some(energy) = options.quantity(key, &format!("`{key}`"), Dimension::ENERGY)? {
            given.push((key, energy));
        }
    }
    let [(key, energy)] = &given[..] else {
        let fault = match &given[..] {
            [] => Fault::new(codes::BARRIER, "a Schottky contact needs its barrier")
                .label("no barrier is given")
                .help("give one of them: schottky(#{ electron_barrier: 0.8.eV })"),
            [.., (last, _)] => {
                Fault::new(codes::BARRIER, "a Schottky contact has one barrier, told in one way")
                    .label("a second way")
                    .help("keep one of `electron_barrier`, `hole_barrier`, `work_function`")
                    .at(Place::Option((*last).to_string()))
            }
        };
        return Err(fault.into());
    };
    let barrier = match *key {
        "electron_barrier" => Barrier::Electrons(energy.clone()),
        "hole_barrier" => Barrier::Holes(energy.clone()),
        _ => Barrier::WorkFunction(energy.clone()),
    };
    contact(Contact::Schottky {
        barrier,
        electron_emission_velocity: velocity(&options, VELOCITIES[0], false)?,
        hole_emission_velocity: velocity(&options, VELOCITIES[1], false)?,
    })
}
