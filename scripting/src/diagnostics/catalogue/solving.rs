//! E3: solving. E5: limits on scripts, interruption. E9: faults of Epiloom itself.

super::rows! {
    NOT_CONVERGED = "E300", "the solution did not converge",
        "The equations could not be solved at this bias and light although steps were cut. The message names \
         equation, layer, depth and bias, and the last good state is kept. Often a material value is off by a power \
         of ten (a lifetime, a mobility), or the bias lies far beyond the built-in voltage.",
        "cell.jv(dark(), 0.V, 1.1.V, 20.mV)     // approach a high bias from below";
    NO_EQUILIBRIUM = "E301", "no equilibrium was found",
        "The potential without bias and light could not be solved. The message names layer and depth; check doping, \
         affinity and gap there.",
        "cell.at(0.V, dark())";
    ABSENT_FIGURE = "E302", "a figure that does not exist is used",
        "A figure of merit has no value here and the script calculates with it. A stack without a junction has no \
         open-circuit voltage; light without a wavelength gives no efficiency. `.reason(..)` of the result says why; \
         compare with `()` first.",
        "if jv.voc == () { print(jv.reason(\"voc\")); }";
    SINGULAR = "E303", "the equations are singular",
        "A factorisation met a pivot of zero: some unknown is not determined, as in an insulating layer without any \
         carriers. The message names layer and depth.",
        "layer(\"buffer\", gaas, 300.nm, acceptors(5e18.per_cm3))";
    ALL_POINTS_FAILED = "E330", "every point of a sweep failed",
        "Not one point of the plan gave a result, so there is nothing to go on with. The notes say why, the most \
         frequent reason first; a slip in the closure fails at every point alike. `epiloom check` finds slips before \
         anything is solved.",
        "grid(#{ t: [1.um, 2.um] }).run(\"thickness\", |p| #{ voc: cell_with(p.t).jv(sun).voc })";
    TOO_MANY_OPERATIONS = "E500", "the script ran too long",
        "A script may do a limited number of operations, so that a loop without an end stops. Solving does not \
         count. Check the condition of the loop at the marked place.",
        "for t in range(10, 100, 10) { .. }";
    TOO_DEEP = "E501", "functions or expressions are nested too deeply",
        "Functions that call themselves without an end, or expressions of very many levels, would exhaust the \
         stack.",
        "fn factorial(n) { if n < 2 { 1 } else { n * factorial(n - 1) } }";
    TOO_LARGE = "E502", "a value grew too large",
        "Texts, arrays, maps and the number of points of a curve are limited, so that a script cannot exhaust the \
         memory of the machine.",
        "cell.jv(sun, 0.V, 1.1.V, 1.mV)";
    INTERRUPTED = "E503", "interrupted",
        "The run was stopped from the keyboard or by a signal. Snapshots that were finished are kept in the \
         unfinished archive, whose name was printed; `epiloom show` opens it.",
        "epiloom show cell.epiloom.unfinished";
    INTERNAL = "E900", "a fault of Epiloom itself",
        "Something happened that should be impossible, and the run was stopped before it could give a wrong number. \
         It is not the script's fault: please report it with the script.",
        "epiloom run cell.rhai";
}
