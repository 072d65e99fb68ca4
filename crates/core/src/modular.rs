//! Arithmetic modulo word-size primes, and the way back to the integers.
//!
//! Residues are kept in Montgomery form a R mod p with R = 2^64, p odd and below 2^62. Results modulo several primes
//! are joined by balanced mixed-radix digits: x = d_0 + d_1 p_0 + d_2 p_0 p_1 + ..., |d_i| < p_i / 2, which is unique
//! for |x| < (p_0 p_1 ... - 1)/2; so x has been reached when further digits are 0.
//! Invariant: every residue handed to [`Field`] is below p. Nothing here is exact by itself: the callers carry
//! a proven bound, or verify the lifted result.
//! Source: Montgomery, Math. Comp. 44 (1985) 519-521; Knuth, TAOCP 2, 4.3.2 (from memory).

use num_bigint::{BigInt, Sign};
use num_traits::{ToPrimitive, Zero};
use std::sync::Mutex;

/// The field of p elements.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Field {
    p: u64,
    /// -1/p modulo 2^64.
    negative_inverse: u64,
    /// 2^128 modulo p.
    square: u64,
    one: u64,
}

impl Field {
    /// The field of `p` elements; p is an odd prime below 2^62.
    pub(crate) fn new(p: u64) -> Self {
        let mut inverse: u64 = 1;
        for _ in 0..6 {
            inverse = inverse.wrapping_mul(2u64.wrapping_sub(p.wrapping_mul(inverse)));
        }
        let one = ((1u128 << 64) % u128::from(p)) as u64;
        let square = (u128::from(one) * u128::from(one) % u128::from(p)) as u64;
        Self { p, negative_inverse: inverse.wrapping_neg(), square, one }
    }

    pub(crate) fn prime(&self) -> u64 {
        self.p
    }

    pub(crate) fn one(&self) -> u64 {
        self.one
    }

    #[inline(always)]
    pub(crate) fn add(&self, a: u64, b: u64) -> u64 {
        let sum = a + b;
        if sum >= self.p { sum - self.p } else { sum }
    }

    #[inline(always)]
    pub(crate) fn sub(&self, a: u64, b: u64) -> u64 {
        if a >= b { a - b } else { a + self.p - b }
    }

    #[inline(always)]
    pub(crate) fn neg(&self, a: u64) -> u64 {
        if a == 0 { 0 } else { self.p - a }
    }

    #[inline(always)]
    pub(crate) fn mul(&self, a: u64, b: u64) -> u64 {
        self.reduce(u128::from(a) * u128::from(b))
    }

    /// sum a_k b_k.
    #[inline]
    pub(crate) fn dot(&self, a: &[u64], b: &[u64]) -> u64 {
        let top = u128::from(self.p) << 64;
        let mut sum = 0u128;
        for (x, y) in a.iter().zip(b) {
            // sum < 2^126 and the product < 2^124: no overflow.
            sum += u128::from(*x) * u128::from(*y);
            if sum >= top {
                sum -= top;
            }
        }
        self.reduce(sum)
    }

    /// t / 2^64 modulo p, for t < 2^64 p.
    #[inline(always)]
    fn reduce(&self, t: u128) -> u64 {
        let m = (t as u64).wrapping_mul(self.negative_inverse);
        let u = ((t + u128::from(m) * u128::from(self.p)) >> 64) as u64;
        if u >= self.p { u - self.p } else { u }
    }

    pub(crate) fn pow(&self, base: u64, mut exponent: u64) -> u64 {
        let (mut result, mut square) = (self.one, base);
        while exponent > 0 {
            if exponent & 1 == 1 {
                result = self.mul(result, square);
            }
            square = self.mul(square, square);
            exponent >>= 1;
        }
        result
    }

    /// 1/a; 0 for a = 0.
    pub(crate) fn inverse(&self, a: u64) -> u64 {
        self.pow(a, self.p - 2)
    }

    pub(crate) fn residue(&self, value: u64) -> u64 {
        self.mul(value % self.p, self.square)
    }

    /// The residue of an integer.
    pub(crate) fn residue_of(&self, value: &BigInt) -> u64 {
        let magnitude = value.magnitude();
        let residue = match magnitude.to_u64() {
            Some(small) => self.residue(small),
            None => {
                // Horner in 2^64: multiplying by square = R^2 in Montgomery form multiplies by R.
                let mut sum = 0;
                for digit in magnitude.iter_u64_digits().rev() {
                    sum = self.add(self.mul(sum, self.square), digit % self.p);
                }
                self.mul(sum, self.square)
            }
        };
        if value.sign() == Sign::Minus { self.neg(residue) } else { residue }
    }

    /// The least non-negative member of the class.
    pub(crate) fn to_u64(self, a: u64) -> u64 {
        self.reduce(u128::from(a))
    }

    /// The member of least absolute value.
    fn balanced(&self, a: u64) -> i64 {
        let value = self.to_u64(a);
        if value > self.p / 2 { -((self.p - value) as i64) } else { value as i64 }
    }
}

