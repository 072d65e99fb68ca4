//! Rectangles in the complex plane, and the exponential function on them.
//!
//! exp(z) is evaluated as (exp(z / 2^s))^(2^s): the inner value by its Taylor polynomial with a proven remainder,
//! then s squarings. The same function gives exp, cos and sin of real arguments; no value of pi is needed.
//! Source: any text on elementary functions, e.g. Muller, Elementary Functions, 3rd ed., ch. 4 and 6 (from memory).

use super::dyadic::Direction::Up;
use super::{Dyadic, Interval};

/// The set of complex numbers whose real and imaginary parts lie in two intervals.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Complex {
    /// Contains the real part.
    pub re: Interval,
    /// Contains the imaginary part.
    pub im: Interval,
}

/// Arguments of modulus 2^40 and more are refused by [`Complex::exp`].
pub(super) const EXP_ARGUMENT_TOP: i64 = 40;

/// |z / 2^s| < 2^-REDUCTION in [`Complex::exp`]; any value >= 1 is sound, 6 was the fastest at 64 to 128 bits.
const REDUCTION: i64 = 6;

impl Complex {
    /// The number 0.
    pub fn zero() -> Self {
        Self::real(Interval::integer(0))
    }

    /// The number 1.
    pub fn one() -> Self {
        Self::real(Interval::integer(1))
    }

    /// Real numbers.
    pub fn real(re: Interval) -> Self {
        Self { re, im: Interval::integer(0) }
    }

    /// Not below |z| for each member z: |re| + |im|.
    pub fn abs_hi(&self, bits: u32) -> Dyadic {
        // SOUND(hi): |z| <= |re| + |im|; each term is an upper bound, the sum is rounded up.
        self.re.abs_hi().add(&self.im.abs_hi(), bits, Up)
    }

    /// The complex conjugate.
    pub fn conj(&self) -> Self {
        Self { re: self.re.clone(), im: self.im.neg() }
    }

    /// z + w.
    pub fn add(&self, other: &Self, bits: u32) -> Self {
        Self { re: self.re.add(&other.re, bits), im: self.im.add(&other.im, bits) }
    }

    /// z - w.
    pub fn sub(&self, other: &Self, bits: u32) -> Self {
        Self { re: self.re.sub(&other.re, bits), im: self.im.sub(&other.im, bits) }
    }

    /// z w.
    pub fn mul(&self, other: &Self, bits: u32) -> Self {
        Self {
            re: self.re.mul(&other.re, bits).sub(&self.im.mul(&other.im, bits), bits),
            im: self.re.mul(&other.im, bits).add(&self.im.mul(&other.re, bits), bits),
        }
    }

    /// x z for real x.
    pub fn mul_real(&self, factor: &Interval, bits: u32) -> Self {
        Self { re: self.re.mul(factor, bits), im: self.im.mul(factor, bits) }
    }

    /// z^2.
    pub fn square(&self, bits: u32) -> Self {
        Self { re: self.re.square(bits).sub(&self.im.square(bits), bits), im: self.re.mul(&self.im, bits).scale(1) }
    }

    /// |z|^2.
    pub fn abs_squared(&self, bits: u32) -> Interval {
        self.re.square(bits).add(&self.im.square(bits), bits)
    }

    /// 1/z; `None` if 0 may be a member.
    pub fn recip(&self, bits: u32) -> Option<Self> {
        // conj(z) / |z|^2
        Some(self.conj().mul_real(&self.abs_squared(bits).recip(bits)?, bits))
    }

    /// z / divisor, for a positive integer divisor.
    pub fn div_integer(&self, divisor: u32, bits: u32) -> Self {
        Self { re: self.re.div_integer(divisor, bits), im: self.im.div_integer(divisor, bits) }
    }

    /// exp(z); `None` if |z| may reach 2^40.
    pub fn exp(&self, bits: u32) -> Option<Self> {
        let top = self.abs_hi(bits).top();
        if top > EXP_ARGUMENT_TOP {
            return None;
        }
        // |z| < 2^top, so |w| < 2^-REDUCTION for w = z / 2^halvings. Each squaring can double the relative
        // width, and turn the rectangle: two guard bits each.
        let halvings = u32::try_from(top.saturating_add(REDUCTION)).unwrap_or(0);
        let work = bits + 2 * halvings + 16;
        let w = Self { re: self.re.scale(-i64::from(halvings)), im: self.im.scale(-i64::from(halvings)) };
        let (terms, remainder) = exp_terms(&w.abs_hi(work), work);
        let mut sum = Self::one();
        for k in (1..terms).rev() {
            sum = Self::one().add(&sum.mul(&w, work).div_integer(k, work), work);
        }
        let slack = Interval::symmetric(&remainder);
        sum = Self { re: sum.re.add(&slack, work), im: sum.im.add(&slack, work) };
        for _ in 0..halvings {
            sum = sum.square(work);
        }
        let one = Interval::integer(1);
        Some(sum.mul_real(&one, bits))
    }
}

/// A number n of terms, and a bound of |sum over k >= n of w^k / k!| for all |w| <= modulus < 1/2.
fn exp_terms(modulus: &Dyadic, bits: u32) -> (u32, Dyadic) {
    let mut terms = 1;
    let mut term = modulus.clone();
    // SOUND(hi): `term` is modulus^n / n!, rounded up at each step (both factors are >= 0). The tail is at most
    // term * (1 + 1/2 + 1/4 + ...) = 2 term, because each further ratio is modulus / (k + 1) < 1/2.
    // The loop ends: each round takes at least REDUCTION bits off, or the term is 0.
    while terms < bits && term.top() > -i64::from(bits) {
        terms += 1;
        let ratio = modulus.div(&Dyadic::new(terms.into(), 0), bits, Up);
        term = term.mul(&ratio, bits, Up);
    }
    (terms, term.scale(1))
}
