//! Tests of the language, by part.
