//! The integration tests, one binary so that they link once.
//!
//! - `bad`: every faulty circuit is refused in the words kept beside it
//! - `cli`: the program as it is called
//! - `compare`: two circuits across a band against closed forms
//! - `exact`: circuits drawn at random, solved in exact arithmetic by another formulation
//! - `examples`: circuits of the scenario and of the docs
//! - `lanes`: sweeps in lanes against exact solutions and single frequencies
//! - `mutated`: circuits with random faults never make anything panic
//! - `prove`: circuits proved identical, told apart, or called undecided
//! - `refine`: sweeps whose points are chosen by the response
//! - `reference`: published values from outside the project
//! - `swap`: circuits with their couplings replaced
//! - `tidy`: rules of the house
//! - `support`: solve a circuit text and read values by name

mod bad;
mod cli;
mod compare;
mod exact;
mod examples;
mod lanes;
mod mutated;
mod prove;
mod reference;
mod refine;
mod support;
mod swap;
mod tidy;
