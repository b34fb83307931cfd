//! What can be wrong with a text, in words, and where.

use crate::diag::Diagnostic;
use crate::source::Span;
use crate::text::cursor::DEEPEST;
use thiserror::Error;

/// Something in a text that cannot be read.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
#[non_exhaustive]
#[expect(missing_docs, reason = "every field is a piece of the message above it")]
pub enum TextError {
    /// Something else was needed at this place.
    #[error("expected {what}, found {found}")]
    Expected { what: &'static str, found: String, hint: &'static str, span: Span },
    /// A character that only looks like one of the language.
    #[error("`{written}` is not a character of the language")]
    LookAlike { written: char, meant: &'static str, span: Span },
    /// A bracket without its partner.
    #[error("this bracket is never closed")]
    UnclosedBracket { span: Span },
    /// A closing bracket without its partner.
    #[error("this bracket closes nothing")]
    StrayBracket { span: Span },
    /// A quote that does not end on its line.
    #[error("this quoted text does not end on its line")]
    UnclosedQuote { span: Span },
    /// A block body without its end.
    #[error("this block body is never closed")]
    UnclosedBlock { span: Span },
    /// A brace that belongs to no block.
    #[error("this brace belongs to no block")]
    StrayBrace { span: Span },
    /// A block without a body.
    #[error("the block has no body")]
    MissingBody { span: Span },
    /// Nesting beyond the limit.
    #[error("nested more than {DEEPEST} levels deep")]
    TooDeep { span: Span },
    /// A text too long for the spans.
    #[error("the text is longer than 4 GiB")]
    TooLong { span: Span },
    /// The first word is no statement.
    #[error("`{word}` does not start a statement")]
    UnknownStatement { word: String, suggestion: Option<&'static str>, span: Span },
    /// A statement kept for later.
    #[error("`{word}` statements are reserved: they are not available yet")]
    NotAvailable { word: String, span: Span },
    /// `name = value` without `let`.
    #[error("a value is named with `let`")]
    MissingLet { name: String, span: Span },
    /// `let name : value`
    #[error("`let` takes `=`, not `:`")]
    ColonForEquals { span: Span },
    /// `name = value` in an element.
    #[error("an element takes `:` between its name and its value, not `=`")]
    EqualsForColon { span: Span },
    /// `k = 0.98` in a coupling.
    #[error("a coupling takes no `=`")]
    EqualsInCoupling { word: &'static str, span: Span },
    /// A word of the language as the name of a value.
    #[error("`{name}` cannot be a name here: it {reason}")]
    Reserved { name: String, reason: String, span: Span },
    /// A coupling of fewer than two windings.
    #[error("a coupling needs at least two windings")]
    TooFewWindings { span: Span },
    /// An element without `name :`.
    #[error("this element has no name")]
    MissingElementName { span: Span },
    /// An element without a value.
    #[error("element `{name}` has no value")]
    MissingValue { name: String, span: Span },
    /// An element that ends with `)` alone.
    #[error("an element ends with `)-`")]
    ElementNotEnded { span: Span },
    /// A mark away from its bracket.
    #[error("a mark touches its bracket")]
    MarkApart { fixed: &'static str, span: Span },
    /// More digits than are kept.
    #[error("a number has at most 38 digits")]
    TooManyDigits { span: Span },
    /// A number beyond the range of a double.
    #[error("this number is too large to be kept")]
    TooLarge { span: Span },
    /// A number below the range of a double.
    #[error("this number is too small to be kept")]
    TooSmall { span: Span },
    /// `.5` or `5.`
    #[error("a decimal point stands between digits")]
    BarePoint { fixed: String, span: Span },
    /// A word after a number that is no unit.
    #[error("`{word}` is not a unit")]
    UnknownUnit { word: String, suggestion: Option<String>, span: Span },
    /// A compound unit that cannot be kept.
    #[error("this compound unit cannot be used")]
    UnfitUnit { span: Span },
    /// A unit without a number.
    #[error("`{word}` is a unit ({spoken}) and needs a number before it")]
    LoneUnit { word: String, spoken: String, span: Span },
    /// `4m7`
    #[error("`{written}` could be milliohms or millifarads")]
    AmbiguousMark { written: String, number: String, span: Span },
    /// `2R2 H`
    #[error("`{written}` is a resistance: the unit after it disagrees")]
    MarkDisagrees { written: String, span: Span },
    /// `∠ 30`
    #[error("an angle needs a unit")]
    AngleWithoutUnit { span: Span },
    /// A call of something that is no function.
    #[error("`{name}` is not a function")]
    UnknownFunction { name: String, suggestion: Option<&'static str>, span: Span },
    /// A function name without a bracket.
    #[error("`{name}` is a function and needs its brackets")]
    FunctionWithoutBrackets { name: String, span: Span },
}

impl TextError {
    /// Where the error is.
    pub fn span(&self) -> Span {
        use TextError as E;
        match self {
            E::Expected { span, .. }
            | E::LookAlike { span, .. }
            | E::UnclosedBracket { span }
            | E::StrayBracket { span }
            | E::UnclosedQuote { span }
            | E::UnclosedBlock { span }
            | E::StrayBrace { span }
            | E::MissingBody { span }
            | E::TooDeep { span }
            | E::TooLong { span }
            | E::UnknownStatement { span, .. }
            | E::NotAvailable { span, .. }
            | E::MissingLet { span, .. }
            | E::ColonForEquals { span }
            | E::EqualsForColon { span }
            | E::EqualsInCoupling { span, .. }
            | E::Reserved { span, .. }
            | E::TooFewWindings { span }
            | E::MissingElementName { span }
            | E::MissingValue { span, .. }
            | E::ElementNotEnded { span }
            | E::MarkApart { span, .. }
            | E::TooManyDigits { span }
            | E::TooLarge { span }
            | E::TooSmall { span }
            | E::BarePoint { span, .. }
            | E::UnknownUnit { span, .. }
            | E::UnfitUnit { span }
            | E::LoneUnit { span, .. }
            | E::AmbiguousMark { span, .. }
            | E::MarkDisagrees { span, .. }
            | E::AngleWithoutUnit { span }
            | E::UnknownFunction { span, .. }
            | E::FunctionWithoutBrackets { span, .. } => *span,
        }
    }

    /// The words under the mark.
    fn label(&self) -> &'static str {
        use TextError as E;
        match self {
            E::UnclosedBracket { .. } | E::UnclosedQuote { .. } | E::UnclosedBlock { .. } => {
                "opened here"
            }
            E::MissingElementName { .. } => "a name and `:` are missing here",
            E::MissingValue { .. } => "a value is missing here",
            E::MissingBody { .. } => "`{` is missing here",
            E::TooDeep { .. } => "one level too deep",
            E::AngleWithoutUnit { .. } => "degrees or radians?",
            _ => "",
        }
    }

    /// What to do about it; empty where the message says it all.
    fn way_out(&self) -> String {
        use TextError as E;
        let fixed = match self {
            E::Expected { hint, .. } => hint,
            E::LookAlike { meant, .. } => return format!("write {meant}"),
            E::UnclosedBracket { .. } => {
                "close it with `)`; an element ends with `)-` outside all inner brackets"
            }
            E::StrayBracket { .. } => "remove it, or open its partner before it",
            E::UnclosedQuote { .. } => "close it with `\"`",
            E::UnclosedBlock { .. } => "close it with `}`",
            E::StrayBrace { .. } => "a body belongs to `block name (nodes ; parameters) { … }`",
            E::MissingBody { .. } => {
                "write `{` on the block's own line, then its statements, then `}`"
            }
            E::TooDeep { .. } => "name inner parts with `let`",
            E::TooLong { .. } => "split it and use `include`",
            E::UnknownStatement { suggestion: Some(word), .. } => {
                return format!("did you mean `{word}`?");
            }
            E::UnknownStatement { suggestion: None, .. } => {
                "a path starts with a node and a link: `node -( name : value )- node`"
            }
            E::NotAvailable { .. } => "take the statement out",
            E::MissingLet { name, .. } => return format!("write `let {name} = …`"),
            E::ColonForEquals { .. } => "write `let name = value`",
            E::EqualsForColon { .. } => "write `-( name : value )-`",
            E::EqualsInCoupling { word, .. } => return format!("write `{word} value`"),
            E::Reserved { .. } => "choose another name, for example with a suffix such as `_1`",
            E::TooFewWindings { .. } => "write `couple a, b : …`",
            E::MissingElementName { .. } => "write `-( name : value )-`",
            E::MissingValue { .. } => "write a value with its unit, such as `4.7 kΩ`",
            E::ElementNotEnded { .. } => {
                "write `)-` and the next node; parallel elements are joined by `)(`"
            }
            E::MarkApart { fixed, .. } => return format!("write `{fixed}`"),
            E::TooManyDigits { .. } => "no instrument reads that many; round it",
            E::TooLarge { .. } => "the largest number is near 1.8e308",
            E::TooSmall { .. } => "the smallest number is near 5e-324; write 0 if that is meant",
            E::BarePoint { fixed, .. } => return format!("write `{fixed}`"),
            E::UnknownUnit { suggestion: Some(unit), .. } => {
                return format!("did you mean `{unit}`?");
            }
            E::UnknownUnit { word, suggestion: None, .. } => {
                return format!("to multiply by a value named `{word}`, write `*` before it");
            }
            E::UnfitUnit { .. } => {
                "degrees and peak values stand first and alone; powers stay below 100"
            }
            E::LoneUnit { word, .. } => return format!("write `1 {word}`, or choose another name"),
            E::AmbiguousMark { number, .. } => {
                return format!("write `{number} mΩ` or `{number} mF`");
            }
            E::MarkDisagrees { .. } => "write the number with a decimal point and its unit",
            E::AngleWithoutUnit { .. } => "write `30°`, `30 deg` or `0.52 rad`",
            E::UnknownFunction { suggestion: Some(name), .. } => {
                return format!("did you mean `{name}`?");
            }
            E::UnknownFunction { suggestion: None, .. } => "to multiply, write `*` before `(`",
            E::FunctionWithoutBrackets { name, .. } => return format!("write `{name}(…)`"),
        };
        (*fixed).to_owned()
    }

    /// The error with its place and the way out.
    pub fn diagnostic(&self) -> Diagnostic {
        let diagnostic = Diagnostic::error(self.to_string()).at(self.span(), self.label());
        match self.way_out() {
            help if help.is_empty() => diagnostic,
            help => diagnostic.help(help),
        }
    }
}
