//! The order of the real parts of eigenvalues, with their exact equalities.
//!
//! Real-part intervals that are disjoint decide the order; intervals that overlap form a group, and a group is a class
//! only if all its real parts are proved equal: to one rational number by reflection, or to each other by the pair-sum
//! polynomial.

use super::equality::{contains, has_real_part, may_vanish, one_root_near, simplest_rational};
use super::pair_sum::pair_sum_polynomial;
use super::{Eigenvalue, Evidence, SpectralFactor};
use crate::integer_polynomial::IntegerPolynomial;
use crate::root::RootDisc;
use keepout_checker::number::{Complex, Interval, Rational};
use std::cmp::Ordering;
use std::collections::HashMap;

/// Degrees up to which the pair-sum polynomial of a factor is formed.
const PAIR_SUM_DEGREE: usize = 24;

/// Square-free polynomials that vanish at 2 Re lambda for the roots of one or two factors, formed when first needed.
#[derive(Default)]
pub(crate) struct PairSums {
    single: HashMap<IntegerPolynomial, Vec<IntegerPolynomial>>,
}

impl PairSums {
    /// The square-free parts of the pair-sum polynomial, by multiplicity.
    fn parts(&mut self, f: &IntegerPolynomial) -> &[IntegerPolynomial] {
        self.single.entry(f.clone()).or_insert_with(|| {
            pair_sum_polynomial(f).square_free_decomposition().into_iter().map(|(part, _)| part).collect()
        })
    }

    /// The part of f's pair sums that vanishes at the doubled real part of the root in the disc, if only one can.
    fn part_at(&mut self, f: &IntegerPolynomial, doubled: &Complex, bits: u32) -> Option<IntegerPolynomial> {
        let mut possible = self.parts(f).iter().filter(|part| may_vanish(part, doubled, bits));
        let part = possible.next()?.clone();
        possible.next().is_none().then_some(part)
    }
}

/// Eigenvalues of equal real part.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RateClass {
    /// Places in [`super::SpectralStructure::eigenvalues`].
    pub eigenvalues: Vec<usize>,
    /// Contains the real part of each of them.
    pub rate: Interval,
    /// The common real part, if it is proved to be this rational number.
    pub rational: Option<Rational>,
    /// `Proved`: all real parts are equal. `Open`: the enclosures overlap and nothing is proved; the class may have to
    /// be split.
    pub equality: Evidence,
}

impl RateClass {
    /// The sign of every real part in the class, if it is proved.
    pub fn sign(&self) -> Option<Ordering> {
        match &self.rational {
            Some(value) => Some(value.cmp(&Rational::from_integer(0.into()))),
            None => self.rate.certain_sign(),
        }
    }
}

/// The classes, largest real part first; real parts of different classes are proved different.
pub(crate) fn classes(
    factors: &[SpectralFactor],
    eigenvalues: &[Eigenvalue],
    sums: &mut PairSums,
    bits: u32,
) -> Vec<RateClass> {
    let mut order: Vec<(usize, Interval)> =
        eigenvalues.iter().enumerate().map(|(i, e)| (i, e.disc.enclose_re())).collect();
    order.sort_by(|(_, a), (_, b)| b.hi().cmp(a.hi()));
    let mut groups: Vec<(Vec<usize>, Interval)> = Vec::new();
    for (i, rate) in order {
        match groups.last_mut() {
            Some((members, hull)) if !hull.is_disjoint(&rate) => {
                members.push(i);
                *hull = Interval::hull(hull.lo().min(rate.lo()).clone(), hull.hi().clone());
            }
            _ => groups.push((vec![i], rate)),
        }
    }
    groups.into_iter().map(|(members, hull)| class(factors, eigenvalues, sums, members, hull, bits)).collect()
}

fn class(
    factors: &[SpectralFactor],
    eigenvalues: &[Eigenvalue],
    sums: &mut PairSums,
    members: Vec<usize>,
    rate: Interval,
    bits: u32,
) -> RateClass {
    let polynomial = |i: usize| &factors[eigenvalues[i].factor].polynomial;
    let simplest = simplest_rational(&rate).filter(|a| a.denom().bits() + a.numer().bits() < u64::from(bits));
    // A polynomial that is symmetric about a has the mean root a.
    let means = members.iter().map(|i| mean_root(polynomial(*i)));
    let mut candidates: Vec<Rational> = means.chain(simplest).collect();
    candidates.sort();
    candidates.dedup();
    let rational = candidates
        .into_iter()
        .filter(|a| contains(&rate, a))
        .find(|a| members.iter().all(|i| has_real_part(polynomial(*i), &eigenvalues[*i].disc, a, bits)));
    let equal = rational.is_some() || members.len() == 1 || {
        let first = members[0];
        members[1..].iter().all(|i| {
            let pair = [first, *i];
            equal_real_parts(pair.map(|k| (polynomial(k), &eigenvalues[k].disc)), sums, bits)
        })
    };
    let equality = if equal { Evidence::Proved } else { Evidence::Open };
    RateClass { eigenvalues: members, rate, rational, equality }
}

fn mean_root(f: &IntegerPolynomial) -> Rational {
    let d = f.degree();
    Rational::new(-f.coefficient(d - 1), f.leading() * d)
}

/// Whether the roots in two discs are proved to have equal real parts, by 2 Re lambda = lambda + conj lambda.
fn equal_real_parts(roots: [(&IntegerPolynomial, &RootDisc); 2], sums: &mut PairSums, bits: u32) -> bool {
    if roots.iter().any(|(f, _)| f.degree() > PAIR_SUM_DEGREE) {
        return false;
    }
    let doubled = roots.map(|(_, disc)| Complex::real(disc.enclose_re().scale(1)));
    let Some(first) = sums.part_at(roots[0].0, &doubled[0], bits) else { return false };
    let Some(second) = sums.part_at(roots[1].0, &doubled[1], bits) else { return false };
    // Both parts are square-free: so is their least common multiple, and it vanishes at both numbers.
    let common = if first == second { first } else { first.lcm(&second) };
    one_root_near(&common, &doubled[0], &doubled[1], bits)
}
