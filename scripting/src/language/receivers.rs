//! A closure that uses the variable whose method it is given to: `table.filter(|r| r.x > table.mean("x"))`.
//!
//! The engine holds the variable `table` during the whole chain of calls, and refuses it to the closure. Nothing changes a
//! plan or a table, only the variable may be given another one. So a variable that is never assigned anew hands out its
//! plan or table, and the engine has nothing to hold. For other variables there is a message (`captured.rs`).

use std::collections::BTreeSet;

use rhai::{AST, ASTNode, Dynamic, Engine, Expr, Stmt};

use super::plan::PlanValue;
use super::table::TableValue;

/// Lets the engine take the plans and tables of this script's variables as they are, where a closure is given to them.
pub(super) fn watch(engine: &mut Engine, ast: &AST) {
    let (mut names, mut assigned) = (BTreeSet::new(), BTreeSet::new());
    ast.walk(&mut |path: &[ASTNode]| {
        match path.last() {
            Some(ASTNode::Expr(Expr::Dot(chain, ..))) => {
                if let Expr::Variable(name, ..) = &chain.lhs
                    && takes_closure(&chain.rhs)
                {
                    names.insert(name.1.to_string());
                }
            }
            Some(ASTNode::Stmt(Stmt::Assignment(assignment))) => {
                if let Expr::Variable(name, ..) = &assignment.1.lhs {
                    assigned.insert(name.1.to_string());
                }
            }
            _ => {}
        }
        true
    });
    names.retain(|name| !assigned.contains(name));
    if names.is_empty() {
        return;
    }
    #[allow(deprecated, reason = "marked volatile, not deprecated, by the engine; its version is pinned")]
    engine.on_var(move |name, _, context| {
        if !names.contains(name) {
            return Ok(None);
        }
        // shared with nothing: the engine marks what it is given as constant, and takes the value out of this as it is
        Ok(context.scope().get(name).and_then(unchanging).map(Dynamic::into_shared))
    });
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

/// The plan or table that a variable holds.
fn unchanging(variable: &Dynamic) -> Option<Dynamic> {
    if variable.is_shared() {
        let inner = variable.read_lock::<Dynamic>()?;
        return unchanging(&inner);
    }
    (variable.is::<PlanValue>() || variable.is::<TableValue>()).then(|| variable.clone())
}
