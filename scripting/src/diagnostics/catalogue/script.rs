//! E1: the script as a text.

super::rows! {
    SYNTAX = "E100", "the script cannot be read",
        "The text does not follow the grammar of the language at the marked place: a bracket or quote that is not \
         closed, a missing comma or semicolon, or a word that cannot stand there. Reading stops at the first such \
         place, so the cause is there or just before it; a missing semicolon is noticed only at the next word.",
        "let t = 30.nm      // the next line is marked: a semicolon is missing here\nlet x = 0.3;";
    UNKNOWN_NAME = "E101", "unknown name",
        "A name is used that has not been defined above this place. Names are defined by `let`, end with the block \
         they are defined in, and upper and lower case differ.",
        "let base_thickness = 3.0.um;\nlayer(\"base\", gaas, base_thickness, acceptors(1e17.per_cm3))";
    UNKNOWN_FUNCTION = "E102", "unknown function",
        "No function of this name exists. `epiloom reference` lists all built-in functions with their forms; the \
         script's own functions are defined by `fn name(arguments) { .. }` anywhere in it.",
        "cell.jv(sun)       // not cell.iv(sun)";
    FUNCTION_SEES_ARGUMENTS = "E103", "a function uses a script variable",
        "A function defined by `fn` sees only its arguments, not the variables of the script around it. Pass the \
         value as an argument, or write a closure, `|t| ..`, which takes a copy of the variables it uses.",
        "fn cell_with(gaas, t) { stack(\"cell\", [layer(\"base\", gaas, t, acceptors(1e17.per_cm3))]) }\n\
         let cell_with = |t| stack(\"cell\", [layer(\"base\", gaas, t, acceptors(1e17.per_cm3))]);";
    WRONG_ARGUMENTS = "E104", "a function is called in a form it does not have",
        "The function exists, but not with this number of arguments or these kinds of value. The message lists the \
         forms it has and what was given.",
        "layer(\"base\", gaas, 3.0.um, acceptors(1e17.per_cm3))     // name, material, thickness, doping";
    UNKNOWN_PROPERTY = "E105", "unknown property",
        "The value has no property of this name, or the property cannot be set. The message lists near names.",
        "cell.front_reflectance = 0.05;";
    UNIT_SHADOWED = "E106", "a unit's name is used for a variable",
        "Names of units (`nm`, `um`, `V`, ..) cannot be defined as variables or arguments: every quantity below \
         would silently mean something else.",
        "let thickness = 5.um;      // not: let um = 5";
    WRONG_KIND = "E107", "a value of the wrong kind",
        "The place wants a value of another kind, such as a material where a text stands. The message says what is \
         wanted and what was given.",
        "layer(\"base\", material(\"GaAs\"), 3.um, intrinsic())     // not: layer(\"base\", \"GaAs\", ..)";
    UNKNOWN_OPTION = "E108", "unknown option",
        "An option map `#{ .. }` holds a key that this function does not know. Every map is checked against its own \
         list of keys, so that a slip of the pen cannot be ignored silently.",
        "ohmic(#{ recombination_velocity: 1e6.cm_per_s })";
    MISSING_OPTION = "E109", "an option is missing",
        "An option that has no default was left out. The message names it with its unit.",
        "monochromatic(#{ photon_flux: 2e17.per_cm2_s })";
    INPUT_TWICE = "E110", "an input is declared twice",
        "Each input of a script has one declaration, `input(\"name\", default)`; a second of the same name could hold \
         another default. Keep the value in a variable and use that.",
        "let bsf = input(\"bsf_thickness\", 80.nm);";
    UNKNOWN_INPUT = "E111", "--set names an input that the script does not have",
        "`--set NAME=VALUE` overrides the default of `input(\"NAME\", default)`. The script declares no input of this \
         name on the way it ran; the message lists those it has.",
        "epiloom run cell.rhai --set bsf_thickness=50nm";
    BAD_INPUT_VALUE = "E112", "a --set value cannot be read or has the wrong unit",
        "The value of `--set` is a number followed by a unit spelled as in scripts, without a blank or with a point: \
         `50nm`, `50.nm`, `1e17per_cm3`; a plain number for an input without a unit. Its dimension must be that of \
         the input's default.",
        "epiloom run cell.rhai --set bsf_thickness=50nm";
    EDIT_LOST = "E113", "a stack is edited inside a function and dropped",
        "Values are copied into functions, so an edit of a stack inside a function changes the function's own copy \
         and is lost when it returns. Return the edited stack and take it.",
        "fn thinner(cell) { cell[\"window\"].thickness = 5.nm; cell }\nlet thin = thinner(cell);";
    ASSIGNED_TO_CALL = "E114", "assignment to a call",
        "The result of a function cannot be assigned to. A layer of a stack is edited by its name in brackets.",
        "cell[\"window\"].thickness = 5.nm;      // not: cell.layer(\"window\") = ..";
    NO_SUCH_ENTRY = "E115", "no such entry",
        "An array is read beyond its end, or a map at a key it does not have. Arrays count from 0.",
        "let points = jv.points;\nprint(points[points.len() - 1].voltage);";
    THROWN = "E116", "the script stopped itself",
        "The script reached a `throw` and nothing caught it. The message is the script's own.",
        "if bsf < 10.nm { throw \"this back surface field is too thin to grow\"; }";
    CLOSED_FUNCTION = "E117", "a closed function",
        "`eval`, `sleep` and `import` are closed: a script must be readable as it stands, and what it does must not \
         depend on the clock or on files outside its folder.",
        "let n = read_csv(\"measured.csv\");     // a data file beside the script";
    ARITHMETIC = "E118", "arithmetic without a result",
        "An integer calculation left the range of 64-bit integers, or divided by zero with `%`. Division by `/` is \
         always that of real numbers.",
        "let x = 3 / 2;     // 1.5";
    SNAPSHOT_TWICE = "E119", "two snapshots of one name",
        "Each stored result has its own name in the archive, by which `show` and `export` find it. In a loop, put \
         what changes into the name.",
        "for t in [20.nm, 30.nm] { store(`window ${t}`, cell_with(t).jv(sun)); }";
    RESERVED_WORD = "E120", "a reserved word is used as a name",
        "The word belongs to the language or is kept for later versions of it, so it cannot be a variable, function \
         or option.",
        "let shared_base = 3.um;    // not: let shared = ..";
    ALREADY_DEFINED = "E121", "a built-in name is defined again",
        "A function of the script has the name and number of arguments of a built-in function. Give it another name.",
        "fn my_layer(name, t) { layer(name, material(\"GaAs\"), t, intrinsic()) }";
    WRONG_CHOICE = "E122", "a word that is not among the choices",
        "The setting takes one of a few words. The message lists them.",
        "cell.statistics = \"boltzmann\";";
    PLAN = "E130", "a plan cannot be made of this",
        "A plan names what varies and its values: each coordinate has values of one kind, plans that are multiplied \
         vary different things, plans that follow each other the same things, and a spread stands in samples only.",
        "grid(#{ bsf: [20.nm, 50.nm], x: linear(0.2, 0.8, 4) })";
    EMPTY_TABLE = "E131", "a table without rows is asked for a number",
        "No row of the table has a number in this column: all points failed, a filter let none pass, or the figure \
         does not exist at any point. Compare `table.len` with 0 first.",
        "let good = map.filter(|r| r.efficiency > 20.percent);\nif good.len > 0 { print(good.best(\"efficiency\")); }";
    FIT = "E132", "a curve cannot be fitted",
        "A line needs rows at two different abscissae, a parabola at three; rows without a number do not count.",
        "table.fit(\"thickness\", \"efficiency\", \"parabola\")";
}
