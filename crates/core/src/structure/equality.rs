//! Proofs that two algebraic numbers are equal.
//!
//! *Reflection*: if f(2a - z) = +-f(z) and the mirror image {2a - conj z} of a root's disc meets no other disc of f,
//! the root has real part exactly a, since 2a - conj lambda is a root of f in the mirrored disc. *Common polynomial*:
//! if Q vanishes at alpha and at beta and Q has exactly one root in a disc that contains both, then alpha = beta; one
//! root is proved by Rouche's theorem: |q_1| r > |q_0| + sum_(k>=2) |q_k| r^k for the Taylor coefficients q_k of Q at
//! the centre.

use crate::ToRational;
use crate::integer_polynomial::IntegerPolynomial;
use crate::root::{RootDisc, enclose_roots};
use keepout_checker::number::{Complex, Direction, Dyadic, Interval, Rational};
use num_traits::{One, Signed, Zero};
use std::cmp::Ordering;

/// Whether the root of f in the disc is proved to have real part exactly `a`. `bits` are those of the disc.
pub(super) fn has_real_part(f: &IntegerPolynomial, disc: &RootDisc, a: &Rational, bits: u32) -> bool {
    if disc.is_real() {
        return f.value_rational(a).is_zero() && contains(&disc.enclose_re(), a);
    }
    let common = f.gcd(&f.reflected(&(a + a)));
    if common.is_constant() {
        return false;
    }
    // `common` is symmetric about a; the root is one of its roots if exactly one of its discs meets ours
    // and the cofactor does not vanish on ours.
    let Ok(discs) = enclose_roots(&common, bits) else { return false };
    let near: Vec<&RootDisc> = discs.iter().filter(|d| !apart(d, disc)).collect();
    let [own] = near[..] else { return false };
    if let Some(cofactor) = f.divide_exact(&common)
        && !cofactor.is_constant()
        && may_vanish(&cofactor, &disc.enclose(), bits)
    {
        return false;
    }
    // SOUND: the mirror image of our root lies in the mirror of `own`; if that meets no other disc of `common`, it is
    // our root.
    let bits = bits + 64;
    let twice = Interval::rational(&(a + a), bits);
    let mirrored = Complex { re: twice.sub(&own.enclose_re(), bits), im: own.enclose_im() };
    discs.iter().all(|d| std::ptr::eq(d, own) || rectangles_apart(&d.enclose(), &mirrored))
}

/// Whether a rational number is a member of an interval.
pub(super) fn contains(interval: &Interval, value: &Rational) -> bool {
    let inside = |lo: &Dyadic, hi: &Dyadic| Some(lo.to_rational()? <= *value && *value <= hi.to_rational()?);
    inside(interval.lo(), interval.hi()).unwrap_or(false)
}

fn apart(a: &RootDisc, b: &RootDisc) -> bool {
    rectangles_apart(&a.enclose(), &b.enclose())
}

fn rectangles_apart(a: &Complex, b: &Complex) -> bool {
    a.re.is_disjoint(&b.re) || a.im.is_disjoint(&b.im)
}

/// Whether the root of f in the disc is a root of the divisor g of f (f square-free); `None` if the disc is too coarse
/// to tell.
pub(crate) fn vanishes_at(f: &IntegerPolynomial, g: &IntegerPolynomial, disc: &RootDisc, bits: u32) -> Option<bool> {
    if g.is_constant() {
        return Some(false);
    }
    let cofactor = f.divide_exact(g)?;
    if cofactor.is_constant() {
        return Some(true);
    }
    // The root is a root of exactly one of the two.
    let at = disc.enclose();
    match (may_vanish(g, &at, bits), may_vanish(&cofactor, &at, bits)) {
        (false, _) => Some(false),
        (true, false) => Some(true),
        (true, true) => None,
    }
}

