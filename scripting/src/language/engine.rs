//! The engine that reads and runs scripts: Rhai with our arithmetic, our vocabulary and our limits.

use std::sync::Arc;

use rhai::{AST, Dynamic, Engine, EvalAltResult, Scope};

use crate::diagnostics::{Diagnostic, Span, codes};

use super::fault::{Fault, Faults};
use super::sandbox;
use super::session::Session;
use super::units::{UNITS, unit};
use super::vocabulary;

/// An engine for one session.
pub(super) fn build(session: &Arc<Session>) -> Engine {
    let mut engine = Engine::new();
    engine.set_fast_operators(false);
    engine.set_optimization_level(rhai::OptimizationLevel::None);
    engine.set_strict_variables(true);
    engine.set_fail_on_invalid_map_property(true);
    super::topics::register_platform_replacements(&mut engine);
    for entry in vocabulary::entries() {
        (entry.register)(&mut engine, session);
    }
    super::value::register(&mut engine, session);
    engine.register_global_module(sandbox::constants(constants()).into());
    #[allow(deprecated, reason = "marked volatile, not deprecated, by the engine; its version is pinned")]
    engine.on_parse_token(|token, _, _| match token {
        // the engine keeps the word for itself and has no use for it; the trade has
        rhai::Token::Reserved(word) if word.as_str() == "yield" => rhai::Token::Identifier(word),
        token => token,
    });
    let printing = Arc::clone(session);
    engine.on_print(move |line| printing.print(line));
    let debugging = Arc::clone(session);
    engine.on_debug(move |line, _, _| debugging.print(line));
    let names = reserved_names();
    #[allow(deprecated, reason = "marked volatile, not deprecated, by the engine; its version is pinned")]
    engine.on_def_var(move |_, info, _| {
        let name = info.name();
        if names.binary_search(&name).is_err() {
            return Ok(true);
        }
        Err(shadows(name).into())
    });
    sandbox::close(&mut engine, session);
    #[cfg(test)]
    engine.register_fn("panic_for_a_test", || -> i64 { panic!("planted") });
    engine
}

/// What every scope holds from the start: the units and `infinity`.
pub(super) fn constants() -> impl Iterator<Item = (String, Dynamic)> {
    let units = UNITS
        .iter()
        .map(|unit| (unit.name.to_string(), Dynamic::from(super::quantity::Quantity::in_unit(1.0, unit))));
    units.chain([("infinity".to_string(), Dynamic::from(f64::INFINITY))])
}

/// Functions whose names scripts may use for variables of their own: such a variable hides nothing, since functions are
/// called with brackets.
const COMMON_NOUNS: &[&str] = &["grid", "list", "zip", "random", "normal", "uniform", "triangular", "table"];

/// Words that a script cannot define as variables.
fn reserved_names() -> Vec<&'static str> {
    let mut names: Vec<&'static str> = UNITS.iter().map(|u| u.name).collect();
    names.push("infinity");
    let functions = vocabulary::entries().filter(|e| e.sort == vocabulary::Sort::Function).map(|e| e.name);
    names.extend(functions.filter(|name| !COMMON_NOUNS.contains(name)));
    names.sort_unstable();
    names.dedup();
    names
}

/// The fault of a variable that hides a word of the language.
fn shadows(name: &str) -> Fault {
    if unit(name).is_some() {
        Fault::new(codes::UNIT_SHADOWED, format!("`{name}` is a unit and cannot be a variable"))
            .help(format!("choose another name: `{name}_value`"))
    } else {
        Fault::new(
            codes::ALREADY_DEFINED,
            format!("`{name}` is a word of the language and cannot be a variable"),
        )
        .help(format!("choose another name: `my_{name}`"))
    }
}

/// Reads a script; its constants are those that the engine knows.
///
/// The engine looks for undefined names while it reads, but takes a constant inside a function or closure for one. A
/// script that uses a unit there is read again without that look; an undefined name is then found when it is reached.
pub(super) fn compile(engine: &mut Engine, text: &str) -> Result<AST, rhai::ParseError> {
    let scope = outer_scope();
    let read = engine.compile_with_scope(&scope, text);
    match &read {
        Err(error) if is_constant(error) => {
            engine.set_strict_variables(false);
            let again = engine.compile_with_scope(&scope, text);
            engine.set_strict_variables(true);
            again
        }
        _ => read,
    }
}

/// The scope that a script begins in. Closures capture what they use from it, so the constants stand here too.
fn outer_scope() -> Scope<'static> {
    let mut scope = Scope::new();
    for (name, value) in constants() {
        scope.push_constant_dynamic(name, value);
    }
    scope
}

