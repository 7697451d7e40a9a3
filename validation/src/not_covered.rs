//! What no check here covers: the end of the report, so that nobody takes the table for more than it is.

/// One gap a line, and what there is instead.
pub const NOT_COVERED: [&str; 14] = [
    "Photons that are emitted and absorbed again: not in the model. So Rau's reciprocity between external quantum efficiency and \
     emission, and the statement that no device beats the detailed-balance limit, are not checked; the limit itself is, for a \
     device whose radiative coefficient is set to the emission of its faces: that tests transport and bookkeeping, not emission.",
    "Time and frequency: capacitance is checked as the frequency goes to zero; admittance at a frequency, transients and \
     photoluminescence decay are not in the model.",
    "Tunnelling: not in the model. Interfaces are checked with continuous quasi-Fermi levels, contacts as ohmic ones with a \
     recombination velocity; thermionic emission at interfaces, Schottky and selective contacts by the solver's own tests \
     against the law of thermionic emission, its limits and its symmetries.",
    "Fields that saturate velocities: not in the model. Dopants ionised in part, band-gap narrowing and defects with charge are \
     held to closed forms by the solver's own tests; no outside solution is compared.",
    "Several junctions in one stack: equations and ledgers are checked by the solver's own tests, no outside solution is.",
    "Coatings and rear reflection: the solver's own tests hold them to Fresnel's formulas and to closed sums; no measured \
     reflectance is compared.",
    "Material values: those listed above under handbook, trade and emission alone. Mobilities, lifetimes, affinities and most \
     absorption tables carry their source in the library and are not compared with a second one.",
    "Temperature: checks stand at 298.15 K and 300 K; other temperatures are covered by the survey of odd devices, which asks \
     for solutions and closed accounts, not for outside values.",
    "Graded layers: one manufactured solution; no graded device was solved by another program.",
    "Recombination, states and fixed charge at interfaces: no outside solution; the solver's own tests derive them.",
    "Fabricated cells: four records as ceilings, and one voltage. No split lot of a paper is reproduced: doping profiles, \
     lifetimes and surfaces of published lots are not given in what could be read, and fitting them would prove little.",
    "Sources marked `from memory` were not looked up; editions of the efficiency tables after about 2020 may hold higher records.",
    "Shading, grids, perimeters and all else that is not one-dimensional, but for a number for the shading.",
    "Other operating systems and processors than x86-64 Linux.",
];