/// Whether enclosures leave it open that p vanishes somewhere on the rectangle.
pub(super) fn may_vanish(p: &IntegerPolynomial, at: &Complex, bits: u32) -> bool {
    let bits = bits + 64;
    let real = |c| Complex::real(Interval::rational(&Rational::from_integer(c), bits));
    let value = p.coefficients().iter().rev().fold(Complex::zero(), |v, c| v.mul(at, bits).add(&real(c.clone()), bits));
    value.re.certain_sign().is_none_or(|s| s == Ordering::Equal)
        && value.im.certain_sign().is_none_or(|s| s == Ordering::Equal)
}

/// Whether Q is proved to have exactly one root (with multiplicity) in some disc that contains both rectangles.
pub(super) fn one_root_near(q: &IntegerPolynomial, a: &Complex, b: &Complex, bits: u32) -> bool {
    let work = bits + 64;
    let hull = |x: &Interval, y: &Interval| Interval::hull(x.lo().min(y.lo()).clone(), x.hi().max(y.hi()).clone());
    let (re, im) = (hull(&a.re, &b.re), hull(&a.im, &b.im));
    let middle = |x: &Interval| x.lo().add(x.hi(), work, Direction::Down).scale(-1);
    let (x, y) = (middle(&re), middle(&im));
    let centre = Complex { re: Interval::point(x), im: Interval::point(y) };
    let offset = Complex { re: re.sub(&centre.re, work), im: im.sub(&centre.im, work) };
    // SOUND(hi): abs_hi bounds the modulus of every member's distance from the centre; the disc is taken four times as
    // large.
    let radius = offset.abs_hi(work).scale(2).max(Dyadic::power_of_two(-i64::from(bits)));
    let taylor = taylor_at(q, &centre, work + 4 * q.degree() as u32);
    let mut others = Dyadic::zero();
    let mut power = Dyadic::power_of_two(0);
    let mut linear = Dyadic::zero();
    for (k, c) in taylor.iter().enumerate() {
        if k == 1 {
            // SOUND(lo): |c|^2 rounded down, times r^2, compared below as squares.
            linear = c.abs_squared(work).lo().clone();
        } else {
            others = others.add(&c.abs_hi(work).mul(&power, work, Direction::Up), work, Direction::Up);
        }
        power = power.mul(&radius, work, Direction::Up);
    }
    // SOUND(lo): the left side needs r rounded down; r is exact, so only the products are rounded.
    let left = linear.mul(&radius, work, Direction::Down).mul(&radius, work, Direction::Down);
    let right = others.mul(&others, work, Direction::Up);
    left > right
}

/// Encloses all Taylor coefficients at a point.
fn taylor_at(q: &IntegerPolynomial, at: &Complex, bits: u32) -> Vec<Complex> {
    let enclose = |c: &num_bigint::BigInt| Complex::real(Interval::rational(&Rational::from_integer(c.clone()), bits));
    let mut row: Vec<Complex> = q.coefficients().iter().map(enclose).collect();
    for done in 0..row.len() {
        let mut carry = Complex::zero();
        for slot in row.iter_mut().skip(done).rev() {
            carry = slot.add(&carry.mul(at, bits), bits);
            *slot = carry.clone();
        }
    }
    row
}

/// The rational number with the least denominator in an interval; `None` if an end is not representable.
pub(super) fn simplest_rational(interval: &Interval) -> Option<Rational> {
    let (lo, hi) = (interval.lo().to_rational()?, interval.hi().to_rational()?);
    if !lo.is_positive() && !hi.is_negative() {
        return Some(Rational::zero());
    }
    if hi.is_negative() {
        return Some(-simplest_positive(-hi, -lo));
    }
    Some(simplest_positive(lo, hi))
}

/// For 0 < lo <= hi, by continued fractions.
fn simplest_positive(lo: Rational, hi: Rational) -> Rational {
    let ceiling = lo.ceil();
    if ceiling <= hi {
        return ceiling;
    }
    let whole = lo.floor();
    let rest = simplest_positive((hi - &whole).recip(), (lo - &whole).recip());
    whole + Rational::one() / rest
}
