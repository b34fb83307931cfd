//! The integration tests, one binary so that they link once.
//!
//! - `support`: solve a circuit text and read values by name

mod support;
