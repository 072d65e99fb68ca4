//! Sets of starts: what the claim `region` is about, and the evidence for it.
//!
//! Write the trajectory as the sum of P_mu(t) exp(mu t) over distinct complex exponents mu, each P_mu a polynomial with complex
//! vectors as coefficients. There is only one way to do that, and P_(conj mu) = conj P_mu. Replace
//! - exp(i omega_j t) by exp(i phi_j) with free angles phi_j, for base frequencies omega_j;
//! - exp(scale t) by y >= `start`, and exp(rho_j t) by u_j with y^lo_j <= u_j <= y^hi_j, for base rates rho_j;
//! - t by T >= `from`, and T <= y^`power` where there is a power.
//!
//! Then exp(mu t) becomes e_mu = y^g_0 u_1^g_1 ... exp(i (n_1 phi_1 + ...)) for its growth g and its turns n, and the set is that of
//! all points x = sum of P_mu(T) e_mu; a conjugate pair adds 2 Re(P_mu(T) e_mu).

use crate::certificate::Node;
use crate::number::Rational;
use crate::statement::{Expression, Statement, Term, Variable};
use num_traits::One;

/// The only root of a polynomial in a rectangle.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct NamedRoot {
    /// The coefficients of the polynomial, constant term first; the last one is 1.
    pub polynomial: Vec<Rational>,
    /// The least and the greatest real part.
    pub re: (Rational, Rational),
    /// The least and the greatest imaginary part; 0 and 0 for a real root.
    pub im: (Rational, Rational),
}

/// A base rate, and the band of its coordinate u.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Rate {
    /// The position of the root whose real part it is.
    pub root: usize,
    /// u >= y^lo.
    pub lo: Rational,
    /// u <= y^hi.
    pub hi: Rational,
}

/// What stands for exp(mu t).
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Exponent {
    /// The position of the root mu; its conjugate is understood.
    pub root: usize,
    /// The powers of y, u_1, u_2, ...
    pub growth: Vec<Rational>,
    /// The integer multiples of the base angles.
    pub turns: Vec<i64>,
}

/// A set of starts.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Region {
    /// T >= from; the set contains the trajectory at each t >= from.
    pub from: Rational,
    /// y stands for exp(scale t).
    pub scale: Rational,
    /// y >= start.
    pub start: Rational,
    /// T <= y^power; `None`: T has no upper bound.
    pub power: Option<Rational>,
    /// The roots that the following refers to.
    pub roots: Vec<NamedRoot>,
    /// The base rates.
    pub rates: Vec<Rate>,
    /// The positions of the roots whose imaginary parts are the base frequencies.
    pub base: Vec<usize>,
    /// The exponents of the trajectory.
    pub exponents: Vec<Exponent>,
}

/// Why a real or imaginary part is a combination of base rates or base frequencies.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Reason {
    /// It is one of them.
    Base,
    /// The root lies on the vertical line through this rational number.
    Line(Rational),
    /// By the sum of roots at this position, the parts of the other roots of it being known.
    Sum(usize),
}

/// The real or the imaginary part of a root as a combination.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Step {
    /// The position of the root among all listed centres.
    pub root: usize,
    /// One number for each base rate (the first one: for the scale), or for each base frequency.
    pub row: Vec<Rational>,
    /// Why.
    pub reason: Reason,
}

/// The leading growth of a polynomial of the zone on the set.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RegionLead {
    /// The polynomial.
    pub function: usize,
    /// The powers of y, u_1, u_2, ...
    pub growth: Vec<Rational>,
    /// The power of T.
    pub power: u32,
}

/// Evidence that a set is invariant, contains the trajectory, and avoids the zone.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RegionProof {
    /// For each root of the claim its position among all listed centres.
    pub roots: Vec<usize>,
    /// A number whose exponential is at most the claim's `start`.
    pub log_start: Rational,
    /// Real parts, in an order in which each follows from those before.
    pub growths: Vec<Step>,
    /// Imaginary parts, likewise.
    pub angles: Vec<Step>,
    /// For each polynomial whose sign is used.
    pub leads: Vec<RegionLead>,
    /// The bisection of the base angles: polynomials of the zone and their signs on the part of the set with angles in the leaf;
    /// no pivots.
    pub nodes: Vec<Node>,
}

/// The states themselves, as polynomials.
pub fn coordinates(statement: &Statement) -> impl Iterator<Item = Expression> {
    let state = |i| Term { coefficient: Rational::one(), powers: vec![(Variable::State(i), 1)] };
    (0..statement.states.len()).map(move |i| Expression { terms: vec![state(i)] })
}
