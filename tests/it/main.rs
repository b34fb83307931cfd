//! The integration tests, one binary so that they link once.
//!
//! - `bad`: every faulty circuit is refused in the words kept beside it
//! - `exact`: circuits drawn at random, solved in exact arithmetic by another formulation
//! - `examples`: circuits of the scenario and of the docs
//! - `compare`: two circuits across a band against closed forms
//! - `prove`: circuits proved identical, told apart, or called undecided
//! - `refine`: sweeps whose points are chosen by the response
//! - `reference`: published values from outside the project
//! - `swap`: circuits with their couplings replaced
//! - `tidy`: rules of the house
//! - `support`: solve a circuit text and read values by name

mod bad;
mod compare;
mod exact;
mod examples;
mod prove;
mod reference;
mod refine;
mod support;
mod swap;
mod tidy;
