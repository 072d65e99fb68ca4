//! What is claimed: a system, its known inputs, its start, a keep-out zone, a window and a claim.
//!
//! A statement is the engineer's own declaration, over the names that the engineer gave. Nothing in it is
//! derived: drives are not yet states, outputs are not yet substituted. All numbers are exact rationals.

use crate::region::Region;
use num_rational::BigRational;

/// An exact rational number.
pub type Rational = BigRational;

/// A named quantity that an expression may refer to, by position in the statement's lists.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Variable {
    /// The state at this position.
    State(usize),
    /// The known input at this position.
    Drive(usize),
    /// The named expression at this position.
    Output(usize),
    /// Time, counted from 0.
    Time,
    /// The exponential at this position; in zones alone.
    Exponential(usize),
    /// The disturbance at this position; in rates alone.
    Disturbance(usize),
}

/// A state of the system.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct State {
    /// The engineer's name for it.
    pub name: String,
    /// A label for people; no arithmetic is done with it.
    pub unit: Option<String>,
    /// Its value at t = 0; for many starts the centre of the set, see [`Starts`].
    pub start: Rational,
}

/// The admissible starts. The states' own `start` is the centre c (of a hull: its first point).
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub enum Starts {
    /// c alone.
    #[default]
    One,
    /// All x with |x_i - c_i| <= r_i: one r_i >= 0 for each state.
    Box(Vec<Rational>),
    /// All c + sum of xi_j g_j with |xi_j| <= 1: the vectors g_j, one number for each state.
    Zonotope(Vec<Vec<Rational>>),
    /// All x with (x - c)' Q^-1 (x - c) <= 1: the rows of Q, symmetric and positive semidefinite (then: h x <= h c + sqrt(h Q h')
    /// for all h).
    Ellipsoid(Vec<Vec<Rational>>),
    /// The convex hull of c and these points.
    Hull(Vec<Vec<Rational>>),
}

/// A closed range of numbers, `from` <= `to`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Range {
    /// The least member.
    pub from: Rational,
    /// The greatest member.
    pub to: Rational,
}

impl Range {
    /// The middle.
    pub fn centre(&self) -> Rational {
        (&self.from + &self.to) / Rational::from_integer(2_i32.into())
    }

    /// Half the length.
    pub fn radius(&self) -> Rational {
        (&self.to - &self.from) / Rational::from_integer(2_i32.into())
    }
}

/// An unknown input: any measurable function of time with values in a range.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Disturbance {
    /// The engineer's name for it.
    pub name: String,
    /// A label for people.
    pub unit: Option<String>,
    /// Its values.
    pub range: Range,
}

/// A quantity of which only a range is known.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Uncertain {
    /// The engineer's name for it.
    pub name: String,
    /// A label for people.
    pub unit: Option<String>,
    /// Its values.
    pub range: Range,
    /// Whether it may vary with time (measurably); else it is a constant.
    pub varying: bool,
}

/// A term of a state's rate that contains uncertain quantities: factor * product of powers * variable.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct UncertainTerm {
    /// The state whose rate it is a term of.
    pub state: usize,
    /// The constant factor, not 0.
    pub factor: Rational,
    /// Uncertain quantities and their exponents (not 0; negative only where the range does not contain 0), in increasing order.
    pub powers: Vec<(usize, i32)>,
    /// A state, a drive or a disturbance; `None`: the number 1.
    pub of: Option<Variable>,
}

/// The periodic factor of one term of a known input.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Wave {
    /// The factor 1.
    One,
    /// cos(w t), w > 0.
    Cosine(Rational),
    /// sin(w t), w > 0.
    Sine(Rational),
}

/// One term `coefficient * t^power * exp(rate t) * wave` of a known input.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SignalTerm {
    /// The constant factor.
    pub coefficient: Rational,
    /// The exponent of t.
    pub power: u32,
    /// The growth rate, in 1/time.
    pub rate: Rational,
    /// The periodic factor.
    pub wave: Wave,
}

/// A known input: the sum of its terms, exactly.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Drive {
    /// The engineer's name for it.
    pub name: String,
    /// A label for people.
    pub unit: Option<String>,
    /// The terms whose sum the signal is. No term: the zero signal.
    pub signal: Vec<SignalTerm>,
}

/// A named polynomial expression in states, drives and time.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Output {
    /// The engineer's name for it.
    pub name: String,
    /// A label for people.
    pub unit: Option<String>,
    /// Its value; refers to no output.
    pub value: Expression,
}

/// The sum `offset + sum of factor * variable` that a state's time derivative equals.
#[derive(Clone, Debug, PartialEq, Eq, Default)]
pub struct Affine {
    /// Factor and variable (a state, a drive or a disturbance), no variable twice, no factor 0.
    pub terms: Vec<(Rational, Variable)>,
    /// The constant.
    pub offset: Rational,
}

/// exp of an affine expression in states, drives and time, for use in a zone.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Exponential {
    /// Its name in the zone.
    pub name: String,
    /// What it is the exponential of.
    pub argument: Affine,
}

