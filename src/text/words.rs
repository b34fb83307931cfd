//! The words of the language, and which of them cannot be names of values.

use crate::quantity::{Dimension, Unit};

/// The words that start a statement.
pub const STATEMENTS: [&str; 10] =
    ["title", "let", "couple", "reference", "read", "ideal", "opamp", "block", "use", "include"];

/// Words kept for statements that this version does not have.
pub const KEPT: [&str; 3] = ["line", "data", "port"];

/// Functions of expressions.
pub const FUNCTIONS: [&str; 19] = [
    "sqrt", "exp", "ln", "log10", "abs", "arg", "re", "im", "conj", "min", "max", "parallel",
    "sin", "cos", "tan", "asin", "acos", "atan", "atan2",
];

/// Readings of the circuit.
pub const READINGS: [&str; 4] = ["volts", "drop", "amps", "power"];

/// Words that stand between values.
pub const JOINTS: [&str; 5] = ["ang", "to", "at", "least", "most"];

/// Why a word cannot name a value; `None` where it can.
pub fn reserved(word: &str) -> Option<String> {
    let fixed = match word {
        "j" => "is the imaginary unit",
        "pi" => "is the number π",
        "f" => "is the frequency being solved",
        "omega" => "is the angular frequency being solved",
        "table" => "reads measured data",
        word if FUNCTIONS.contains(&word) => "is a function",
        word if READINGS.contains(&word) => "is a reading of the circuit",
        word if JOINTS.contains(&word) => "is a word of the language",
        word if is_usual_unit(word) => {
            return Unit::spoken(word).map(|unit| format!("is a unit ({unit})"));
        }
        _ => return None,
    };
    Some(fixed.to_owned())
}

/// True for units somebody writes. `Rs` could be a ronnasecond and `Gm` a gigametre; engineers
/// mean a resistance and a transconductance, and no value was ever given in those units.
pub(crate) fn is_usual_unit(word: &str) -> bool {
    let Some(unit) = Unit::from_symbol(word) else { return false };
    let largest = match unit.dimension {
        Dimension::TIME => 0,
        Dimension::LENGTH => 3,
        _ => 12,
    };
    (-12..=largest).contains(&unit.power_of_ten)
}
