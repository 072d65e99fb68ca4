//! Evidence for a statement: everything that the checker would otherwise have to search for.
//!
//! A certificate is data. Nothing in it is trusted; each field is either an input to a computation whose result is then
//! checked, or it is confirmed by one. Positions (`usize`) refer to the certificate's own lists.

use crate::many::{Division, Witness};
use crate::number::{Dyadic, Rational};
use crate::polynomial::Polynomial;
use crate::region::RegionProof;
use crate::statement::Statement;
use std::cmp::Ordering;

/// A square-free monic polynomial, and an approximation of each of its roots with imaginary part >= 0.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RootFamily {
    /// The polynomial, monic.
    pub polynomial: Polynomial,
    /// Real and imaginary parts of the approximations; imaginary part 0 for the real roots. The conjugates are understood.
    pub centres: Vec<(Dyadic, Dyadic)>,
}

/// A root: a position in the list of all centres of all families, in order; or the conjugate of that root.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct RootRef {
    /// The position.
    pub index: usize,
    /// Whether the conjugate is meant.
    pub conjugate: bool,
}

/// A family and the multiplicity of each of its roots.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Factor {
    /// The position of the family.
    pub family: usize,
    /// The multiplicity, >= 1.
    pub multiplicity: u32,
}

/// A function given by an annihilator (the product of the factors) and its first derivatives at 0.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Auxiliary {
    /// The annihilator's factors.
    pub factors: Vec<Factor>,
    /// As many derivatives at 0 as the annihilator's degree.
    pub derivatives: Vec<Rational>,
}

/// The identity `target = sum of the summands`, each of these a product of powers of functions.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Identity {
    /// The function that the sum is.
    pub target: usize,
    /// For each summand its factors: functions and their powers >= 1.
    pub summands: Vec<Vec<(usize, u32)>>,
}

/// The fact `root = sum of multiplier * part`, with one or two parts.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Sum {
    /// The root that the sum is.
    pub root: RootRef,
    /// Multipliers and roots.
    pub parts: Vec<(i64, RootRef)>,
    /// The families whose roots, with multiplicity, are all sums of this kind.
    pub factors: Vec<Factor>,
}

/// A sign of a function: `Less` negative, `Equal` zero, `Greater` positive.
pub type Sign = Ordering;

/// The function whose sign is taken case by case: negative, zero, positive.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Pivot {
    /// None.
    None,
    /// The time t, on a cell that starts at 0: `(function, power, sign)` says that the function vanishes at 0 to the order
    /// `power`, and that function / t^power has the sign on the cell.
    Start(Vec<(usize, u32, Sign)>),
    /// A function.
    Function(usize),
}

/// A closed stretch of time and the signs of functions on it. It begins where the cell before it ends.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Cell {
    /// The end.
    pub to: Rational,
    /// The number of Taylor terms, >= 1.
    pub order: u32,
    /// Functions and their signs on the whole cell.
    pub signs: Vec<(usize, Sign)>,
    /// The function whose sign is taken case by case.
    pub pivot: Pivot,
}

/// A step of a bisection in preorder.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Node {
    /// The box is halved along this axis; the lower half follows, then the upper half.
    Split(usize),
    /// The box is not split: functions and their signs on it for all times from the far field's start on, and the function
    /// whose sign is taken case by case, if any.
    Leaf(Vec<(usize, Sign)>, Option<usize>),
}

/// Why the leading roots of a function have equal real parts.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum RealPart {
    /// They lie on the vertical line through this rational number.
    Line(Rational),
    /// For each leading root r, the sum at the given position says `double = r + conj r` with one and the same root `double`.
    Doubled(Vec<usize>),
    /// There is one leading root up to conjugation.
    Single,
}

/// The leading terms of one function.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Lead {
    /// The function.
    pub function: usize,
    /// The leading roots (positions of listed centres; conjugates are understood).
    pub roots: Vec<usize>,
    /// Why their real parts are equal.
    pub real_part: RealPart,
}

/// The angle of a root as an integer combination of base angles.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Angle {
    /// The position of the root.
    pub root: usize,
    /// One integer for each base root.
    pub turns: Vec<i64>,
    /// The position of the sum that shows it; `None` for a base root.
    pub sum: Option<usize>,
}

/// Leading terms of functions for all times from `from` on, on the torus of the angles of their roots.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct FarField {
    /// The start, > 0.
    pub from: Rational,
    /// The base roots: their imaginary parts are the base frequencies of the torus.
    pub base: Vec<usize>,
    /// The angles of the leading roots that are not real; each refers to sums of roots that stand before it.
    pub angles: Vec<Angle>,
    /// The leading terms of each function whose sign is used.
    pub leads: Vec<Lead>,
}

/// Signs for all times from the far field's start on.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Cone {
    /// The leading terms.
    pub far: FarField,
    /// The bisection of the torus.
    pub nodes: Vec<Node>,
}

/// A point of the torus in the zone, for all times from the far field's start on; it may move with time inside a box.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Meeting {
    /// The leading terms.
    pub far: FarField,
    /// The box: for each base angle a centre and half the width.
    pub angles: Vec<(Rational, Rational)>,
    /// Functions that vanish together at a point of the box, each with an axis of its own: it has opposite signs on the two
    /// faces of the box across this axis.
    pub zeros: Vec<(usize, usize)>,
    /// Functions and their signs on the whole box.
    pub signs: Vec<(usize, Sign)>,
}

/// The kind of evidence.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Evidence {
    /// For `never`: cells from the window's start to the cone's start or the window's end; the cone where there is no end.
    /// For `eventually`: the cone alone.
    Never {
        /// The cells.
        cells: Vec<Cell>,
        /// The far field.
        cone: Option<Cone>,
    },
    /// For `enters`: cells from the window's start to the bracket where the claim is about the first entry; then the instant.
    Enters {
        /// The cells before the bracket.
        before: Vec<Cell>,
        /// The start of the cell in which the zone is entered.
        from: Rational,
        /// That cell: with `to` = `from` an instant; with a pivot the instant at which the pivot changes its sign.
        cell: Cell,
    },
    /// For `inseparable`.
    Inseparable(Meeting),
    /// For `region`.
    Region(RegionProof),
    /// For `never` about many trajectories.
    Many(Vec<Division>),
    /// For `enters` about many trajectories.
    Witness(Box<Witness>),
}

/// Evidence for one statement.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Certificate {
    /// The statement that the evidence is for.
    pub statement: Statement,
    /// Mantissa bits of all enclosures.
    pub bits: u32,
    /// Roots of polynomials; all roots of all families are distinct.
    pub families: Vec<RootFamily>,
    /// For each distinct polynomial of the (widened) zone, in order of appearance: the factors of an annihilator. For the claim
    /// `region` then the same for each state.
    pub traces: Vec<Vec<Factor>>,
    /// Further functions. A position of a function counts the traces first, then these.
    pub auxiliaries: Vec<Auxiliary>,
    /// Identities between functions.
    pub identities: Vec<Identity>,
    /// Relations among roots.
    pub sums: Vec<Sum>,
    /// The evidence.
    pub evidence: Evidence,
}
