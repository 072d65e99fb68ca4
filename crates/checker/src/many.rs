//! Evidence about many trajectories: sets of starts, disturbances, uncertain quantities.
//!
//! As in [`crate::certificate`], nothing here is trusted. The rules that use it: `worst_case` and `witness`.

use crate::certificate::{Angle, Factor, RootFamily};
use crate::number::Rational;
use crate::statement::{Range, Variable};

/// A step of a division of what is admissible into pieces, in preorder.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Division {
    /// The range of this axis is cut at this number: the lower part follows, then the upper part. The axes are the uncertain
    /// quantities (not those that vary with time) and, of a box of starts, the states after them.
    Cut(usize, Rational),
    /// A piece that is not cut.
    Piece(Piece),
}

/// Evidence that no trajectory of one piece is in the zone.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Piece {
    /// Roots of polynomials, as in the certificate, for this piece.
    pub families: Vec<RootFamily>,
    /// For each group of uncertain terms that is not constant a number that the size of its affine form never exceeds.
    pub bounds: Vec<Rational>,
    /// What is bounded: first, for each of these groups, its affine form and then the same negated; after them, what `functionals`
    /// lists.
    pub functionals: Vec<Functional>,
    /// The parts of each of these in turn: first the groups' forms (those negated have none of their own), then the functionals.
    pub splits: Vec<Vec<Part>>,
    /// From t = 0 to the window's end, or to the tail's start.
    pub cells: Vec<TimeCell>,
    /// For windows without an end: all later times.
    pub tail: Option<Tail>,
}

/// A function that is affine in the states: a combination of the (widened) zone's polynomials and of states and drives.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Functional {
    /// Polynomials of the zone by position in order of first appearance, and their weights.
    pub polynomials: Vec<(usize, Rational)>,
    /// States and drives, and their weights.
    pub variables: Vec<(Variable, Rational)>,
}

/// A part of a functional: the terms with some of its states. The first part also has the terms without states.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Part {
    /// The states.
    pub states: Vec<usize>,
    /// An annihilator of the part's row h exp(A t).
    pub factors: Vec<Factor>,
    /// An annihilator of the part along the central trajectory.
    pub central: Vec<Factor>,
    /// Inputs (generators of the starts, then disturbances, then groups) with an annihilator of the part's response to them
    /// that has fewer factors.
    pub reduced: Vec<(usize, Vec<Factor>)>,
}

/// A closed stretch of time on which all functionals are bounded. It begins where the one before it ends.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct TimeCell {
    /// The end.
    pub to: Rational,
    /// The number of Taylor terms, >= 1.
    pub order: u32,
    /// Mantissa bits of the enclosures on it.
    pub bits: u32,
}

/// Bounds for all times from `from` on.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Tail {
    /// The start, > 0: the end of the last cell.
    pub from: Rational,
    /// Roots whose imaginary parts are the base frequencies of the torus.
    pub base: Vec<usize>,
    /// The angles of the leading roots that are not real.
    pub angles: Vec<Angle>,
    /// For each functional its leading terms.
    pub leads: Vec<TailLead>,
}

/// The leading terms of a functional: t^power times waves of constant size.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct TailLead {
    /// The power of t.
    pub power: u32,
    /// Their roots: on the imaginary axis.
    pub roots: Vec<usize>,
    /// The bisection of the torus in preorder: an axis, or `None` for a box that is not split.
    pub nodes: Vec<Option<usize>>,
}

/// Evidence that some admissible trajectory is in the zone at an instant.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Witness {
    /// The instant.
    pub at: Rational,
    /// The start, one number for each state.
    pub start: Vec<Rational>,
    /// Numbers that show that the start is admissible: of a zonotope its factors xi, of a hull its convex weights; else none.
    pub weights: Vec<Rational>,
    /// The values of the uncertain quantities.
    pub uncertain: Vec<Rational>,
    /// For each disturbance its values: each up to this time; the last up to `at`.
    pub signals: Vec<Vec<(Rational, Rational)>>,
    /// For each functional its parts: those of `functionals`.
    pub splits: Vec<Vec<Part>>,
    /// The functionals whose signs at the instant show that the zone holds: polynomials that are affine in the states alone, or,
    /// for the others, the states in them.
    pub functionals: Vec<Functional>,
}

/// The ranges of a piece: uncertain quantities, then the states of a box of starts.
pub type Ranges = Vec<Range>;
