//! Polynomials with rational coefficients, expanded.

use keepout_checker::statement::{Expression, Term, Variable};
use num_rational::BigRational;
use num_traits::{One, Zero};
use std::collections::BTreeMap;

/// A product of powers of variables: each variable once, in order, with an exponent >= 1.
pub type Powers = Vec<(Variable, u32)>;

/// A polynomial: products of powers of variables, and their coefficients (none 0).
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Polynomial(BTreeMap<Powers, BigRational>);

/// The bits of the longer one of numerator and denominator.
pub(super) fn bits(value: &BigRational) -> u64 {
    value.numer().bits().max(value.denom().bits())
}

impl Polynomial {
    /// A constant.
    pub fn constant(value: BigRational) -> Self {
        let mut map = BTreeMap::new();
        if !value.is_zero() {
            map.insert(Vec::new(), value);
        }
        Self(map)
    }

    /// A variable.
    pub fn variable(variable: Variable) -> Self {
        Self(BTreeMap::from([(vec![(variable, 1)], BigRational::one())]))
    }

    /// The value, if it is a constant.
    pub fn as_constant(&self) -> Option<BigRational> {
        match self.0.len() {
            0 => Some(BigRational::zero()),
            1 => self.0.get(&Vec::new()).cloned(),
            _ => None,
        }
    }

    /// The total degree.
    pub fn degree(&self) -> u32 {
        self.weighted_degree(&|_| 1)
    }

    /// The total degree where a variable counts as much as its weight.
    pub fn weighted_degree(&self, weight: &dyn Fn(Variable) -> u32) -> u32 {
        let of =
            |powers: &Powers| powers.iter().fold(0_u32, |d, (v, k)| d.saturating_add(k.saturating_mul(weight(*v))));
        self.0.keys().map(of).max().unwrap_or(0)
    }

    /// The number of terms.
    pub fn len(&self) -> usize {
        self.0.len()
    }

    /// Whether it is the zero polynomial.
    pub fn is_empty(&self) -> bool {
        self.0.is_empty()
    }

    /// The products with their coefficients.
    pub fn terms(&self) -> impl Iterator<Item = (&[(Variable, u32)], &BigRational)> {
        self.0.iter().map(|(p, c)| (p.as_slice(), c))
    }

    /// The same polynomial in the vocabulary of statements.
    pub fn expression(&self) -> Expression {
        let term = |(p, c): (&Powers, &BigRational)| Term { coefficient: c.clone(), powers: p.clone() };
        Expression { terms: self.0.iter().map(term).collect() }
    }

    /// Adds a term; the bits of its coefficient afterwards.
    fn accumulate(&mut self, powers: Powers, coefficient: BigRational) -> u64 {
        match self.0.entry(powers) {
            std::collections::btree_map::Entry::Vacant(_) if coefficient.is_zero() => 0,
            std::collections::btree_map::Entry::Vacant(slot) => bits(slot.insert(coefficient)),
            std::collections::btree_map::Entry::Occupied(mut slot) => {
                *slot.get_mut() += coefficient;
                let size = bits(slot.get());
                if slot.get().is_zero() {
                    slot.remove();
                }
                size
            }
        }
    }

    /// Adds factor * other; returns the most bits of a coefficient that changed.
    pub fn add_scaled(&mut self, other: &Self, factor: &BigRational) -> u64 {
        let mut most = 0;
        for (powers, c) in &other.0 {
            most = most.max(self.accumulate(powers.clone(), c * factor));
        }
        most
    }

    /// factor * self
    pub fn scaled(&self, factor: &BigRational) -> Self {
        let mut product = Self::default();
        product.add_scaled(self, factor);
        product
    }

    /// self * other
    pub fn mul(&self, other: &Self) -> Self {
        let mut product = Self::default();
        for (p, c) in &self.0 {
            for (q, d) in &other.0 {
                product.accumulate(merged(p, q), c * d);
            }
        }
        product
    }

    /// The most bits of a coefficient.
    pub fn bits(&self) -> u64 {
        self.0.values().map(bits).max().unwrap_or(0)
    }
}

fn merged(p: &Powers, q: &Powers) -> Powers {
    if p.is_empty() {
        return q.clone();
    }
    let mut powers: BTreeMap<Variable, u32> = p.iter().copied().collect();
    for (v, k) in q {
        *powers.entry(*v).or_insert(0) += k;
    }
    powers.into_iter().collect()
}
