//! W: warnings. The work goes on; the archive keeps them. W2 is about the stack, W3 about a solution, W4 about archives.

super::rows! {
    ILLUSTRATIVE_LIFETIME = "W201", "an illustrative lifetime is used",
        "Lifetimes of carriers depend on how a layer was grown, so no value can be cited for a material as such. \
         Until the script sets them, round values are used that have no more right than any other; results that \
         depend on them mean little.",
        "material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns })";
    ILLUSTRATIVE_VALUE = "W202", "an illustrative material value is used",
        "No citable source was found for this value of the built-in material, so it is a plausible number and no \
         more. Set it in the script when you know better.",
        "material(\"AlInP\", #{ electron_mobility: 100.cm2_per_Vs })";
    OUTSIDE_RANGE = "W203", "a value is used at a temperature that its source does not cover",
        "The law of a material value was stated for a range of temperatures, and the stack is colder or hotter. The \
         law is continued by the same formula.",
        "epiloom materials GaAs     # lists the ranges";
    UNCHECKED_OFFSET = "W204", "a band offset rests on an unchecked source",
        "How the bands of two materials line up decides what an interface does to carriers. The position of this \
         material on the ladder of valence-band edges is from memory, second-hand or illustrative. Set `affinity` to \
         choose another.",
        "material(\"GaInP\", #{ affinity: 3.95.eV })";
    BETWEEN_TABLES = "W205", "absorption taken between two compositions",
        "No absorption table exists for this composition of the alloy; the tables of the two nearest are moved to its \
         gap and weighted. Give `absorption`, or choose a composition that has a table, to do without.",
        "material(\"AlGaAs\", #{ x: 0.315 })";
    MODEL_ABSORPTION = "W206", "absorption from a model instead of a measurement",
        "No measured absorption table of this material was found that can be used near its gap, so a stated model \
         stands in for it. What the layer absorbs is plausible and no more.",
        "epiloom materials AlInP";
    NARROWING_WITH_BOLTZMANN = "W207", "gap narrowing is used with Boltzmann statistics",
        "The coefficients describe how far the gap itself shrinks. In a heavily doped layer the band fills up as well, \
         which holds minority carriers back by nearly as much; Boltzmann statistics do not know that, so the product n p \
         comes out too large. Use Fermi-Dirac statistics, or give the apparent narrowing that was measured by Boltzmann \
         statistics.",
        "cell.statistics = \"fermi-dirac\";";
    OUTSIDE_TABLE = "W301", "light outside an absorption table",
        "Part of the light lies at wavelengths for which the material's absorption is not known. It is counted in \
         W/m2 and not absorbed, never extrapolated.",
        "layer(\"window\", wide, 30.nm, donors(2e18.per_cm3), #{ absorption: 1e5.per_cm })";
    OUTSIDE_REFLECTANCE = "W302", "light outside the table of the front reflectance",
        "Part of the light lies at wavelengths that the table of the reflectance or of a film does not cover. The \
         nearest value of the table is used there.",
        "cell.front_reflectance = [[280.nm, 0.4], [900.nm, 0.1], [4000.nm, 0.3]];";
    RESPONSE_OUTSIDE_TABLE = "W303", "wavelengths of a response outside an absorption table",
        "Some wavelengths of the spectral response lie where a layer's absorption is not known; the layer is taken \
         as transparent there.",
        "cell.eqe(300.nm, 900.nm, 5.nm)";
    CURVE_STOPPED = "W310", "a curve stopped early",
        "A voltage of the curve could not be solved; the points before it are good and kept.",
        "cell.jv(dark(), 0.V, 1.1.V, 20.mV)";
    NOT_CLOSED = "W312", "a balance does not close",
        "Photons, carriers or free energy in and out differ by more than rounding explains. The result is suspect: \
         please report it with the script.",
        "cell.at(0.V, sun).ledger";
    ACCURACY_NOT_REACHED = "W313", "the accuracy asked for was not reached",
        "The numerical error of a figure is larger than the accuracy that the script asked for. The error printed \
         with the figure is the one to trust.",
        "cell.accuracy = 1e-4;";
    POINTS_FAILED = "W330", "points of a sweep failed",
        "Some points of the plan gave no result. The table has the others; `table.failures` lists those that failed \
         with their reasons, and statistics leave them out.",
        "for f in map.failures { print(`${f.point}: ${f.reason}`); }";
    POINTS_WARNED = "W331", "points of a sweep have warnings",
        "Analyses at some points of the plan warned. The message counts the points for each warning and shows that of \
         the first; the archive keeps the warnings of every point.",
        "epiloom explain W313";
    TORN = "W400", "the archive is cut off",
        "The file ends within a frame. What is shown comes from the whole frames before the cut.",
        "epiloom show cell.epiloom.unfinished";
    UNFINISHED = "W401", "the archive is unfinished",
        "The run that wrote this file did not end: it was interrupted, killed, or is still going on. The snapshots \
         in it are whole.",
        "epiloom show cell.epiloom.unfinished";
    OTHER_VERSION = "W402", "the archive was written by another version",
        "Numbers may differ in their last digits between versions of Epiloom; a replay tells.",
        "epiloom replay window_and_bsf.epiloom";
    DAMAGED = "W403", "part of the archive is damaged",
        "Bytes of the file are not those that were written. Frames that are whole are shown; those that are not are \
         named, and no number of them is used.",
        "epiloom show cell.epiloom";
}
