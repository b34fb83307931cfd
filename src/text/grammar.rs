//! The grammar, and the door to its productions.
//!
//! One function per production, with the same name, in this file and in `statement`, `path`,
//! `expression`, `number` and `lexis`. Where a rule's name is a word of Rust, the function is
//! called `let_value` and `use_block`. Blanks and comments may stand between all pieces, except
//! where a comment in `(* … *)` says that pieces are glued.
//!
//! ```text
//! file          = { statement line_end } ;
//! line_end      = end of line | ";" ;                   (* see `layout` for lines that go on *)
//! statement     = path | title | let | couple | reference | read | ideal | opamp
//!               | block body | use | include ;
//!
//! path          = name step { step } ;
//! step          = ( wire | elements ) name ;
//! wire          = "==" ;
//! elements      = "-(" element ")" { "(" element ")" } "-" ;           (* ")" and "-" glued *)
//! element       = [ mark ] element_label expression { "," attribute } [ mark ] ;
//! element_label = element_name ":" ;
//! mark          = "*" | "+" | ">" | "<" ;                           (* glued to its bracket *)
//! attribute     = "q" expression [ "at" expression ]
//!               | ( "esr" | "tand" | "tol" ) expression ;
//!
//! title         = "title" text ;
//! include       = "include" text ;
//! reference     = "reference" name ;
//! let           = "let" value_name "=" expression ;
//! read          = "read" plain_name "=" expression { "," limit } ;
//! limit         = ( "least" | "most" ) expression ;
//! couple        = "couple" "from" text
//!               | "couple" name "," name { "," name } ":" coupling ;
//! coupling      = "k" expression
//!               | "M" expression [ "," "R" expression ]
//!               | "leakage" expression "at" name
//!               | "aiding" expression "," "opposing" expression
//!               | "opposing" expression "," "aiding" expression ;
//! ideal         = "ideal" element_name ":" name name { "|" name name }
//!                 "," "turns" expression { ":" expression } ;
//! opamp         = "opamp" element_name ":" name name name ;
//! block         = "block" plain_name outer ;   (* a parameter: value_name [ "=" expression ] *)
//! body          = "{" { statement line_end } "}" ;
//! use           = "use" plain_name "as" plain_name outer ;
//!                                              (* a parameter: value_name "=" expression *)
//! outer         = "(" { name } [ ";" parameter { "," parameter } ] ")" ;
//!
//! expression    = product { ( "+" | "-" ) product } ;
//! product       = signed { ( "*" | "/" ) signed } ;
//! signed        = { "-" } power ;
//! power         = phasor [ "^" signed ] ;
//! phasor        = quantity [ ( "∠" | "ang" ) [ "-" ] quantity ] ;
//! quantity      = primary [ unit ] ;               (* a unit after a bracket or a number only *)
//! primary       = number | bracket | call_or_name ;
//! bracket       = "(" expression ")" ;
//! call_or_name  = function "(" call ")" | "table" "(" table ")" | "volts" "(" volts ")"
//!               | ( "drop" | "amps" | "power" ) "(" name ")" | plain_name ;
//! call          = expression { "," expression } ;
//! table         = text "," expression ;
//! volts         = name [ "to" name ] ;
//!
//! number        = decimal [ unit ] | marked [ unit ] | decimal "j" ;          (* "j" glued *)
//! decimal       = digits [ "." digits ] [ ( "e" | "E" ) [ "+" | "-" ] digits ] ;  (* glued *)
//! marked        = digits mark_letter digits ;                                     (* glued *)
//! mark_letter   = "R" | "k" | "K" | "M" | "G" | "T" | "m" | "µ" | "u" | "n" | "p" ;
//! unit          = symbol [ unit_power ] { unit_factor [ unit_power ] } ;          (* glued *)
//! unit_factor   = ( "*" | "/" ) symbol ;                                          (* glued *)
//! unit_power    = "^" [ "-" ] digits ;                                            (* glued *)
//! symbol        = [ prefix ] unit_name ;                  (* the longest word, as a whole *)
//!
//! name          = word { "." word } ;                                             (* glued *)
//! element_name  = name that starts with a letter or "_" ;
//! plain_name    = word that starts with a letter or "_" ;
//! value_name    = plain_name that is no word of the language and no unit ;
//! word          = ( letter | digit | "_" ) { letter | digit | "_" } ;
//! text          = '"' anything but '"' and the end of the line '"' ;
//! ```

