//! The growth of exp(At): exp(rate t) t^power, and whether it is bounded.

use super::{Eigenvalue, Evidence, RateClass, SpectralFactor};
use std::cmp::Ordering;

/// What exp(At) does as t grows.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Boundedness {
    /// Tends to 0: all real parts are negative.
    Decaying,
    /// Stays bounded and does not tend to 0: the largest real part is 0 with Jordan blocks of size 1 only.
    Bounded,
    /// Unbounded like a power of t: the largest real part is 0 with a larger Jordan block.
    GrowingPolynomially,
    /// Unbounded exponentially: a real part is positive.
    GrowingExponentially,
    /// Not decided within the limits.
    Open,
}

/// The leading growth exp(rate t) t^power of exp(At).
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Growth {
    /// Whether exp(At) is bounded.
    pub boundedness: Boundedness,
    /// The power of t at the largest real part; `None` if a Jordan index or an equality is open, or for order 0.
    pub power: Option<usize>,
}

pub(super) fn growth(factors: &[SpectralFactor], eigenvalues: &[Eigenvalue], rates: &[RateClass]) -> Growth {
    let Some(lead) = rates.first() else {
        return Growth { boundedness: Boundedness::Bounded, power: None };
    };
    let indices: Option<Vec<usize>> = lead.eigenvalues.iter().map(|i| factors[eigenvalues[*i].factor].index).collect();
    let largest = indices.and_then(|list| list.into_iter().max());
    let power = largest.filter(|_| lead.equality == Evidence::Proved).map(|index| index.saturating_sub(1));
    let boundedness = match (lead.sign(), power) {
        (Some(Ordering::Less), _) => Boundedness::Decaying,
        (Some(Ordering::Greater), _) => Boundedness::GrowingExponentially,
        (Some(Ordering::Equal), Some(0)) => Boundedness::Bounded,
        (Some(Ordering::Equal), Some(_)) => Boundedness::GrowingPolynomially,
        (Some(Ordering::Equal), None) | (None, _) => Boundedness::Open,
    };
    Growth { boundedness, power }
}
