//! Exact and pseudo division of integer polynomials.

use super::IntegerPolynomial;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Zero};

impl IntegerPolynomial {
    /// The quotient self / divisor if it is an integer polynomial and exact, else `None` (also for divisor 0).
    ///
    /// For a primitive divisor this decides divisibility over the rationals (Gauss's lemma).
    pub fn divide_exact(&self, divisor: &Self) -> Option<Self> {
        let (lead, lower) = divisor.coefficients.split_last()?;
        if self.is_zero() {
            return Some(Self::zero());
        }
        let length = (self.coefficients.len() + 1).checked_sub(divisor.coefficients.len())?;
        if length == 0 || !self.trailing_divisible(divisor) {
            return None;
        }
        let mut rest = self.coefficients.clone();
        let mut quotient = vec![BigInt::zero(); length];
        for k in (0..length).rev() {
            let top = std::mem::take(&mut rest[k + lower.len()]);
            if top.is_zero() {
                continue;
            }
            let q = if lead.is_one() {
                top
            } else {
                let (q, r) = top.div_rem(lead);
                if !r.is_zero() {
                    return None;
                }
                q
            };
            for (slot, c) in rest[k..].iter_mut().zip(lower) {
                *slot -= &q * c;
            }
            quotient[k] = q;
        }
        rest.iter().all(Zero::is_zero).then(|| Self::new(quotient))
    }

    /// A cheap necessary condition: constant term divides constant term.
    fn trailing_divisible(&self, divisor: &Self) -> bool {
        match (self.coefficients.first(), divisor.coefficients.first()) {
            (Some(a), Some(b)) if !b.is_zero() => (a % b).is_zero(),
            (Some(a), Some(_)) => a.is_zero(),
            _ => false,
        }
    }

    /// (m, r) with m = lead(divisor)^k, m self = q divisor + r, deg r < deg divisor.
    ///
    /// # Panics
    /// If the divisor is 0.
    pub fn pseudo_remainder(&self, divisor: &Self) -> (BigInt, Self) {
        let (factor, _, rest) = self.pseudo_division(divisor);
        (factor, rest)
    }

    /// (m, q, r) with m = lead(divisor)^k, m self = q divisor + r, deg r < deg divisor.
    ///
    /// # Panics
    /// If the divisor is 0.
    pub fn pseudo_division(&self, divisor: &Self) -> (BigInt, Self, Self) {
        assert!(!divisor.is_zero(), "pseudo-division by the zero polynomial");
        let lead = divisor.leading();
        let lower = &divisor.coefficients[..divisor.coefficients.len() - 1];
        let mut rest = self.coefficients.clone();
        let mut quotient = vec![BigInt::zero(); (rest.len() + 1).saturating_sub(divisor.coefficients.len())];
        let mut factor = BigInt::one();
        while rest.len() >= divisor.coefficients.len() {
            let top = rest.pop().unwrap_or_default();
            if top.is_zero() {
                continue;
            }
            let offset = rest.len() + 1 - divisor.coefficients.len();
            if !lead.is_one() {
                factor *= &lead;
                for c in rest.iter_mut().chain(quotient.iter_mut()) {
                    *c *= &lead;
                }
            }
            for (slot, c) in rest[offset..].iter_mut().zip(lower) {
                *slot -= &top * c;
            }
            quotient[offset] = top;
        }
        (factor, Self::new(quotient), Self::new(rest))
    }
}