use crate::diag::did_you_mean;
use crate::source::{SourceId, Span};
use crate::text::ast::{Expr, File, Name, Statement, StatementKind};
use crate::text::cursor::{Cursor, DEEPEST, Fault, Read, failure};
use crate::text::error::TextError;
use crate::text::expression::{expression, leading_name};
use crate::text::layout::{Piece, PieceKind, pieces};
use crate::text::lexis::{blank, end, expect, name, shortened, unexpected, word_here};
use crate::text::path::{is_link, path};
use crate::text::statement::{
    block, couple, ideal, include, let_value, opamp, read, reference, title, use_block,
};
use crate::text::words::{KEPT, STATEMENTS};
use nom::Parser;

/// `file`: reads all statements and reports all errors, in order of their places.
pub fn file(source: SourceId, text: &str) -> (File, Vec<TextError>) {
    let (pieces, errors) = pieces(source, text);
    let mut reader = Reader { source, text, open: Vec::new(), done: Vec::new(), errors };
    for piece in pieces {
        reader.piece(piece);
    }
    while let Some(block) = reader.open.pop() {
        let span = Span::new(source, block.brace, block.brace + 1);
        reader.errors.push(TextError::UnclosedBlock { span });
        reader.done = block.before;
    }
    reader.errors.sort_by_key(TextError::span);
    (File { statements: reader.done }, reader.errors)
}

/// A block whose `}` is still ahead.
struct OpenBlock {
    /// Its head, if that could be read.
    head: Option<Statement>,
    brace: usize,
    /// The statements before the block.
    before: Vec<Statement>,
}

struct Reader<'a> {
    source: SourceId,
    text: &'a str,
    open: Vec<OpenBlock>,
    /// The statements of the innermost open block so far.
    done: Vec<Statement>,
    errors: Vec<TextError>,
}

impl Reader<'_> {
    fn piece(&mut self, piece: Piece) {
        match piece.kind {
            PieceKind::Statement => {
                if let Some(statement) = self.statement(piece, piece.end) {
                    if let StatementKind::Block { .. } = statement.kind {
                        let span = Span::new(self.source, piece.end, piece.end);
                        self.errors.push(TextError::MissingBody { span });
                    } else {
                        self.done.push(statement);
                    }
                }
            }
            PieceKind::Opens(brace) => self.opens(piece, brace),
            PieceKind::Closes(brace) => match self.open.pop() {
                Some(block) => self.closes(block, brace),
                None => self.stray_brace(brace),
            },
        }
    }

    fn stray_brace(&mut self, brace: usize) {
        let span = Span::new(self.source, brace, brace + 1);
        self.errors.push(TextError::StrayBrace { span });
    }

    fn opens(&mut self, piece: Piece, brace: usize) {
        let empty = piece.start == piece.end;
        let mut head = if empty { None } else { self.statement(piece, brace + 1) };
        let is_block = matches!(head, Some(Statement { kind: StatementKind::Block { .. }, .. }));
        if !is_block && (empty || head.is_some()) {
            self.stray_brace(brace);
            head = None;
        }
        if self.open.len() == usize::from(DEEPEST) {
            let span = Span::new(self.source, brace, brace + 1);
            self.errors.push(TextError::TooDeep { span });
        }
        // Deeper bodies are still read for their errors, but dropped, so the tree stays shallow.
        if self.open.len() >= usize::from(DEEPEST) {
            head = None;
        }
        let before = std::mem::take(&mut self.done);
        self.open.push(OpenBlock { head, brace, before });
    }

    fn closes(&mut self, block: OpenBlock, brace: usize) {
        let inner = std::mem::replace(&mut self.done, block.before);
        let Some(mut head) = block.head else {
            return;
        };
        if let StatementKind::Block { body, .. } = &mut head.kind {
            *body = inner;
        }
        head.span.end = brace as u32 + 1;
        self.done.push(head);
    }

    /// Reads one piece; `stop` is where its statement ends.
    fn statement(&mut self, piece: Piece, stop: usize) -> Option<Statement> {
        if piece.broken {
            return None;
        }
        let input = Cursor::new(self.source, self.text, piece.start, piece.end);
        match whole(input, statement, "the end of the statement") {
            Ok(kind) => {
                let first = blank(input).at;
                Some(Statement { kind, span: Span::new(self.source, first, stop) })
            }
            Err(error) => {
                self.errors.push(error);
                None
            }
        }
    }
}

