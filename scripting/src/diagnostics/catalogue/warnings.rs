//! W: warnings. The work goes on; the archive keeps them.

super::rows! {
    ILLUSTRATIVE_LIFETIME = "W100", "an illustrative lifetime is used",
        "Lifetimes of carriers depend on how a layer was grown, so no value can be cited for a material as such. \
         Until the script sets it, a round value is used that has no more right than any other; results that depend \
         on it mean little.",
        "material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns })";
    OUTSIDE_TABLE = "W101", "light outside an absorption table",
        "Part of the light lies at wavelengths for which the material's absorption is not known. It is counted in \
         W/m2 and not absorbed, never extrapolated.",
        "layer(\"window\", wide, 30.nm, donors(2e18.per_cm3), #{ absorption: 1e5.per_cm })";
    BETWEEN_TABLES = "W102", "absorption taken between two compositions",
        "No absorption table exists for this composition; the two nearest are shifted to the gap and mixed.",
        "material(\"AlGaAs\", #{ x: 0.33 })";
    OUTSIDE_RANGE = "W103", "a law is used outside its range",
        "A material law is used at a temperature, doping or composition outside the range its source states. The \
         value is continued by the same formula.",
        "epiloom materials GaAs     # lists the ranges";
    FROM_MEMORY = "W104", "a material value from memory",
        "The value was written down from memory and not yet checked against the source named beside it.",
        "epiloom materials GaInP";
    CURVE_STOPPED = "W110", "a curve stopped early",
        "A voltage of the curve could not be solved; the points before it are good and kept.",
        "cell.jv(dark(), 0.V, 1.1.V, 20.mV)";
    NOT_CHECKED = "W111", "the current is not independently checked",
        "The terminal current is compared with the fluxes through the edges of the mesh; here their rounding is \
         larger than the current, so that the comparison says nothing. The current itself comes from a sum that \
         keeps its digits.",
        "cell.at(0.1.V, dark())";
    NOT_CLOSED = "W112", "a balance does not close",
        "Photons, carriers or free energy in and out differ by more than rounding explains. The result is suspect: \
         please report it with the script.",
        "cell.at(0.V, sun).ledger";
    ACCURACY_NOT_REACHED = "W113", "the accuracy asked for was not reached",
        "The numerical error of a figure is larger than the accuracy that the script asked for. The error printed \
         with the figure is the one to trust.",
        "cell.accuracy = 1e-4;";
    NO_OPEN_CIRCUIT = "W114", "a figure of merit does not exist",
        "The curve has no short-circuit current, open-circuit voltage or maximum power, for the reason given.",
        "cell.jv(dark(), -0.5.V, 0.5.V, 50.mV)";
    TORN = "W400", "the archive is cut off",
        "The file ends within a frame. What is shown comes from the whole frames before the cut.",
        "epiloom show cell.epiloom.unfinished";
    UNFINISHED = "W401", "the archive is unfinished",
        "The run that wrote this file did not end: it was interrupted, killed, or is still going on. The snapshots \
         in it are whole.",
        "epiloom show cell.epiloom.unfinished";
    DAMAGED = "W403", "part of the archive is damaged",
        "Bytes of the file are not those that were written. Frames that are whole are shown; those that are not are \
         named, and no number of them is used.",
        "epiloom show cell.epiloom";
    OTHER_VERSION = "W402", "the archive was written by another version",
        "Numbers may differ in their last digits between versions of Epiloom; a replay tells.",
        "epiloom replay window_and_bsf.epiloom";
}
