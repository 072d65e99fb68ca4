//! Closed intervals with dyadic end points.
//!
//! Every operation returns an interval that contains all results of the operation on members of its operands.
//! The number of bits asked for governs the width only, never the truth.

use super::dyadic::Direction::{Down, Up};
use super::{Dyadic, Rational};
use num_bigint::BigInt;
use num_traits::One;
use std::cmp::Ordering;

/// The set of real numbers x with lo <= x <= hi; never empty.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Interval {
    lo: Dyadic,
    hi: Dyadic,
}

impl Interval {
    /// The smallest interval that contains both numbers, in either order.
    pub fn hull(a: Dyadic, b: Dyadic) -> Self {
        if a <= b { Self { lo: a, hi: b } } else { Self { lo: b, hi: a } }
    }

    /// The interval [value, value].
    pub fn point(value: Dyadic) -> Self {
        Self { lo: value.clone(), hi: value }
    }

    /// The interval [value, value].
    pub fn integer(value: i64) -> Self {
        Self::point(Dyadic::new(BigInt::from(value), 0))
    }

    /// The interval [-radius, radius]; the sign of `radius` does not matter.
    pub fn symmetric(radius: &Dyadic) -> Self {
        let radius = radius.abs();
        Self { lo: radius.neg(), hi: radius }
    }

    /// Encloses a rational number.
    pub fn rational(value: &Rational, bits: u32) -> Self {
        let end = |direction| Dyadic::quotient(value.numer(), value.denom(), bits, direction);
        if value.denom().is_one() && value.numer().bits() <= u64::from(bits) {
            return Self::point(Dyadic::new(value.numer().clone(), 0));
        }
        Self { lo: end(Down), hi: end(Up) }
    }

    /// The lower end.
    pub fn lo(&self) -> &Dyadic {
        &self.lo
    }

    /// The upper end.
    pub fn hi(&self) -> &Dyadic {
        &self.hi
    }

    /// The sign that all members share: `Greater` all > 0, `Less` all < 0, `Equal` all = 0; `None`: not decided.
    pub fn certain_sign(&self) -> Option<Ordering> {
        match (self.lo.sign(), self.hi.sign()) {
            (Ordering::Greater, _) => Some(Ordering::Greater),
            (_, Ordering::Less) => Some(Ordering::Less),
            (Ordering::Equal, Ordering::Equal) => Some(Ordering::Equal),
            (Ordering::Less | Ordering::Equal, Ordering::Equal | Ordering::Greater) => None,
        }
    }

    /// Not below |x| for each member x, and attained.
    pub fn abs_hi(&self) -> Dyadic {
        self.lo.abs().max(self.hi.abs())
    }

    /// -x.
    pub fn neg(&self) -> Self {
        Self { lo: self.hi.neg(), hi: self.lo.neg() }
    }

    /// x * 2^shift, exactly.
    pub fn scale(&self, shift: i64) -> Self {
        Self { lo: self.lo.scale(shift), hi: self.hi.scale(shift) }
    }

    /// x + y.
    pub fn add(&self, other: &Self, bits: u32) -> Self {
        // SOUND(lo,hi): + is increasing in both operands: lower ends give the least sum, rounded down, upper
        // ends the greatest, rounded up.
        Self { lo: self.lo.add(&other.lo, bits, Down), hi: self.hi.add(&other.hi, bits, Up) }
    }

    /// x - y.
    pub fn sub(&self, other: &Self, bits: u32) -> Self {
        self.add(&other.neg(), bits)
    }

    /// x y.
    pub fn mul(&self, other: &Self, bits: u32) -> Self {
        let (a, b, c, d) = (&self.lo, &self.hi, &other.lo, &other.hi);
        let nonneg = |x: &Dyadic| x.sign() != Ordering::Less;
        let nonpos = |x: &Dyadic| x.sign() != Ordering::Greater;
        let product = |(p, q): (&Dyadic, &Dyadic), (r, s): (&Dyadic, &Dyadic)| Self {
            lo: p.mul(q, bits, Down),
            hi: r.mul(s, bits, Up),
        };
        // SOUND(lo,hi): x y is affine in x and in y, so its extremes over the box are at corners; each arm
        // names the corner with the least product first (rounded down), then the greatest (rounded up).
        match (nonneg(a), nonpos(b), nonneg(c), nonpos(d)) {
            (true, _, true, _) => product((a, c), (b, d)),
            (true, _, false, true) => product((b, c), (a, d)),
            (true, _, false, false) => product((b, c), (b, d)),
            (false, true, true, _) => product((a, d), (b, c)),
            (false, true, false, true) => product((b, d), (a, c)),
            (false, true, false, false) => product((a, d), (a, c)),
            (false, false, true, _) => product((a, d), (b, d)),
            (false, false, false, true) => product((b, c), (a, c)),
            (false, false, false, false) => Self {
                lo: a.mul(d, bits, Down).min(b.mul(c, bits, Down)),
                hi: a.mul(c, bits, Up).max(b.mul(d, bits, Up)),
            },
        }
    }

    /// x^2: unlike `mul` of the interval with itself, never below 0.
    pub fn square(&self, bits: u32) -> Self {
        let (a, b) = (self.lo.abs(), self.hi.abs());
        let (small, large) = if a <= b { (a, b) } else { (b, a) };
        let lo = match self.certain_sign() {
            Some(_) => small.mul(&small, bits, Down),
            None => Dyadic::zero(),
        };
        Self { lo, hi: large.mul(&large, bits, Up) }
    }

    /// 1/x; `None` if 0 may be a member.
    pub fn recip(&self, bits: u32) -> Option<Self> {
        self.certain_sign().filter(|sign| *sign != Ordering::Equal)?;
        let one = Dyadic::power_of_two(0);
        // SOUND(lo,hi): 1/x is decreasing on an interval without 0 (checked above), so the lower end comes
        // from hi, rounded down, the upper end from lo, rounded up.
        Some(Self { lo: one.div(&self.hi, bits, Down), hi: one.div(&self.lo, bits, Up) })
    }

    /// x / divisor, for a positive integer divisor.
    pub fn div_integer(&self, divisor: u32, bits: u32) -> Self {
        let divisor = Dyadic::new(BigInt::from(divisor.max(1)), 0);
        // SOUND(lo,hi): x/k is increasing in x because k > 0.
        Self { lo: self.lo.div(&divisor, bits, Down), hi: self.hi.div(&divisor, bits, Up) }
    }

    /// x^exponent.
    pub fn power(&self, exponent: u32, bits: u32) -> Self {
        let mut result = Self::integer(1);
        for bit in (0..u32::BITS - exponent.leading_zeros()).rev() {
            result = result.square(bits);
            if exponent >> bit & 1 == 1 {
                result = result.mul(self, bits);
            }
        }
        result
    }

    /// Whether the two intervals have no number in common.
    pub fn is_disjoint(&self, other: &Self) -> bool {
        self.hi < other.lo || other.hi < self.lo
    }
}
