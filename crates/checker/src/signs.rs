//! Sets of possible signs, and what identities make of them.

use crate::certificate::{Identity, Sign};
use std::cmp::Ordering::{Equal, Greater, Less};

/// The signs that a number may have.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct SignSet {
    negative: bool,
    zero: bool,
    positive: bool,
}

impl SignSet {
    /// Nothing is known.
    pub const ANY: Self = Self { negative: true, zero: true, positive: true };
    const NONE: Self = Self { negative: false, zero: false, positive: false };

    /// This sign alone.
    pub fn only(sign: Sign) -> Self {
        Self { negative: sign == Less, zero: sign == Equal, positive: sign == Greater }
    }

    /// The members.
    pub fn members(self) -> impl Iterator<Item = Sign> + Clone {
        [(self.negative, Less), (self.zero, Equal), (self.positive, Greater)].into_iter().filter(|m| m.0).map(|m| m.1)
    }

    /// The members of both; if there is none, then what is known is contradictory, and this set is kept.
    pub fn and(self, other: Self) -> Self {
        let both = Self {
            negative: self.negative && other.negative,
            zero: self.zero && other.zero,
            positive: self.positive && other.positive,
        };
        if both == Self::NONE { self } else { both }
    }

    /// The members of either.
    pub fn or(self, other: Self) -> Self {
        Self {
            negative: self.negative || other.negative,
            zero: self.zero || other.zero,
            positive: self.positive || other.positive,
        }
    }

    /// The union of the results for all pairs of members.
    fn pairwise(self, other: Self, result: impl Fn(Sign, Sign) -> Self) -> Self {
        let pairs = self.members().flat_map(|a| other.members().map(move |b| (a, b)));
        pairs.fold(Self::NONE, |set, (a, b)| set.or(result(a, b)))
    }

    /// The signs of a sum.
    fn plus(self, other: Self) -> Self {
        self.pairwise(other, |a, b| match (a, b) {
            (Equal, sign) | (sign, Equal) => Self::only(sign),
            _ if a == b => Self::only(a),
            _ => Self::ANY,
        })
    }

    /// The signs of a product.
    fn times(self, other: Self) -> Self {
        self.pairwise(other, |a, b| match a {
            Less => Self::only(b.reverse()),
            Equal => Self::only(Equal),
            Greater => Self::only(b),
        })
    }

    /// The signs of a power; of the power 0: of the number 1.
    fn power(self, exponent: u32) -> Self {
        match (exponent, exponent % 2) {
            (0, _) => Self::only(Greater),
            (_, 1) => self,
            _ => Self { negative: false, zero: self.zero, positive: self.negative || self.positive },
        }
    }
}

/// Narrows the signs of functions by identities between them, in order.
///
/// Lemma: the identities hold at each instant (and on the torus, see `rules::inseparable`); the signs of products, powers and sums
/// of numbers with signs in given sets lie in the sets formed here.
pub fn narrow(signs: &mut [SignSet], identities: &[Identity]) {
    let of = |signs: &[SignSet], function: usize| signs.get(function).copied().unwrap_or(SignSet::ANY);
    for Identity { target, summands } in identities {
        let product = |factors: &Vec<(usize, u32)>| {
            factors.iter().fold(SignSet::only(Greater), |set, (f, power)| set.times(of(signs, *f).power(*power)))
        };
        let sum = summands.iter().map(product).fold(SignSet::only(Equal), SignSet::plus);
        if let Some(slot) = signs.get_mut(*target) {
            *slot = slot.and(sum);
        }
    }
}