fn is_prime(n: u64) -> bool {
    const BASES: [u64; 12] = [2, 3, 5, 7, 11, 13, 17, 19, 23, 29, 31, 37];
    if n < 2 {
        return false;
    }
    for b in BASES {
        if n.is_multiple_of(b) {
            return n == b;
        }
    }
    // Miller-Rabin with these bases is a proof below 3.3e24 (Sorenson and Webster, Math. Comp. 86 (2017)).
    let field = Field::new(n);
    let (twos, odd) = ((n - 1).trailing_zeros(), (n - 1) >> (n - 1).trailing_zeros());
    let minus_one = field.neg(field.one());
    BASES.iter().all(|&b| {
        let mut x = field.pow(field.residue(b), odd);
        if x == field.one() || x == minus_one {
            return true;
        }
        for _ in 1..twos {
            x = field.mul(x, x);
            if x == minus_one {
                return true;
            }
        }
        false
    })
}

static LARGE_PRIMES: Mutex<Vec<u64>> = Mutex::new(Vec::new());

/// The field of the `index`-th prime below 2^62, counted downwards.
pub(crate) fn large_field(index: usize) -> Field {
    let mut primes = match LARGE_PRIMES.lock() {
        Ok(guard) => guard,
        Err(poisoned) => poisoned.into_inner(),
    };
    while primes.len() <= index {
        let mut candidate = primes.last().map_or((1u64 << 62) - 1, |last| last - 2);
        while !is_prime(candidate) {
            candidate -= 2;
        }
        primes.push(candidate);
    }
    Field::new(primes[index])
}

/// The odd primes from `start` upwards.
pub(crate) fn small_primes(start: u64) -> impl Iterator<Item = u64> {
    (start.max(3)..).filter(|n| n % 2 == 1 && is_prime(*n))
}

/// A vector of integers known modulo a growing product of primes.
#[derive(Clone, Debug, Default)]
pub(crate) struct Reconstruction {
    fields: Vec<Field>,
    /// `digits[i][k]`: balanced digit of entry k for prime i.
    digits: Vec<Vec<i64>>,
}

impl Reconstruction {
    /// Adds the residues (Montgomery form) for one more prime; whether every new digit is 0.
    pub(crate) fn push(&mut self, field: Field, residues: &[u64]) -> bool {
        let signed = |d: i64| {
            let r = field.residue(d.unsigned_abs());
            if d < 0 { field.neg(r) } else { r }
        };
        let primes: Vec<u64> = self.fields.iter().map(|f| field.residue(f.prime())).collect();
        let product = primes.iter().fold(field.one(), |m, p| field.mul(m, *p));
        let inverse = field.inverse(product);
        let mut row = Vec::with_capacity(residues.len());
        for (k, residue) in residues.iter().enumerate() {
            // The value of the digits so far, by Horner from the last digit.
            let mut known = 0;
            for (digits, p) in self.digits.iter().zip(&primes).rev() {
                known = field.add(field.mul(known, *p), signed(digits[k]));
            }
            row.push(field.balanced(field.mul(field.sub(*residue, known), inverse)));
        }
        let stable = !self.fields.is_empty() && row.iter().all(|d| *d == 0);
        self.fields.push(field);
        self.digits.push(row);
        stable
    }

    /// The integers of least absolute value with the residues given.
    pub(crate) fn values(&self) -> Vec<BigInt> {
        let length = self.digits.first().map_or(0, Vec::len);
        (0..length)
            .map(|k| {
                let mut sum = BigInt::zero();
                for (digits, field) in self.digits.iter().zip(&self.fields).rev() {
                    sum = sum * field.prime() + digits[k];
                }
                sum
            })
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn residues_of_integers_agree_with_big_integer_remainders() {
        let field = large_field(0);
        let mut value = BigInt::from(-7);
        for k in 0..40u32 {
            value = value * BigInt::from(0x9e37_79b9_7f4a_7c15u64) + BigInt::from(k);
            let expected = num_integer::Integer::mod_floor(&value, &BigInt::from(field.prime()));
            assert_eq!(BigInt::from(field.to_u64(field.residue_of(&value))), expected);
        }
    }

    #[test]
    fn integers_come_back_from_their_residues() {
        let values: Vec<BigInt> =
            [-5i64, 0, 1 << 61, i64::MIN, i64::MAX].iter().map(|v| BigInt::from(*v).pow(3)).collect();
        let mut reconstruction = Reconstruction::default();
        for index in 0.. {
            let field = large_field(index);
            let residues: Vec<u64> = values.iter().map(|v| field.residue_of(v)).collect();
            if reconstruction.push(field, &residues) {
                break;
            }
        }
        assert_eq!(reconstruction.values(), values);
    }

    #[test]
    fn small_primes_are_the_known_ones() {
        assert_eq!(small_primes(3).take(10).collect::<Vec<_>>(), [3, 5, 7, 11, 13, 17, 19, 23, 29, 31]);
        assert!(!is_prime(3_215_031_751)); // strong pseudoprime to 2, 3, 5, 7
    }
}
