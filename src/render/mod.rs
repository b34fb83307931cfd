//! Results to text.

pub mod number;
