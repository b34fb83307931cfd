//! The integration tests, one binary so that they link once.
//!
//! - `exact`: circuits drawn at random, solved in exact arithmetic by another formulation
//! - `support`: solve a circuit text and read values by name

mod exact;
mod support;
