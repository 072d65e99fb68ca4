//! All complex roots of a square-free integer polynomial, in proven disjoint discs.
//!
//! For distinct points z_1..z_d put W_i = q(z_i) / (lead prod_(j != i) (z_i - z_j)). All roots lie in the union of the
//! discs
//! |z - z_i| <= d |W_i|, and a disc disjoint from the others holds exactly one. The points are refined by z_i - W_i
//! (Weierstrass) with more and more bits; every sweep evaluates the same W_i that prove the discs. Real roots have
//! exactly real centres, the others come in exactly conjugate pairs: a disc centred on the axis and isolated holds a
//! real root, because q is real. Floating-point numbers propose start points and step directions only.
//! Source: Smith, J. ACM 17 (1970) 661-674; Boersch-Supan, Numer. Math. 5 (1963) 380-398.

pub(crate) mod approx;
mod evaluation;
pub(crate) mod magnitude;
mod refinement;

use crate::error::CoreError;
use crate::integer_polynomial::IntegerPolynomial;
use keepout_checker::number::{Complex, Direction, Dyadic, Interval, Rational};
use num_traits::{One, Zero};
use std::cmp::Ordering;

/// Requests for more bits than this are refused.
pub const BITS_LIMIT: u32 = 1 << 20;

/// A disc of the complex plane that holds exactly one root of the polynomial it was made for.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RootDisc {
    /// Real part of the centre.
    pub re: Dyadic,
    /// Imaginary part of the centre; exactly 0 if and only if the root is real.
    pub im: Dyadic,
    /// The radius; 0 means that the centre is the root.
    pub radius: Dyadic,
}

impl RootDisc {
    /// Whether the root is real.
    pub fn is_real(&self) -> bool {
        self.im.sign() == Ordering::Equal
    }

    /// Encloses the real part of the root.
    pub fn enclose_re(&self) -> Interval {
        around(&self.re, &self.radius)
    }

    /// Encloses the imaginary part of the root: exactly [0, 0] for a real root.
    pub fn enclose_im(&self) -> Interval {
        if self.is_real() { Interval::integer(0) } else { around(&self.im, &self.radius) }
    }

    /// Encloses the root in a rectangle.
    pub fn enclose(&self) -> Complex {
        Complex { re: self.enclose_re(), im: self.enclose_im() }
    }

    /// The disc of the conjugate root.
    pub fn conjugate(&self) -> Self {
        Self { re: self.re.clone(), im: self.im.neg(), radius: self.radius.clone() }
    }
}

/// The exact ends centre - radius and centre + radius.
fn around(centre: &Dyadic, radius: &Dyadic) -> Interval {
    let floor = centre.exponent().min(radius.exponent());
    let lift = |d: &Dyadic| d.mantissa() << d.exponent().abs_diff(floor);
    let (c, r) = (lift(centre), lift(radius));
    Interval::hull(Dyadic::new(&c - &r, floor), Dyadic::new(c + r, floor))
}

/// Disjoint discs, one for each complex root of a square-free polynomial.
///
/// Order: by real part of the centre, then imaginary part; conjugates are exact mirror images.
///
/// # Guarantee
/// Each disc holds exactly one root and the discs are pairwise disjoint. `radius <= 2^-bits |centre|` for each root
/// but 0, which is exact.
///
/// # Errors
/// [`CoreError::ConstantPolynomial`], [`CoreError::NotSquareFree`], [`CoreError::LimitExceeded`] for more than
/// [`BITS_LIMIT`] bits or if the refinement does not separate the roots within its limits.
///
/// # Cost
/// O(d^2) products of numbers of about `bits` + (condition) bits for each doubling of the accuracy.
///
/// ```
/// use keepout_core::{IntegerPolynomial, enclose_roots};
/// let roots = enclose_roots(&IntegerPolynomial::from_small(&[-2, 0, 0, 1]), 100)?; // z^3 - 2
/// assert_eq!(roots.iter().filter(|r| r.is_real()).count(), 1);
/// # Ok::<(), keepout_core::CoreError>(())
/// ```
pub fn enclose_roots(polynomial: &IntegerPolynomial, bits: u32) -> Result<Vec<RootDisc>, CoreError> {
    if polynomial.is_constant() {
        return Err(CoreError::ConstantPolynomial);
    }
    if bits > BITS_LIMIT {
        return Err(CoreError::LimitExceeded { what: "bits of a root", limit: BITS_LIMIT.into() });
    }
    let primitive = polynomial.primitive_part();
    if !primitive.is_square_free() {
        return Err(CoreError::NotSquareFree);
    }
    let mut discs = Vec::with_capacity(primitive.degree());
    let mut q = primitive;
    if q.coefficient(0).is_zero() {
        discs.push(RootDisc { re: Dyadic::zero(), im: Dyadic::zero(), radius: Dyadic::zero() });
        q = IntegerPolynomial::new(q.coefficients()[1..].to_vec());
    }
    if q.degree() == 1 {
        discs.push(linear_root(&q, bits));
    } else if q.degree() > 1 {
        discs.extend(refinement::isolate(&q, bits)?);
    }
    // The exact root 0 is in no other disc: each radius is below the modulus of its centre.
    discs.sort_by(|a, b| a.re.cmp(&b.re).then_with(|| a.im.cmp(&b.im)));
    Ok(discs)
}

/// The root of a linear polynomial: one rounded quotient, or an integer exactly.
fn linear_root(q: &IntegerPolynomial, bits: u32) -> RootDisc {
    let root = Rational::new(-q.coefficient(0), q.coefficient(1));
    if root.denom().is_one() {
        return RootDisc { re: Dyadic::new(root.numer().clone(), 0), im: Dyadic::zero(), radius: Dyadic::zero() };
    }
    let centre = Dyadic::quotient(root.numer(), root.denom(), bits + 3, Direction::Down);
    // SOUND(hi): rounded to bits + 3 bits, so in error by at most 2^(top - bits - 3) where |centre| < 2^top.
    let radius = Dyadic::power_of_two(centre.top() - i64::from(bits) - 2);
    RootDisc { re: centre, im: Dyadic::zero(), radius }
}
