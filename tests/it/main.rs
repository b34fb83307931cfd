//! The integration tests, one binary so that they link once.
//!
//! - `reference`: published values from outside the project
//! - `support`: solve a circuit text and read values by name

mod reference;
mod support;
