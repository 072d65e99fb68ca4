//! Dense univariate polynomials over a prime field, as slices of residues in ascending order.
//!
//! A polynomial is a `Vec<u64>` of residues in the Montgomery form of its [`Field`], trimmed: the last entry is
//! not 0, the zero polynomial is empty. The field is passed along, never stored. Schoolbook products: degrees here are
//! at most some hundreds.

use crate::modular::Field;

pub(crate) type Residues = Vec<u64>;

pub(crate) fn trim(mut a: Residues) -> Residues {
    while a.last() == Some(&0) {
        a.pop();
    }
    a
}

pub(crate) fn sub(f: &Field, a: &[u64], b: &[u64]) -> Residues {
    let length = a.len().max(b.len());
    let at = |s: &[u64], i: usize| s.get(i).copied().unwrap_or(0);
    trim((0..length).map(|i| f.sub(at(a, i), at(b, i))).collect())
}

pub(crate) fn mul(f: &Field, a: &[u64], b: &[u64]) -> Residues {
    if a.is_empty() || b.is_empty() {
        return Vec::new();
    }
    let mut product = vec![0; a.len() + b.len() - 1];
    for (i, x) in a.iter().enumerate() {
        for (slot, y) in product[i..].iter_mut().zip(b) {
            *slot = f.add(*slot, f.mul(*x, *y));
        }
    }
    trim(product)
}

pub(crate) fn scale(f: &Field, a: &[u64], c: u64) -> Residues {
    trim(a.iter().map(|x| f.mul(*x, c)).collect())
}

/// Quotient and remainder; b is not 0.
pub(crate) fn div_rem(f: &Field, a: &[u64], b: &[u64]) -> (Residues, Residues) {
    if a.len() < b.len() {
        return (Vec::new(), a.to_vec());
    }
    let inverse = b.last().map_or(0, |lead| f.inverse(*lead));
    let mut rest = a.to_vec();
    let mut quotient = vec![0; a.len() - b.len() + 1];
    for k in (0..quotient.len()).rev() {
        let q = f.mul(rest[k + b.len() - 1], inverse);
        quotient[k] = q;
        if q != 0 {
            for (slot, y) in rest[k..].iter_mut().zip(b) {
                *slot = f.sub(*slot, f.mul(q, *y));
            }
        }
    }
    rest.truncate(b.len() - 1);
    (trim(quotient), trim(rest))
}

pub(crate) fn rem(f: &Field, a: &[u64], b: &[u64]) -> Residues {
    div_rem(f, a, b).1
}

pub(crate) fn monic(f: &Field, a: &[u64]) -> Residues {
    match a.last() {
        Some(lead) if *lead != f.one() => scale(f, a, f.inverse(*lead)),
        _ => a.to_vec(),
    }
}

/// The monic greatest common divisor.
pub(crate) fn gcd(f: &Field, a: &[u64], b: &[u64]) -> Residues {
    let (mut a, mut b) = (a.to_vec(), b.to_vec());
    while !b.is_empty() {
        let r = rem(f, &a, &b);
        a = std::mem::replace(&mut b, r);
    }
    monic(f, &a)
}

/// (s, t) with s a + t b = 1, deg s < deg b, deg t < deg a; a and b are coprime and not constant.
pub(crate) fn bezout(f: &Field, a: &[u64], b: &[u64]) -> (Residues, Residues) {
    let (mut r0, mut r1) = (a.to_vec(), b.to_vec());
    let (mut s0, mut s1) = (vec![f.one()], Vec::new());
    let (mut t0, mut t1) = (Vec::new(), vec![f.one()]);
    while !r1.is_empty() {
        let (q, r) = div_rem(f, &r0, &r1);
        let s = sub(f, &s0, &mul(f, &q, &s1));
        let t = sub(f, &t0, &mul(f, &q, &t1));
        r0 = std::mem::replace(&mut r1, r);
        s0 = std::mem::replace(&mut s1, s);
        t0 = std::mem::replace(&mut t1, t);
    }
    let c = r0.last().map_or(0, |lead| f.inverse(*lead));
    (scale(f, &s0, c), scale(f, &t0, c))
}

pub(crate) fn derivative(f: &Field, a: &[u64]) -> Residues {
    trim(a.iter().enumerate().skip(1).map(|(k, c)| f.mul(*c, f.residue(k as u64))).collect())
}

/// base^exponent modulo `modulus`, exponent given by its bits from the top.
pub(crate) fn pow_mod(f: &Field, base: &[u64], exponent_bits: &[bool], modulus: &[u64]) -> Residues {
    let mut result = rem(f, &[f.one()], modulus);
    for bit in exponent_bits {
        result = rem(f, &mul(f, &result, &result), modulus);
        if *bit {
            result = rem(f, &mul(f, &result, base), modulus);
        }
    }
    result
}

/// The bits of a number, highest first.
pub(crate) fn bits_of(value: &num_bigint::BigUint) -> Vec<bool> {
    (0..value.bits()).rev().map(|k| value.bit(k)).collect()
}
