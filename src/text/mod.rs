//! Text to syntax tree.

pub mod ast;
#[allow(missing_docs)]
#[derive(Debug, Clone)]
pub struct TextError;
#[allow(missing_docs)]
impl TextError {
    pub fn diagnostic(&self) -> crate::diag::Diagnostic {
        todo!()
    }
}
#[allow(missing_docs)]
pub fn parse(_: crate::source::SourceId, _: &str) -> (ast::File, Vec<TextError>) {
    todo!()
}
#[allow(missing_docs)]
pub fn parse_expression(_: crate::source::SourceId, _: &str) -> Result<ast::Expr, TextError> {
    todo!()
}
#[allow(missing_docs)]
pub fn parse_read(
    _: crate::source::SourceId,
    _: &str,
) -> Result<(Option<ast::Name>, ast::Expr), TextError> {
    todo!()
}
