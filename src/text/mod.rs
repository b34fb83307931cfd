//! Text to syntax tree.

pub mod ast;
