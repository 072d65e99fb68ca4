//! Lifting of a factorisation modulo p to one modulo a power of p.
//!
//! A binary tree of products: each node g h is lifted together with its Bezout pair s g + t h = 1, doubling the
//! exponent. Invariant: at each node, f = g h and s g + t h = 1 modulo the current modulus, h and g monic.
//! Source: von zur Gathen and Gerhard, Modern Computer Algebra, Algorithms 15.10 and 15.17 (from memory).

use super::modular_factor::ModularFactors;
use crate::integer_polynomial::IntegerPolynomial;
use crate::modular_polynomial as mp;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Signed, Zero};

/// Monic factors modulo `modulus`, with lead(f) * product = f modulo `modulus`.
pub(super) struct LiftedFactors {
    pub(super) modulus: BigInt,
    pub(super) factors: Vec<IntegerPolynomial>,
}

enum Tree {
    Leaf,
    Node {
        g: IntegerPolynomial,
        h: IntegerPolynomial,
        s: IntegerPolynomial,
        t: IntegerPolynomial,
        left: Box<Tree>,
        right: Box<Tree>,
    },
}

/// A bound B with |coefficient| < B for each integer polynomial that divides lead(f) f and has leading coefficient
/// lead(f).
fn factor_bound(f: &IntegerPolynomial) -> BigInt {
    // SOUND(hi): Mignotte: a factor of degree <= d with leading coefficient dividing lead has height <= 2^d |f|_2;
    // times lead for the scaling by lead(f). The square root is rounded up by + 1.
    let square: BigInt = f.coefficients().iter().map(|c| c * c).sum();
    ((square.sqrt() + 1u32) * f.leading().abs()) << f.degree()
}

/// The factors modulo p^k with p^k above twice the bound for rational factors times lead(f).
pub(super) fn lift(f: &IntegerPolynomial, modular: &ModularFactors) -> LiftedFactors {
    let target = factor_bound(f) * 2u32;
    let p = BigInt::from(modular.field.prime());
    let mut modulus = p.clone();
    let mut tree = build(modular, &modular.factors);
    while modulus <= target {
        modulus = &modulus * &modulus;
        let inverse = inverse_modulo(&f.leading(), &modulus);
        let monic = reduce(&f.scale(&inverse), &modulus);
        raise(&mut tree, &monic, &modulus);
    }
    let mut factors = Vec::new();
    let root = reduce(&f.scale(&inverse_modulo(&f.leading(), &modulus)), &modulus);
    collect(&tree, root, &mut factors);
    LiftedFactors { modulus, factors }
}

fn to_integers(modular: &ModularFactors, a: &[u64]) -> IntegerPolynomial {
    IntegerPolynomial::new(a.iter().map(|c| BigInt::from(modular.field.to_u64(*c))).collect())
}

/// The product tree of the factors, split into halves of similar degree.
fn build(modular: &ModularFactors, factors: &[mp::Residues]) -> Tree {
    if factors.len() < 2 {
        return Tree::Leaf;
    }
    let field = &modular.field;
    let (left, right) = factors.split_at(factors.len() / 2);
    let product = |part: &[mp::Residues]| part.iter().fold(vec![field.one()], |m, a| mp::mul(field, &m, a));
    let (g, h) = (product(left), product(right));
    let (s, t) = mp::bezout(field, &g, &h);
    Tree::Node {
        g: to_integers(modular, &g),
        h: to_integers(modular, &h),
        s: to_integers(modular, &s),
        t: to_integers(modular, &t),
        left: Box::new(build(modular, left)),
        right: Box::new(build(modular, right)),
    }
}

/// One step: from modulus m to m^2, for f known modulo m^2.
fn raise(tree: &mut Tree, f: &IntegerPolynomial, modulus: &BigInt) {
    let Tree::Node { g, h, s, t, left, right } = tree else { return };
    let error = reduce(&(f - &(&*g * &*h)), modulus);
    let (q, r) = div_rem_monic(&(&*s * &error), h, modulus);
    let new_g = reduce(&(&*g + &(&(&*t * &error) + &(&q * &*g))), modulus);
    let new_h = reduce(&(&*h + &r), modulus);
    let b = reduce(&(&(&(&*s * &new_g) + &(&*t * &new_h)) - &IntegerPolynomial::one()), modulus);
    let (c, d) = div_rem_monic(&(&*s * &b), &new_h, modulus);
    let new_s = reduce(&(&*s - &d), modulus);
    let new_t = reduce(&(&*t - &(&(&*t * &b) + &(&c * &new_g))), modulus);
    raise(left, &new_g, modulus);
    raise(right, &new_h, modulus);
    (*g, *h, *s, *t) = (new_g, new_h, new_s, new_t);
}

fn collect(tree: &Tree, own: IntegerPolynomial, factors: &mut Vec<IntegerPolynomial>) {
    match tree {
        Tree::Leaf => factors.push(own),
        Tree::Node { g, h, left, right, .. } => {
            collect(left, g.clone(), factors);
            collect(right, h.clone(), factors);
        }
    }
}

/// The representative of least absolute value of each coefficient.
pub(super) fn reduce(a: &IntegerPolynomial, modulus: &BigInt) -> IntegerPolynomial {
    IntegerPolynomial::new(a.coefficients().iter().map(|c| balanced(c, modulus)).collect())
}

/// The member of least absolute value of the class of c.
pub(super) fn balanced(c: &BigInt, modulus: &BigInt) -> BigInt {
    let r = c.mod_floor(modulus);
    if &r + &r > *modulus { r - modulus } else { r }
}

/// Quotient and remainder by a polynomial that is monic modulo m.
fn div_rem_monic(
    a: &IntegerPolynomial,
    b: &IntegerPolynomial,
    modulus: &BigInt,
) -> (IntegerPolynomial, IntegerPolynomial) {
    let mut rest = reduce(a, modulus).coefficients().to_vec();
    let degree = b.degree();
    let mut quotient = vec![BigInt::zero(); rest.len().saturating_sub(degree)];
    for k in (0..quotient.len()).rev() {
        let q = balanced(&std::mem::take(&mut rest[k + degree]), modulus);
        for (slot, c) in rest[k..].iter_mut().zip(&b.coefficients()[..degree]) {
            *slot -= &q * c;
        }
        quotient[k] = q;
    }
    rest.truncate(degree);
    (IntegerPolynomial::new(quotient), reduce(&IntegerPolynomial::new(rest), modulus))
}

/// 1/a modulo m, for coprime a and m.
fn inverse_modulo(a: &BigInt, modulus: &BigInt) -> BigInt {
    if a.is_one() {
        return BigInt::one();
    }
    a.mod_floor(modulus).extended_gcd(modulus).x.mod_floor(modulus)
}