/// A stretch of time with its own dynamics: one rate for each state, in the order of the states.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Phase {
    /// The time derivative of each state, but for the uncertain terms.
    pub rates: Vec<Affine>,
    /// Further terms of the rates, in the order of the states: the text of a statement has them state by state.
    pub uncertain: Vec<UncertainTerm>,
}

/// One term of an [`Expression`].
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Term {
    /// The factor, not 0.
    pub coefficient: Rational,
    /// Variables and their exponents >= 1, in increasing order of variable, none twice.
    pub powers: Vec<(Variable, u32)>,
}

/// A polynomial with rational coefficients in the variables of a statement: the sum of its terms.
#[derive(Clone, Debug, PartialEq, Eq, Default)]
pub struct Expression {
    /// The terms; no two with the same powers. None: the zero polynomial.
    pub terms: Vec<Term>,
}

/// How an atom's polynomial compares with zero.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Relation {
    /// p < 0
    Negative,
    /// p <= 0
    NonPositive,
    /// p = 0
    Zero,
    /// p >= 0
    NonNegative,
    /// p > 0
    Positive,
    /// not (p = 0)
    NonZero,
}

/// One comparison of a polynomial with zero.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Atom {
    /// The polynomial p: left side minus right side, as typed.
    pub polynomial: Expression,
    /// How it compares with zero.
    pub relation: Relation,
}

/// A zone in negation normal form: `not` has been pushed into the atoms.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Formula {
    /// A comparison.
    Atom(Atom),
    /// All of them hold; of none: true.
    And(Vec<Formula>),
    /// One of them holds; of none: false.
    Or(Vec<Formula>),
}

/// A keep-out zone and the window of time in which it counts, both ends included.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Zone {
    /// The engineer's name for it.
    pub name: String,
    /// The requirement that it comes from.
    pub reference: Option<String>,
    /// The states, drives, outputs and times that are hazardous.
    pub inside: Formula,
    /// The first instant that counts, >= 0.
    pub from: Rational,
    /// The last instant that counts; `None`: for all time.
    pub until: Option<Rational>,
}

/// What is said about the system and the zone.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Claim {
    /// No admissible trajectory is in the zone at any instant of the window. With a margin m > 0 the zone is a single
    /// comparison, and the same holds for the zone widened by m: `p >= -m` in place of `p >= 0` or `p > 0`,
    /// `p <= m` in place of `p <= 0` or `p < 0`, `-m <= p <= m` in place of `p = 0`.
    Never {
        /// The margin, >= 0, in the unit of the zone's polynomial.
        margin: Rational,
    },
    /// Some admissible trajectory is in the zone at some instant of the window between these two, ends included.
    Enters {
        /// Not after the instant.
        from: Rational,
        /// Not before the instant.
        to: Rational,
        /// Whether each admissible trajectory is also claimed to be outside the zone at all instants of the window before `from`.
        first: bool,
    },
    /// The trajectory cone from `from` on avoids the zone: whatever the phases of its oscillations are, and so the trajectory
    /// itself is in the zone at no instant t >= from. Only for windows without an end. The cone is the set of all points that
    /// come about when in the closed form of the trajectory the factors exp(i omega t) are replaced by points of the closure
    /// of their joint orbit, and the rest is kept, at t >= from.
    Eventually {
        /// The cone's start.
        from: Rational,
    },
    /// The trajectory cone from each instant on meets the zone; so no o-minimal set that is invariant, contains the trajectory
    /// from some instant on, and avoids the zone exists (doi:10.4230/LIPIcs.ICALP.2020.107). It does not say that the
    /// trajectory enters the zone, nor that it does not. Only for windows without an end.
    Inseparable,
    /// Every start in a set (see [`crate::region`]) is safe for ever: no point of the set is in the zone; a solution that starts in
    /// the set stays in it; and the set contains the trajectory at each t >= from. Only for statements without known inputs,
    /// zones that do not name the time, and windows without an end.
    Region(Box<Region>),
}

/// A claim about a system: what a certificate is evidence for.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Statement {
    /// The engineer's title of the model.
    pub title: String,
    /// The states; at least one.
    pub states: Vec<State>,
    /// The admissible starts.
    pub starts: Starts,
    /// The known inputs.
    pub drives: Vec<Drive>,
    /// The unknown inputs.
    pub disturbances: Vec<Disturbance>,
    /// The quantities of which only ranges are known.
    pub uncertain: Vec<Uncertain>,
    /// The named expressions.
    pub outputs: Vec<Output>,
    /// The exponentials that the zone uses.
    pub exponentials: Vec<Exponential>,
    /// The dynamics, phase after phase; exactly one today.
    pub phases: Vec<Phase>,
    /// The keep-out zone.
    pub zone: Zone,
    /// The claim.
    pub claim: Claim,
}

impl Statement {
    /// Whether exactly one trajectory is admissible.
    pub fn is_single(&self) -> bool {
        self.starts == Starts::One && self.disturbances.is_empty() && self.uncertain.is_empty()
    }
}
