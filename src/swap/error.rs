//! Why couplings cannot be replaced as asked, and the ways out.

use crate::diag::Diagnostic;
use crate::source::Span;
use crate::swap::Kind;
use thiserror::Error;

/// Why there is no twin.
#[derive(Clone, Debug, PartialEq, Error)]
#[allow(missing_docs)] // the messages say what the fields are
pub enum SwapError {
    #[error("no windings of this circuit are coupled, so there is nothing to replace")]
    NothingCoupled,
    #[error("there is no winding `{name}`")]
    UnknownWinding { name: String, near: Option<String> },
    #[error("`{name}` is coupled to nothing")]
    NotCoupled { name: String, span: Span },
    #[error("`{first}` and `{second}` belong to different sets of coupled windings")]
    DifferentSets { first: String, second: String, span: Span },
    #[error("one winding is not enough to choose a set")]
    OnlyOne,
    #[error("a {kind} replaces two windings, but this set has {count}: {names}")]
    TooMany { kind: Kind, count: usize, names: String, span: Span },
    #[error("there is no node `{name}`")]
    UnknownNode { name: String, near: Option<String> },
    #[error("a tie from `{first}` to `{second}` would close a loop, and current could flow in it")]
    TieMakesLoop { first: String, second: String },
    #[error("no set that needs a tie has one winding at `{first}` and another one at `{second}`")]
    TieElsewhere { first: String, second: String },
    #[error("a {kind} needs no tie")]
    TieNotHere { kind: Kind },
    #[error("{names} are fully coupled (k = 1), so there is no {kind} of them")]
    FullyCoupled { kind: Kind, names: String, span: Span },
    #[error("a mesh joins the islands of its windings")]
    MeshKeepsNoIsolation,
    #[error("`--ratio` belongs to a tee or a pi, not to a {kind}")]
    RatioNotHere { kind: Kind },
    #[error("the ratio must be a number other than zero")]
    RatioZero,
    #[error("the best ratio of {names} depends on the frequency, and turns cannot")]
    RatioVaries { names: String, span: Span },
    #[error("{names} would need turns that depend on the frequency or are not real")]
    TurnsVary { names: String, span: Span },
    #[error("{names} would store negative energy")]
    NegativeEnergy { names: String, span: Span },
    #[error("the twin has no leg `{name}`")]
    UnknownLeg { name: String, near: Option<String>, legs: String },
    #[error("`{name}` has no inductance to round: it depends on the frequency")]
    CannotRound { name: String },
    #[error("a formula for {names} has a dimension too large to write down")]
    DimensionTooLarge { names: String, span: Span },
}

impl SwapError {
    fn span(&self) -> Option<Span> {
        use SwapError as E;
        match self {
            E::NotCoupled { span, .. }
            | E::DifferentSets { span, .. }
            | E::TooMany { span, .. }
            | E::FullyCoupled { span, .. }
            | E::RatioVaries { span, .. }
            | E::TurnsVary { span, .. }
            | E::NegativeEnergy { span, .. }
            | E::DimensionTooLarge { span, .. } => Some(*span),
            _ => None,
        }
    }

    fn help(&self) -> Option<String> {
        use SwapError as E;
        Some(match self {
            E::NothingCoupled => "state a coupling with `couple`".into(),
            E::UnknownWinding { near, .. } | E::UnknownNode { near, .. } => {
                format!("did you mean `{}`?", near.as_ref()?)
            }
            E::NotCoupled { .. } | E::DifferentSets { .. } | E::OnlyOne => {
                "`--only` takes two or more windings of one set, such as `--only dock,buoy`".into()
            }
            E::TooMany { .. } => "use `mesh`, `leakage` or `dependent`, which take any number of \
                                  windings; or choose a set of two with `--only`"
                .into(),
            E::TieMakesLoop { .. } => {
                "leave `--tie` out: an ideal 1:1 transformer takes its place".into()
            }
            E::TieElsewhere { .. } => "name one end of each winding, the windings on two islands \
                                       that nothing ties yet"
                .into(),
            E::TieNotHere { .. } => "leave `--tie` out".into(),
            E::FullyCoupled { kind: Kind::Pi, .. } => "k = 1 has no leakage to put into a pi: use \
                                                       `tee`, `leakage` or `dependent`"
                .into(),
            E::FullyCoupled { .. } => {
                "their inductance matrix has no inverse: use `leakage` or `dependent`".into()
            }
            E::MeshKeepsNoIsolation => {
                "use `leakage` or `dependent`, which keep the islands apart".into()
            }
            E::RatioNotHere { .. } => {
                "`leakage` has its own ratios, and `mesh` and `dependent` need none".into()
            }
            E::RatioZero => "try `--ratio auto`".into(),
            E::RatioVaries { .. } => "give the ratio as a number".into(),
            E::TurnsVary { .. } => "use `dependent`, which takes any formula".into(),
            E::NegativeEnergy { .. } => "look at the couplings of this set with `check`".into(),
            E::UnknownLeg { near, legs, .. } => match near {
                Some(near) => format!("did you mean `{near}`? The legs are {legs}"),
                None => format!("the legs are {legs}"),
            },
            E::CannotRound { .. } => "round legs of constant inductance only".into(),
            E::DimensionTooLarge { .. } => "use `dependent`".into(),
        })
    }

    /// For the reader, with the place and a way out.
    pub fn diagnostic(&self) -> Diagnostic {
        let mut diagnostic = Diagnostic::error(self.to_string());
        if let Some(span) = self.span() {
            diagnostic = diagnostic.at(span, "");
        }
        match self.help() {
            Some(help) => diagnostic.help(help),
            None => diagnostic,
        }
    }
}
