//! Taylor models: a function on a stretch of time as a polynomial in s = t - centre and a bound of the rest.
//!
//! f(centre + s) = sum_k c_k s^k + r(s), c_k in the coefficients' intervals, |r| <= slack for all |s| <= h. Sums, rational multiples and
//! primitives of such functions are of this kind again.

use crate::number::Direction::Up;
use crate::number::{Dyadic, Interval, Rational};
use std::cmp::Ordering;

/// A function on a stretch of time.
#[derive(Clone, Debug)]
pub struct Taylor {
    /// Enclose the c_k.
    pub coefficients: Vec<Interval>,
    /// Bounds |r|.
    pub slack: Dyadic,
    /// Half the length h of the stretch, or more.
    pub half_width: Dyadic,
    /// Mantissa bits.
    pub bits: u32,
}

impl Taylor {
    /// The zero function with this many coefficients.
    pub fn zero(order: usize, half_width: &Dyadic, bits: u32) -> Self {
        let coefficients = vec![Interval::integer(0); order.max(1)];
        Self { coefficients, slack: Dyadic::zero(), half_width: half_width.clone(), bits }
    }

    /// Adds a rational multiple of another function on the same stretch.
    pub fn add_multiple(&mut self, factor: &Rational, other: &Self) {
        self.add_scaled(&Interval::rational(factor, self.bits), other);
    }

    /// Adds a multiple by a number in an interval.
    pub fn add_scaled(&mut self, factor: &Interval, other: &Self) {
        let short = other.coefficients.len().saturating_sub(self.coefficients.len());
        self.coefficients.extend(vec![Interval::integer(0); short]);
        for (slot, c) in self.coefficients.iter_mut().zip(&other.coefficients) {
            *slot = slot.add(&c.mul(factor, self.bits), self.bits);
        }
        // SOUND(hi): |factor| and the slack from above, rounded up.
        let slack = other.slack.mul(&factor.abs_hi(), self.bits, Up);
        self.slack = self.slack.add(&slack, self.bits, Up);
    }

    /// The product with another function on the same stretch, with as many coefficients as this one has.
    pub fn mul(&self, other: &Self) -> Self {
        let bits = self.bits;
        let mut product = Self::zero(self.coefficients.len(), &self.half_width, bits);
        let mut powers = vec![Dyadic::power_of_two(0)];
        for _ in 0..self.coefficients.len() + other.coefficients.len() {
            let next = powers.last().map_or_else(Dyadic::zero, |p| p.mul(&self.half_width, bits, Up));
            powers.push(next);
        }
        // SOUND(hi): f g - p q = f (g - q) + q (f - p) is at most |f| slack_g + |q| slack_f; terms beyond the last coefficient are at most
        // |c_i d_j| h^(i+j); all from above, rounded up.
        let (ours, theirs) = (self.range().abs_hi(), other.range().abs_hi().add(&other.slack, bits, Up));
        let mut slack = ours.mul(&other.slack, bits, Up).add(&theirs.mul(&self.slack, bits, Up), bits, Up);
        for (i, c) in self.coefficients.iter().enumerate() {
            for (j, d) in other.coefficients.iter().enumerate() {
                let part = c.mul(d, bits);
                match (product.coefficients.get_mut(i + j), powers.get(i + j)) {
                    (Some(slot), _) => *slot = slot.add(&part, bits),
                    (None, Some(power)) => slack = slack.add(&part.abs_hi().mul(power, bits, Up), bits, Up),
                    (None, None) => {}
                }
            }
        }
        product.slack = slack;
        product
    }

    /// Adds a constant.
    pub fn add_constant(&mut self, constant: &Interval) {
        if let Some(first) = self.coefficients.first_mut() {
            *first = first.add(constant, self.bits);
        }
    }

    /// Encloses the function on the stretch.
    pub fn range(&self) -> Interval {
        let mut result = Interval::symmetric(&self.slack);
        let mut power = Dyadic::power_of_two(0);
        for (k, c) in self.coefficients.iter().enumerate() {
            // SOUND(hi): |c_k s^k| <= |c_k| h^k, both factors from above, rounded up; the constant term enters as it is.
            let part = if k == 0 { c.clone() } else { Interval::symmetric(&c.abs_hi().mul(&power, self.bits, Up)) };
            result = result.add(&part, self.bits);
            power = power.mul(&self.half_width, self.bits, Up);
        }
        result
    }