/// Runs a parser that must use up everything.
fn whole<'a, T>(
    input: Cursor<'a>,
    mut parser: impl Parser<Cursor<'a>, Output = T, Error = Fault>,
    what: &'static str,
) -> Result<T, TextError> {
    let told = |fault: nom::Err<Fault>, place: Cursor<'a>| match fault {
        nom::Err::Failure(Fault::Told(error)) | nom::Err::Error(Fault::Told(error)) => *error,
        _ => unexpected(place, what, ""),
    };
    let (rest, found) = parser.parse(input).map_err(|fault| told(fault, input))?;
    end(rest, what).map_err(|fault| told(fault, rest))?;
    Ok(found)
}

/// `statement`: a path where the second token is a link, else what its first word says.
pub fn statement(input: Cursor<'_>) -> Read<'_, StatementKind> {
    let (rest, first) = expect("a statement", name).parse(input)?;
    if is_link(rest) {
        let (rest, path) = path(rest, first)?;
        return Ok((rest, StatementKind::Path(path)));
    }
    let start = blank(input);
    let rest = start.advance(word_here(start).len());
    match word_here(start) {
        "title" => title(rest),
        "let" => let_value(rest),
        "couple" => couple(rest),
        "reference" => reference(rest),
        "read" => read(rest),
        "ideal" => ideal(rest),
        "opamp" => opamp(rest),
        "block" => block(rest),
        "use" => use_block(rest),
        "include" => include(rest),
        _ => Err(failure(unknown(start, &first))),
    }
}

/// The error for a statement that starts with no known word and no path.
fn unknown(start: Cursor<'_>, first: &Name) -> TextError {
    let word = shortened(&first.text);
    let length = (first.span.end - first.span.start) as usize;
    let rest = blank(start.advance(length));
    if KEPT.contains(&&*first.text) {
        return TextError::NotAvailable { word, span: first.span };
    }
    if rest.rest.starts_with('=') {
        return TextError::MissingLet { name: word, span: first.span };
    }
    if rest.rest.starts_with(['-', '(', '−', '–']) {
        let hint = "a link is `-( name : value )-`, its dash and bracket together, or `==`";
        return unexpected(rest, "a link after the node", hint);
    }
    let suggestion = did_you_mean(&first.text, STATEMENTS);
    TextError::UnknownStatement { word, suggestion, span: first.span }
}

/// A whole text as one expression.
pub fn lone_expression(source: SourceId, text: &str) -> Result<Expr, TextError> {
    let input = Cursor::new(source, text, 0, text.len());
    whole(input, expect("a value", expression), "an operator or the end")
}

/// A whole text as `name = expression` or as an expression alone.
pub fn lone_read(source: SourceId, text: &str) -> Result<(Option<Name>, Expr), TextError> {
    let input = Cursor::new(source, text, 0, text.len());
    let (rest, name) = match leading_name(input) {
        Some((rest, name)) => (rest, Some(name)),
        None => (input, None),
    };
    let value = whole(rest, expect("a value", expression), "an operator or the end")?;
    Ok((name, value))
}
