//! E20: quantities and units.

super::rows! {
    BARE_NUMBER = "E200", "a bare number where a quantity is wanted",
        "The place wants a quantity with a unit, and a number without one was given. Numbers carry their unit as a \
         property. A number is never taken in some assumed unit, and never compared with a quantity.",
        "layer(\"window\", wide, 30.nm, donors(2e18.per_cm3))     // not: 30";
    DIMENSIONS_DIFFER = "E201", "quantities of different dimensions are combined",
        "Addition, subtraction and comparison need quantities of the same dimension. Units may differ: \
         `1.um + 200.nm` is right.",
        "let t = 1.um + 200.nm;     // not: 1.um + 200.V";
    WRONG_DIMENSION = "E202", "a quantity of the wrong dimension",
        "The place wants a quantity of another dimension. The message names the family of units wanted and what was \
         given.",
        "cell.temperature = 300.K;      // not: 300.nm";
    NOT_FINITE = "E203", "a quantity that is not finite",
        "The value is infinite or not a number, by a division by zero or an overflow above. An infinite \
         recombination velocity or shunt resistance is the default: leave the setting out.",
        "cell.front = ohmic();      // infinite recombination velocity";
    UNKNOWN_UNIT = "E204", "unknown unit",
        "No unit of this name is known. Powers are part of the name, `per_` stands for division: `cm2_per_Vs`, \
         `per_cm3`, `mA_per_cm2`. `epiloom reference` lists all.",
        "2e17.per_cm3";
    NOT_DIMENSIONLESS = "E205", "a function of plain numbers is given a quantity with a unit",
        "`exp`, `ln`, `pow` and the trigonometric functions take numbers or dimensionless quantities. Divide by a \
         quantity of the same dimension first.",
        "let thermal = 0.025852.V;\nexp(v / thermal)";
}
