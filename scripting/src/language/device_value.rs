//! The values that describe a device in scripts: material, layer, doping, profile, interface, contact, coating, stack. Numbers in them are quantities.

use std::collections::BTreeMap;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use epiloom_solver::device::{Contact, Defect, Diode, Interface, Layer, Profile, Stack};
use epiloom_solver::materials::Material;
use epiloom_solver::optics::{Film, OpticalConstants, Reflectance};
use rhai::Position;

use crate::diagnostics::codes;

use super::fault::Fault;
use super::quantity::Quantity;
use super::session::Session;

/// A material, with a composition profile where one was given instead of a number.
#[derive(Clone, Debug)]
pub struct MaterialValue {
    /// The material.
    pub material: Material<Quantity>,
    /// Composition against depth.
    pub graded: Option<Profile<Quantity>>,
}

/// A doping: donors and acceptors against depth.
#[derive(Clone, Debug)]
pub struct DopingValue {
    /// Donors.
    pub donors: Profile<Quantity>,
    /// Acceptors.
    pub acceptors: Profile<Quantity>,
}

/// A profile that is not yet of donors, acceptors or composition.
#[derive(Clone, Debug)]
pub struct ProfileValue(pub Profile<Quantity>);

/// What lies between two layers.
#[derive(Clone, Debug)]
pub struct InterfaceValue {
    /// The interface.
    pub interface: Interface<Quantity>,
    /// Where it was written.
    pub place: (usize, usize),
}

/// A defect of a layer.
#[derive(Clone, Debug)]
pub struct DefectValue(pub Defect<Quantity>);

/// A contact.
#[derive(Clone, Debug)]
pub struct ContactValue(pub Contact<Quantity>);

/// A diode beside the device.
#[derive(Clone, Debug)]
pub struct DiodeValue(pub Diode<Quantity>);

/// Refractive index and extinction coefficient of a substance.
#[derive(Clone, Debug)]
pub struct ConstantsValue(pub Arc<OpticalConstants>);

/// A film of a coating.
#[derive(Clone, Debug)]
pub struct FilmValue(pub Film<Quantity>);

/// A coating: a reflectance made of films.
#[derive(Clone, Debug)]
pub struct CoatingValue(pub Reflectance<Quantity>);

/// A layer.
#[derive(Clone, Debug)]
pub struct LayerValue {
    /// The layer.
    pub layer: Arc<Layer<Quantity>>,
    /// Where it was written.
    pub place: (usize, usize),
    /// Its last change, as long as nothing has looked at it.
    pub edit: Option<Arc<Edit>>,
}

/// A stack.
#[derive(Clone, Debug)]
pub struct StackValue {
    /// The stack.
    pub stack: Arc<Stack<Quantity>>,
    /// Where its layers were written.
    pub places: Arc<BTreeMap<String, (usize, usize)>>,
    /// Its last change, as long as nothing has looked at it.
    pub edit: Option<Arc<Edit>>,
}

/// A change of a stack or layer that is lost if its value is dropped before anything looks at it.
#[derive(Debug)]
pub struct Edit {
    session: EditedIn,
    position: Position,
    what: String,
    seen: AtomicBool,
}

/// The run in which a change happened.
struct EditedIn(Arc<Session>);

impl std::fmt::Debug for EditedIn {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str("a run")
    }
}

impl Edit {
    /// A change at this place of the script; the one before it, on the same value, lives on in it.
    pub fn new(
        session: &Arc<Session>,
        position: Position,
        what: String,
        before: Option<&Arc<Edit>>,
    ) -> Arc<Edit> {
        if let Some(before) = before {
            before.see();
        }
        Arc::new(Edit {
            session: EditedIn(Arc::clone(session)),
            position,
            what,
            seen: AtomicBool::new(false),
        })
    }

    /// Something looks at the changed value.
    pub fn see(&self) {
        self.seen.store(true, Ordering::Relaxed);
    }
}

impl Drop for Edit {
    fn drop(&mut self) {
        self.report_if_unseen();
    }
}

impl Edit {
    /// Keeps the fault of a change that nothing has looked at, while the script runs.
    pub fn report_if_unseen(&self) {
        let session = &self.session.0;
        if self.seen.load(Ordering::Relaxed) || session.finished.load(Ordering::Relaxed) {
            return;
        }
        let help = if self.what.starts_with("layer") {
            "change the layer in its stack: cell[\"window\"].thickness = 5.nm;"
        } else {
            "a function gets a copy: return the changed stack, and take it: `cell = thinner(cell);`"
        };
        let fault = Fault::new(
            codes::EDIT_LOST,
            format!("this change of {} is lost: nothing uses the changed copy", self.what),
        )
        .help(help);
        if !session.checking() && super::point::lose(session.diagnostic(&fault, self.position)) {
            return;
        }
        session.keep(&fault, self.position);
        session.lost_edit.store(true, Ordering::Relaxed);
    }
}

impl LayerValue {
    /// Something looks at it.
    pub fn see(&self) {
        if let Some(edit) = &self.edit {
            edit.see();
        }
    }
}

impl StackValue {
    /// Something looks at it.
    pub fn see(&self) {
        if let Some(edit) = &self.edit {
            edit.see();
        }
    }

    /// The layer of this name, for a script.
    pub fn layer(&self, name: &str) -> Option<LayerValue> {
        let layer = self.stack.layer(name)?;
        let place = self.places.get(name).copied().unwrap_or_default();
        Some(LayerValue { layer: Arc::new(layer.clone()), place, edit: None })
    }
}
