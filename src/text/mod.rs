//! Text to syntax tree.

pub mod ast;
mod cursor;
pub mod error;
mod expression;
mod grammar;
mod layout;
mod lexis;
mod number;
mod path;
mod statement;
mod words;

#[cfg(test)]
mod tests;

pub use crate::text::error::TextError;
pub use crate::text::words::{FUNCTIONS, reserved};

use crate::source::{SourceId, Span};

/// Reads a file: the statements that could be read, and all errors in order of their places.
pub fn parse(source: SourceId, text: &str) -> (ast::File, Vec<TextError>) {
    match fits(source, text) {
        Ok(()) => grammar::file(source, text),
        Err(error) => (ast::File::default(), vec![error]),
    }
}

/// Reads a whole text as one expression, as `--set` and `--read` take it.
pub fn parse_expression(source: SourceId, text: &str) -> Result<ast::Expr, TextError> {
    fits(source, text)?;
    grammar::lone_expression(source, text)
}

/// Reads a whole text as `name = expression` or as an expression alone.
pub fn parse_read(
    source: SourceId,
    text: &str,
) -> Result<(Option<ast::Name>, ast::Expr), TextError> {
    fits(source, text)?;
    grammar::lone_read(source, text)
}

/// Spans hold 32-bit offsets.
fn fits(source: SourceId, text: &str) -> Result<(), TextError> {
    if u32::try_from(text.len()).is_ok() {
        return Ok(());
    }
    Err(TextError::TooLong { span: Span { source, start: 0, end: 0 } })
}
