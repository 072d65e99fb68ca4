//! Why a certificate is not accepted.

use crate::number::Interval;
use std::fmt;

/// The proof rules.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Rule {
    /// Traces and their closed forms.
    Trace,
    /// Equality of algebraic numbers.
    Equality,
    /// A bounded stretch of time.
    Cover,
    /// All times from some instant on.
    Cone,
    /// An instant in the zone.
    Entry,
    /// A point of each trajectory cone in the zone.
    Inseparable,
    /// A set of starts that is invariant and avoids the zone.
    Region,
    /// Many trajectories: bounds of affine functions of the states.
    WorstCase,
    /// One of many trajectories that is in the zone.
    Witness,
}

/// The side conditions of the proof rules: one variant each.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Obligation {
    /// The roots of a polynomial lie in pairwise disjoint discs, one in each.
    RootsAreSeparated,
    /// The product of the factors annihilates the trace.
    FactorsAnnihilateTrace,
    /// The closed form of a function can be enclosed.
    ClosedFormIsEnclosed,
    /// A function is the sum of products that it is said to be.
    IdentityHolds,
    /// The sums of the roots of two polynomials are the roots of the product of the listed ones.
    SumsAreRoots,
    /// A sum of two roots meets the disc of the named root and no other.
    SumIsIdentified,
    /// The polynomial is symmetric about the vertical line, and the root lies on it.
    RootIsOnLine,
    /// Two roots have equal real parts.
    RealPartsAreEqual,
    /// A root that does not lead has a smaller real part than those that lead.
    LowerRealPartIsLess,
    /// The angle of a root is the said integer combination of the base angles.
    AngleIsCombination,
    /// A lower term decreases from the cone's start on.
    LowerTermDecreases,
    /// A function has the said sign on the cell.
    SignOnCell,
    /// A function vanishes at t = 0 to the said order.
    VanishesAtStart,
    /// A function has the said sign on the leaf of the torus.
    SignOnLeaf,
    /// The signs refute the zone on the cell.
    ZoneIsRefutedOnCell,
    /// The signs refute the zone on the leaf of the torus.
    ZoneIsRefutedOnLeaf,
    /// The cells cover the window up to the cone, or to the window's end.
    CellsCoverWindow,
    /// The far field starts after t = 0.
    FarFieldStartsLate,
    /// The base frequencies are independent over the rationals.
    FrequenciesAreIndependent,
    /// A function has opposite signs on the two faces of the box across its axis.
    FacesHaveOppositeSigns,
    /// The signs prove the zone on the box of angles.
    ZoneIsProvedOnTorus,
    /// The bisection of the torus is complete.
    LeavesCoverTorus,
    /// The instant lies in the window and in the claimed bracket.
    InstantIsInWindow,
    /// The pivot has opposite signs at the two ends.
    PivotChangesSign,
    /// The signs prove the zone at the instant.
    ZoneIsProvedAtInstant,
    /// A root of the set is the only root of its polynomial in its rectangle.
    RootIsNamed,
    /// The real part of a root is the said combination of the base rates.
    RateIsCombination,
    /// A base rate lies in its band.
    RateIsInBand,
    /// The exponents of the trajectory are listed, each once, and a constant is not made to grow or turn.
    ExponentsAreListed,
    /// The set begins where the trajectory is at `from`.
    SetContainsTrajectory,
    /// The power of y bounds T from `from` on.
    PowerBoundsTime,
    /// The zone's polynomials are polynomials in the states.
    ZoneIsOfStates,
    /// A polynomial of the zone is led by the said growth on the set.
    LeadDominates,
    /// The pieces are all that is admissible.
    PiecesCover,
    /// A functional is affine in the states, each of these in one part.
    FunctionalIsAffine,
    /// The factors annihilate the responses of a functional.
    FactorsAnnihilateResponse,
    /// The affine form of a group of uncertain terms stays below its bound.
    FormIsBounded,
    /// The start, the values and the signals of the witness are admissible.
    WitnessIsAdmissible,
    /// The evidence is of the kind that the claim needs.
    EvidenceFitsClaim,
}

