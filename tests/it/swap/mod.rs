//! Twins: circuits with their couplings replaced.
//!
//! - `agree`: a twin and its original, and the twin's text, solved side by side
//! - `command`: its text, its warnings and its exit codes
//! - `drawn`: circuits drawn at random, every kind of twin
//! - `published`: tees, pis, meshes and cascades against values from outside the project
//! - `refused`: what cannot be replaced, and why
//! - `ties`: when islands may be joined
//! - `options`: ratio, rounding, dropping, choosing a set

mod agree;
mod command;
mod drawn;
mod options;
mod published;
mod refused;
mod ties;
