//! A closure that uses the variable whose method it is given to: `table.filter(|r| r.x > table.mean("x"))`.
//!
//! The engine holds the variable `table` during the whole chain of calls, and the closure cannot read it then. No method
//! that takes a closure changes its plan or table, so the value that the variable had when the chain began serves as well:
//! it is remembered for each captured variable of that kind, and put in the place of the variable that is held.

use std::cell::RefCell;
use std::collections::BTreeSet;
use std::sync::atomic::{AtomicI32, Ordering};

use rhai::{AST, ASTNode, Array, Dynamic, Engine, Expr, FnPtr, Map, Stmt};

use super::plan::PlanValue;
use super::table::TableValue;
use super::value::any_quantity;

/// Values that a thread remembers; those that were used last are kept.
const REMEMBERED: usize = 200;

/// Levels of closures in closures that are looked through.
const DEEPEST: usize = 50;

thread_local! {
    /// The number of a variable and its value when it was last looked up, the latest last.
    static VALUES: RefCell<Vec<(i32, Dynamic)>> = const { RefCell::new(Vec::new()) };
}

/// The next number of a variable; nought stands for none.
static NEXT: AtomicI32 = AtomicI32::new(1);

/// Lets the engine remember what the variables of this script hold of which a closure might be given to a method.
pub(super) fn watch(engine: &mut Engine, ast: &AST) {
    let names = roots(ast);
    if names.is_empty() {
        return;
    }
    #[allow(deprecated, reason = "marked volatile, not deprecated, by the engine; its version is pinned")]
    engine.on_var(move |name, _, mut context| {
        if names.contains(name)
            && let Some(variable) = context.scope_mut().get_mut(name)
        {
            remember(variable);
        }
        // the engine goes on to look the variable up itself
        Ok(None)
    });
}

/// Names of variables a chain of calls on which is given a closure.
fn roots(ast: &AST) -> BTreeSet<String> {
    let mut found = BTreeSet::new();
    ast.walk(&mut |path: &[ASTNode]| {
        if let Some(ASTNode::Expr(Expr::Dot(chain, ..) | Expr::Index(chain, ..))) = path.last()
            && let Expr::Variable(name, ..) = &chain.lhs
            && takes_closure(&chain.rhs)
        {
            found.insert(name.1.to_string());
        }
        true
    });
    found
}

/// Whether a call of this chain is given a closure, or a variable that may hold one.
fn takes_closure(link: &Expr) -> bool {
    match link {
        Expr::MethodCall(call, _) => call.args.iter().any(|argument| match argument {
            Expr::Stmt(block) => block.iter().any(|each| matches!(each, Stmt::Share(_))),
            Expr::Variable(..) => true,
            _ => false,
        }),
        Expr::Dot(chain, ..) | Expr::Index(chain, ..) => {
            takes_closure(&chain.lhs) || takes_closure(&chain.rhs)
        }
        _ => false,
    }
}

/// Numbers a captured variable, and keeps what it holds. Its copies in closures have the same number.
fn remember(variable: &mut Dynamic) {
    if !variable.is_shared() {
        return;
    }
    if variable.tag() == 0 {
        variable.set_tag(NEXT.fetch_add(1, Ordering::Relaxed));
    }
    let number = variable.tag();
    // one that is held keeps the value that it had
    let Some(value) = variable.read_lock::<Dynamic>().filter(|value| unchanging(value, 0)) else { return };
    VALUES.with_borrow_mut(|values| {
        values.retain(|(known, _)| *known != number);
        if values.len() >= REMEMBERED {
            drop(values.remove(0));
        }
        values.push((number, value.clone()));
    });
}

/// Plans and tables, and what holds these and plain values alone: copies of others may mean something (a changed layer).
fn unchanging(value: &Dynamic, depth: usize) -> bool {
    if depth > DEEPEST || value.is_shared() {
        return false;
    }
    if let Some(list) = value.read_lock::<Array>() {
        return list.iter().all(|each| unchanging(each, depth + 1));
    }
    if let Some(map) = value.read_lock::<Map>() {
        return map.values().all(|each| unchanging(each, depth + 1));
    }
    let plain = value.is_string() || value.is_bool() || value.is_unit() || any_quantity(value).is_some();
    plain || value.is::<PlanValue>() || value.is::<TableValue>()
}

/// The closure with what its held variables hold in their places; nothing where it uses none that is held.
pub(super) fn released(closure: &FnPtr) -> Option<FnPtr> {
    freed(closure, 0)
}

fn freed(closure: &FnPtr, depth: usize) -> Option<FnPtr> {
    if depth > DEEPEST {
        return None;
    }
    let replaced = |value: &Dynamic| -> Option<Dynamic> {
        if value.is_shared() && value.read_lock::<Dynamic>().is_none() {
            let number = value.tag();
            return VALUES.with_borrow(|values| {
                values.iter().rev().find(|(known, _)| *known == number).map(|(_, value)| value.clone())
            });
        }
        let inner = value.read_lock::<FnPtr>()?;
        freed(&inner, depth + 1).map(Dynamic::from)
    };
    let places: Vec<Option<Dynamic>> = closure.curry().iter().map(replaced).collect();
    if places.iter().all(Option::is_none) {
        return None;
    }
    let mut own = closure.clone();
    for (value, place) in own.iter_curry_mut().zip(places) {
        if let Some(place) = place {
            *value = place;
        }
    }
    Some(own)
}
