//! E21 to E24: layers, materials, profiles, optics, light.

super::rows! {
    THICKNESS_NOT_POSITIVE = "E210", "a layer's thickness is not positive",
        "A layer has a thickness above zero. A layer that may be absent is left out of the array by `if`: an entry \
         without a value is skipped.",
        "if t > 0.nm { layer(\"window\", wide, t, donors(2e18.per_cm3)) },";
    NO_LAYERS = "E211", "a stack without layers",
        "A stack needs at least one layer. Entries without a value are skipped, so a stack whose layers are all \
         switched off by `if` is empty.",
        "stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))])";
    LAYER_NAME_TWICE = "E212", "two layers of one name",
        "Layers are found by name, in `cell[\"base\"]`, in ledgers and in archives, so each name stands once in a \
         stack.",
        "layer(\"upper base\", ..), layer(\"lower base\", ..)";
    INTERFACE_MISPLACED = "E213", "an interface entry that is not between two layers",
        "`interface(..)` stands in the array between the two layers it lies between, one at most per place.",
        "[layer(\"emitter\", ..), interface(#{ recombination_velocity: 1e4.cm_per_s }), layer(\"base\", ..)]";
    DOPING_NEGATIVE = "E214", "a negative doping",
        "Donor and acceptor densities are zero or more. The kind is told by the word, not by a sign.",
        "acceptors(1e17.per_cm3)        // not: donors(-1e17.per_cm3)";
    MATERIAL_VALUE = "E215", "a material value that cannot be",
        "A material value lies outside what its law allows: a gap, mobility, density of states, lifetime or \
         permittivity must be positive; coefficients of recombination must not be negative. Or two values say the \
         same thing in different ways, or a temperature model leads out of what can be at the temperature of the stack.",
        "material(\"GaAs\", #{ electron_lifetime: 20.ns })";
    COMPOSITION = "E216", "a composition that cannot be",
        "A composition `x` lies between 0 and 1 and within the range of the material's own laws; a compound of fixed \
         composition takes none, an alloy needs one.",
        "material(\"AlGaAs\", #{ x: 0.30 })";
    UNKNOWN_MATERIAL = "E217", "unknown material",
        "The library has no material of this name. `epiloom materials` lists all; `custom_material` builds one from \
         its own numbers.",
        "material(\"GaAs\")";
    MATERIAL_INCOMPLETE = "E218", "a material lacks a value",
        "A `custom_material` stands on its own numbers alone, so all that the equations use must be given. A \
         temperature model needs all its parts, and the number that it moves. The message names what is missing.",
        "custom_material(\"test\", #{ gap: 1.424.eV, affinity: 4.07.eV, permittivity: 12.9, .. })";
    SHARE = "E219", "a share outside 0 to 1",
        "Reflectance, shading and the like are shares between 0 and 1. A value in percent is divided by 100.",
        "cell.front_reflectance = 0.05;     // 5 %";
    TEMPERATURE = "E220", "a temperature that cannot be",
        "The temperature is absolute, in kelvin, above zero, and within the range of the laws of the materials.",
        "cell.temperature = 298.15.K;       // 25 degrees Celsius";
    RESISTANCE = "E221", "a resistance that cannot be",
        "A series resistance is zero or more, a shunt resistance above zero, both times area.",
        "cell.series_resistance = 2.ohm_cm2;";
    UNKNOWN_LAYER = "E222", "no layer of this name",
        "The stack has no layer of the name in brackets. The message lists its layers.",
        "cell[\"window\"].thickness = 5.nm;";
    PROFILE = "E223", "a profile or table that cannot be",
        "A graded profile needs positive values where it is exponential; a table needs two points or more, its \
         depths or wavelengths increasing.",
        "acceptors(graded(\"exponential\", 1e18.per_cm3, 1e16.per_cm3))";
    VELOCITY = "E224", "a velocity that cannot be",
        "A recombination velocity is zero or more. Without one, an ohmic contact recombines without limit and an \
         interface not at all. An emission velocity is above zero; without one it is that of the effective masses.",
        "ohmic(#{ recombination_velocity: 1e6.cm_per_s })";
    LIGHT = "E225", "a light that cannot be",
        "Concentration, photon flux and wavelength are positive and finite; light without any photons is `dark()`.",
        "spectrum(\"AM1.5D\", 500.suns)";
    UNKNOWN_SPECTRUM = "E226", "unknown spectrum",
        "Built-in spectra are AM1.5G, AM1.5D and AM0; `black_body` makes one from a temperature, and a file of \
         wavelength and irradiance beside the script can be read.",
        "spectrum(\"AM1.5G\")";
    WAVELENGTHS = "E227", "wavelengths that cannot be",
        "A range of wavelengths goes from a shorter to a longer one in positive steps.",
        "cell.eqe(300.nm, 900.nm, 5.nm)";
    VOLTAGES = "E228", "voltages that cannot be",
        "A range of voltages needs a step that leads from its first to its last voltage; a list of voltages needs \
         one at least.",
        "cell.jv(dark(), 0.V, 1.1.V, 20.mV)";
    ACCURACY = "E229", "an accuracy that cannot be",
        "The relative accuracy asked for is above zero and at most 0.01; very small values cost many nodes and are \
         refused below what rounding allows.",
        "cell.accuracy = 1e-6;";
    NO_OPTICAL_DATA = "E230", "light on a material without optical data",
        "No absorption of this material was found that could be cited, and none is made up: light whose photons pass its gap \
         cannot be followed through the layer. Give `absorption` or `optical_constants`, or take the layer out of the optics.",
        "layer(\"window\", material(\"AlAs\"), 30.nm, donors(2e18.per_cm3), #{ optics: \"inert\" })";
    DEFECT = "E231", "a defect that cannot be",
        "A defect needs its kind, density, energy from one band edge, and both cross-sections; a distribution its width. Names are \
         unique in a layer, and numbers within what a semiconductor can have. The message names what is wrong.",
        "defect(\"deep\", #{ kind: \"acceptor\", density: 1e15.per_cm3, above_valence_band: 0.4.eV, .. })";
    BARRIER = "E236", "a contact's barrier that cannot be",
        "A Schottky contact has one barrier, told as that of electrons, that of holes, or by the metal's work function; \
         a contact must pass one carrier at least.",
        "schottky(#{ electron_barrier: 0.8.eV })";
    DIODE = "E237", "a second diode that cannot be",
        "A diode across the junction has a saturation current density of zero or more and an ideality factor from 0.1 to 100.",
        "cell.second_diode = second_diode(#{ saturation_current_density: 1e-9.mA_per_cm2, ideality: 2 });";
    OPTIONS_CONTRADICT = "E238", "options that contradict each other",
        "Two options say different things about one and the same, or the same thing twice. Give the one that is \
         known; what follows from it is worked out.",
        "interface(#{ transport: \"thermionic\", valence_offset: 0.3.eV })";
    STACK = "E240", "a stack that cannot be solved as described",
        "Something else about the stack contradicts itself; the message says what, where, and the range allowed.",
        "epiloom check cell.rhai        // lists all faults at once, solving nothing";
}
