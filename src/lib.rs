//! Bifilar solves linear AC networks with coupled windings.
//!
//! Data flows one way:
//! `text` (syntax tree) → `circuit` (flat network) → `system` (stamps, pattern, values) →
//! `solve` (factors, refinement) → `study` (point, sweep) → `render` → `cli`.

pub mod circuit;
pub mod cli;
pub mod diag;
pub mod number;
pub mod quantity;
pub mod render;
pub mod solve;
pub mod source;
pub mod study;
pub mod swap;
pub mod system;
pub mod text;