    /// The sign on the whole stretch, where it is certain.
    pub fn sign(&self) -> Option<Ordering> {
        self.range().certain_sign()
    }

    /// The primitive that vanishes at s = -h.
    ///
    /// Why: the polynomial's primitive vanishes at -h if its value there is taken off; the integral of r over at most 2 h is at most
    /// 2 h slack.
    pub fn primitive(&self) -> Self {
        let mut coefficients = vec![Interval::integer(0)];
        for (k, c) in self.coefficients.iter().enumerate() {
            coefficients.push(c.div_integer(u32::try_from(k + 1).unwrap_or(u32::MAX), self.bits));
        }
        // SOUND(hi): a product of non-negative upper bounds, rounded up.
        let slack = self.slack.mul(&self.half_width.scale(1), self.bits, Up);
        let mut primitive = Self { coefficients, slack, half_width: self.half_width.clone(), bits: self.bits };
        let start = primitive.polynomial_at(&self.half_width.neg());
        primitive.add_constant(&start.neg());
        primitive
    }

    /// Encloses the integral over the stretch.
    pub fn integral(&self) -> Interval {
        let primitive = self.primitive();
        let end = primitive.polynomial_at(&self.half_width);
        end.add(&Interval::symmetric(&primitive.slack), self.bits)
    }

    /// An upper bound of the integral of |f| over the stretch: where the sign is not certain the stretch is halved, each part
    /// up to `halvings` times, and all together as often as `steps` allows (it is counted down).
    pub fn size_integral(&self, halvings: u32, steps: &mut u32) -> Dyadic {
        if self.sign().is_some() {
            return self.integral().abs_hi();
        }
        let quarter = self.half_width.scale(-1);
        if halvings == 0 || *steps == 0 {
            // SOUND(hi): the length times the greatest size, both from above, rounded up.
            return self.range().abs_hi().mul(&self.half_width.scale(1), self.bits, Up);
        }
        *steps = steps.saturating_sub(1);
        let halves = [quarter.neg(), quarter].map(|middle| self.half_about(&middle).size_integral(halvings - 1, steps));
        // SOUND(hi): a sum of upper bounds, rounded up.
        halves.iter().fold(Dyadic::zero(), |sum, half| sum.add(half, self.bits, Up))
    }

    /// The function on the half of the stretch about -h/2 or h/2: p(middle + s), by repeated division by s - middle.
    fn half_about(&self, middle: &Dyadic) -> Self {
        let at = Interval::point(middle.clone());
        let mut coefficients = self.coefficients.clone();
        for first in 0..coefficients.len() {
            for k in (first..coefficients.len().saturating_sub(1)).rev() {
                let above = coefficients.get(k + 1).map(|c| c.mul(&at, self.bits));
                if let (Some(slot), Some(above)) = (coefficients.get_mut(k), above) {
                    *slot = slot.add(&above, self.bits);
                }
            }
        }
        Self { coefficients, half_width: self.half_width.scale(-1), ..self.clone() }
    }

    /// Encloses the polynomial part at one s.
    fn polynomial_at(&self, s: &Dyadic) -> Interval {
        let s = Interval::point(s.clone());
        let horner = |value: Interval, c: &Interval| value.mul(&s, self.bits).add(c, self.bits);
        self.coefficients.iter().rev().fold(Interval::integer(0), horner)
    }

    /// Encloses (f - c_0) / s for 0 < |s| <= h, where r is a power series whose terms are at s = h in sum at most the slack and whose
    /// lowest power is at least 1 (so the rest of [`crate::trace::ClosedForm::taylor`] is, order >= 1: see `quotient` there).
    pub fn slope(&self) -> Option<Self> {
        let inverse = Interval::point(self.half_width.clone()).recip(self.bits)?;
        let coefficients = self.coefficients.iter().skip(1).cloned().collect();
        // SOUND(hi): non-negative upper bounds, rounded up.
        let slack = self.slack.mul(inverse.hi(), self.bits, Up);
        Some(Self { coefficients, slack, half_width: self.half_width.clone(), bits: self.bits })
    }
}