/// Why a certificate was not accepted.
#[non_exhaustive]
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Rejection {
    /// The text is not in the format. Exit status 3.
    Malformed {
        /// Where in the text: a path of keys, or a line.
        place: String,
        /// What the format has there.
        expected: &'static str,
        /// What was found.
        found: String,
    },
    /// The certificate is for another statement. Exit status 3.
    OtherStatement,
    /// A limit is exceeded. Exit status 2.
    LimitExceeded {
        /// The name of the limit in [`crate::Limits`].
        limit: &'static str,
        /// The greatest accepted value.
        max: u64,
        /// The value found.
        found: u64,
    },
    /// An obligation of this certificate is exactly false; this says nothing about the plant. Exit status 1.
    Refuted {
        /// The rule.
        rule: Rule,
        /// The obligation.
        obligation: Obligation,
        /// Which of several: the position of the polynomial, trace, cell or leaf.
        position: usize,
    },
    /// The enclosure does not decide the obligation at the certificate's precision. Exit status 2.
    Inconclusive {
        /// The rule.
        rule: Rule,
        /// The obligation.
        obligation: Obligation,
        /// Which of several.
        position: usize,
    },
}

impl Rejection {
    /// The exit status of `keepout-check`: 1 refuted, 2 inconclusive or beyond a limit, 3 malformed or for another statement.
    pub fn exit_status(&self) -> u8 {
        match self {
            Self::Refuted { .. } => 1,
            Self::Inconclusive { .. } | Self::LimitExceeded { .. } => 2,
            Self::Malformed { .. } | Self::OtherStatement => 3,
        }
    }
}

/// The answer of a check: nothing, or why not.
pub(crate) type Checked = Result<(), Rejection>;

/// One obligation of one rule, for one of its objects: where a check stands.
#[derive(Clone, Copy, Debug)]
pub struct Duty {
    pub(crate) rule: Rule,
    pub(crate) obligation: Obligation,
    pub(crate) position: usize,
}

impl Duty {
    /// An obligation of a rule, for the object at a position.
    pub fn new(rule: Rule, obligation: Obligation, position: usize) -> Self {
        Self { rule, obligation, position }
    }

    pub(crate) fn refuted(self) -> Rejection {
        Rejection::Refuted { rule: self.rule, obligation: self.obligation, position: self.position }
    }

    pub(crate) fn inconclusive(self) -> Rejection {
        Rejection::Inconclusive { rule: self.rule, obligation: self.obligation, position: self.position }
    }

    /// Refutes the certificate unless the condition, which is decided exactly, holds.
    pub(crate) fn ensure(self, condition: bool) -> Result<(), Rejection> {
        if condition { Ok(()) } else { Err(self.refuted()) }
    }

    /// Leaves the certificate undecided unless the condition, which enclosures decide, holds.
    pub(crate) fn decide(self, condition: bool) -> Result<(), Rejection> {
        if condition { Ok(()) } else { Err(self.inconclusive()) }
    }

    /// Requires that all members of the enclosure have this sign.
    pub(crate) fn sign(self, value: &Interval, wanted: std::cmp::Ordering) -> Result<(), Rejection> {
        match value.certain_sign() {
            Some(sign) if sign == wanted => Ok(()),
            Some(_) => Err(self.refuted()),
            None => Err(self.inconclusive()),
        }
    }
}

impl fmt::Display for Rule {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::Trace => "trace",
            Self::Equality => "equality",
            Self::Cover => "cover",
            Self::Cone => "cone",
            Self::Entry => "entry",
            Self::Inseparable => "inseparable",
            Self::Region => "region",
            Self::WorstCase => "worst_case",
            Self::Witness => "witness",
        })
    }
}