/// Whether the undefined name is one of the language's constants.
fn is_constant(error: &rhai::ParseError) -> bool {
    match error.err_type() {
        rhai::ParseErrorType::VariableUndefined(name) => unit(name).is_some() || name == "infinity",
        _ => false,
    }
}

/// Functions, loop variables and arguments that take a word of the language: the engine lets them pass.
pub(super) fn redefined(text: &str, ast: &AST) -> Vec<Diagnostic> {
    let mut found = Vec::new();
    for function in ast.iter_functions().filter(|f| !f.name.starts_with("anon$")) {
        if vocabulary::entries().any(|e| e.sort == vocabulary::Sort::Function && e.name == function.name) {
            let words = format!("fn {}", function.name);
            let at = text.find(&words).map_or(0, |at| at + 3);
            found.push(
                Diagnostic::new(
                    codes::ALREADY_DEFINED,
                    format!("`{}` is a word of the language and cannot be defined again", function.name),
                )
                .label(Span::new(at, at + function.name.len()), "")
                .help(format!("choose another name: `my_{}`", function.name)),
            );
        }
    }
    for (name, span) in super::spans::bindings(text) {
        if unit(name).is_some() {
            let fault = shadows(name);
            let mut diagnostic = Diagnostic::new(fault.code, fault.message.clone()).label(span, "");
            diagnostic.help.clone_from(&fault.help);
            found.push(diagnostic);
        }
    }
    found
}

/// Runs the script; while checking, statement by statement, going on after a fault with unknown values.
pub(super) fn run(engine: &Engine, ast: &AST, session: &Arc<Session>) -> Result<(), Box<EvalAltResult>> {
    let mut scope = outer_scope();
    if !session.checking() {
        let result = engine.run_ast_with_scope(&mut scope, ast);
        if result.is_ok() {
            report_unused_layers(&scope);
        }
        session.finished.store(true, std::sync::atomic::Ordering::Relaxed);
        if result.as_ref().is_err_and(|error| !super::report::is_stop(error)) {
            session.forget_lost_edits();
        }
        return result;
    }
    for statement in ast.statements() {
        let functions = ast.shared_lib().clone();
        let one = AST::new([statement.clone()], functions);
        let before = scope.len();
        match engine.run_ast_with_scope(&mut scope, &one) {
            Ok(()) => {}
            Err(error) if super::report::is_stop(&error) => return Err(error),
            Err(error) => {
                super::report::keep(session, &error);
                if scope.len() == before
                    && let Some(name) = defined_by(statement)
                {
                    scope.push(name, super::value::Unknown);
                }
            }
        }
    }
    report_unused_layers(&scope);
    session.finished.store(true, std::sync::atomic::Ordering::Relaxed);
    Ok(())
}

/// Changed copies of layers that the script ends with and never looked at: their stacks never heard of the change.
///
/// A changed stack that nothing solves is no slip of that kind: it is what the script's next line would be about.
fn report_unused_layers(scope: &Scope) {
    for (_, _, value) in scope.iter() {
        if let Some(layer) = value.read_lock::<super::device_value::LayerValue>()
            && let Some(edit) = &layer.edit
        {
            edit.report_if_unseen();
        }
    }
}

/// Line and column of every call of a function of this name, in functions too.
pub(super) fn calls_of(ast: &AST, name: &str) -> std::collections::BTreeSet<(usize, usize)> {
    let mut found = std::collections::BTreeSet::new();
    ast.walk(&mut |path: &[rhai::ASTNode]| {
        let call = match path.last() {
            Some(rhai::ASTNode::Expr(rhai::Expr::FnCall(call, at) | rhai::Expr::MethodCall(call, at))) => {
                Some((call, at))
            }
            Some(rhai::ASTNode::Stmt(rhai::Stmt::FnCall(call, at))) => Some((call, at)),
            _ => None,
        };
        if let Some((call, at)) = call
            && call.name == name
        {
            found.insert((at.line().unwrap_or(0), at.position().unwrap_or(0)));
        }
        true
    });
    found
}

/// The variable that a `let` defines.
fn defined_by(statement: &rhai::Stmt) -> Option<String> {
    match statement {
        rhai::Stmt::Var(definition, ..) => Some(definition.0.name.to_string()),
        _ => None,
    }
}

/// The faults inside a run-time error, if it is one of ours.
pub(super) fn faults_of(value: &Dynamic) -> Option<Faults> {
    value.read_lock::<Faults>().map(|faults| faults.clone())
}