impl fmt::Display for Obligation {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::RootsAreSeparated => "the roots of polynomial {} lie one each in disjoint discs",
            Self::FactorsAnnihilateTrace => "the listed factors annihilate trace {}",
            Self::ClosedFormIsEnclosed => "the closed form of function {} can be enclosed",
            Self::IdentityHolds => "identity {} holds",
            Self::SumsAreRoots => "sum {}: the sums of the roots are the roots of the listed polynomials",
            Self::SumIsIdentified => "sum {} meets the disc of the named root alone",
            Self::RootIsOnLine => "root {} lies on the named vertical line",
            Self::RealPartsAreEqual => "the leading roots of function {} have equal real parts",
            Self::LowerRealPartIsLess => "the other roots of function {} have smaller real parts than the leading ones",
            Self::AngleIsCombination => "the angle of root {} is the listed combination",
            Self::LowerTermDecreases => "the lower terms of function {} decrease from the start of the cone on",
            Self::SignOnCell => "the listed signs hold on cell {}",
            Self::VanishesAtStart => "the listed derivatives vanish at t = 0 on cell {}",
            Self::SignOnLeaf => "the listed signs hold on leaf {}",
            Self::ZoneIsRefutedOnCell => "the signs refute the zone on cell {}",
            Self::ZoneIsRefutedOnLeaf => "the signs refute the zone on leaf {}",
            Self::CellsCoverWindow => "the cells increase and cover the window (cell {})",
            Self::FarFieldStartsLate => "the far field starts after t = 0",
            Self::FrequenciesAreIndependent => "the base frequencies are independent over the rationals",
            Self::FacesHaveOppositeSigns => {
                "function {} of the box has opposite signs on the two faces across its own axis"
            }
            Self::ZoneIsProvedOnTorus => "the signs prove the zone on the box of angles",
            Self::LeavesCoverTorus => "the bisection of the torus is complete (node {})",
            Self::InstantIsInWindow => "the instant lies in the window and in the claimed bracket",
            Self::PivotChangesSign => "pivot {} has opposite signs at the ends",
            Self::ZoneIsProvedAtInstant => "the signs prove the zone at the instant",
            Self::RootIsNamed => "root {} of the set is the only root of its polynomial in its rectangle",
            Self::RateIsCombination => "the real part of root {} is the listed combination",
            Self::RateIsInBand => "base rate {} lies in its band",
            Self::ExponentsAreListed => "the exponents of state {} are listed, each once, and a constant stays one",
            Self::SetContainsTrajectory => "the set contains the trajectory from its start on",
            Self::PowerBoundsTime => "the power of y bounds T from the start on",
            Self::ZoneIsOfStates => "polynomial {} of the zone is one in the states",
            Self::LeadDominates => "polynomial {} of the zone is led by the listed growth on the set",
            Self::PiecesCover => "the pieces are all that is admissible (node {})",
            Self::FunctionalIsAffine => "functional {} is affine in the states, each of these in one of its parts",
            Self::FactorsAnnihilateResponse => "the factors annihilate the responses of functional {}",
            Self::FormIsBounded => "the form of group {} stays below its bound",
            Self::WitnessIsAdmissible => "the start, the values and the signals of the witness are admissible",
            Self::EvidenceFitsClaim => "the evidence is of the kind that the claim needs",
        })
    }
}

impl fmt::Display for Rejection {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let duty =
            |obligation: &Obligation, position: &usize| obligation.to_string().replace("{}", &position.to_string());
        match self {
            Self::Malformed { place, expected, found } => write!(f, "at {place}: expected {expected}, found {found}"),
            Self::OtherStatement => f.write_str("the certificate embeds another statement"),
            Self::LimitExceeded { limit, max, found } => write!(f, "limit {limit}: at most {max}, found {found}"),
            Self::Refuted { rule, obligation, position } => write!(
                f,
                "rule {rule}: not so: {}; the certificate is wrong, which says nothing about the plant",
                duty(obligation, position)
            ),
            Self::Inconclusive { rule, obligation, position } => {
                write!(f, "rule {rule}: not decided at the certificate's precision: {}", duty(obligation, position))
            }
        }
    }
}

impl std::error::Error for Rejection {}
