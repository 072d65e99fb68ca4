//! Square fixed-point matrices with a proven error in the row-sum norm.
//!
//! A ball stands for all matrices P with |P - value|_inf <= error, where value = (+-magnitudes) 2^-fraction. Entries
//! are sign and magnitude,
//! `limbs` words each. Products drop less than one unit 2^-fraction of each entry, that is less than n units in the
//! norm. Invariant: the true matrix is in the ball; every operation preserves it.

use super::limb;
use crate::root::magnitude::Magnitude;
use num_bigint::{BigInt, BigUint, Sign};
use num_traits::{One, Zero};
use std::cmp::Ordering;

/// A fixed-point matrix and the bound of its error.
#[derive(Clone, Debug)]
pub(super) struct Ball {
    n: usize,
    limbs: usize,
    fraction: u64,
    magnitudes: Vec<u64>,
    negative: Vec<bool>,
    /// Not below the row-sum norm of (true matrix - value).
    pub(super) error: Magnitude,
}

fn digits(value: &BigUint, limbs: usize) -> impl Iterator<Item = u64> {
    value.iter_u64_digits().chain(std::iter::repeat(0)).take(limbs)
}

impl Ball {
    /// entries[i] / (denominator 2^halvings) to `fraction` bits.
    pub(super) fn from_integers(
        n: usize,
        entries: &[BigInt],
        denominator: &BigInt,
        halvings: u64,
        fraction: u64,
    ) -> Self {
        // Truncated towards 0: less than one unit each.
        let scaled: Vec<BigInt> = entries
            .iter()
            .map(|e| {
                if fraction >= halvings {
                    (e << (fraction - halvings)) / denominator
                } else {
                    e / (denominator << (halvings - fraction))
                }
            })
            .collect();
        let exact = denominator.is_one() && fraction >= halvings;
        let limbs = scaled.iter().map(|e| e.bits().div_ceil(64) as usize).max().unwrap_or(0).max(1);
        let magnitudes = scaled.iter().flat_map(|e| digits(e.magnitude(), limbs).collect::<Vec<_>>()).collect();
        let negative = scaled.iter().map(|e| e.sign() == Sign::Minus).collect();
        let error = if exact { Magnitude::zero() } else { Self::units(n, fraction) };
        Self { n, limbs, fraction, magnitudes, negative, error }
    }

    /// n units of 2^-fraction.
    fn units(n: usize, fraction: u64) -> Magnitude {
        Magnitude::exact(n as u32, -(fraction as i64))
    }

    fn magnitude(&self, i: usize, j: usize) -> &[u64] {
        let k = (i * self.n + j) * self.limbs;
        &self.magnitudes[k..k + self.limbs]
    }

    /// The entry (i, j) of the value, times 2^fraction.
    pub(super) fn entry(&self, i: usize, j: usize) -> BigInt {
        let words = self.magnitude(i, j).iter().flat_map(|w| [*w as u32, (*w >> 32) as u32]);
        let magnitude = BigUint::new(words.collect());
        let sign = if self.negative[i * self.n + j] { Sign::Minus } else { Sign::Plus };
        BigInt::from_biguint(if magnitude.is_zero() { Sign::NoSign } else { sign }, magnitude)
    }

    /// An upper bound of one entry's modulus, from its two highest words.
    fn entry_hi(&self, i: usize, j: usize) -> Magnitude {
        let words = self.magnitude(i, j);
        let count = limb::significant(words);
        let unit = -(self.fraction as i64);
        if count == 0 {
            return Magnitude::zero();
        }
        let low = count.saturating_sub(2);
        let top = words[low..count].iter().rev().fold(0u128, |v, w| v << 64 | u128::from(*w));
        // SOUND(hi): + 1 in the last kept place covers the words below.
        Magnitude::wide_hi(top.saturating_add(u128::from(low > 0)), unit + 64 * low as i64)
    }

    /// Not below the row-sum norm of the value.
    pub(super) fn norm_hi(&self) -> Magnitude {
        let row = |i: usize| (0..self.n).fold(Magnitude::zero(), |sum, j| sum.add_hi(self.entry_hi(i, j)));
        (0..self.n).map(row).fold(Magnitude::zero(), |m, r| if r.compare(&m) == Ordering::Greater { r } else { m })
    }

    /// The least k with |entry| < 2^k for all entries of the value; very negative if all are 0.
    pub(super) fn top(&self) -> i64 {
        let entry = |k: usize| {
            let words = &self.magnitudes[k * self.limbs..(k + 1) * self.limbs];
            let count = limb::significant(words);
            words[..count]
                .last()
                .map_or(i64::MIN / 4, |w| 64 * count as i64 - i64::from(w.leading_zeros()) - self.fraction as i64)
        };
        (0..self.n * self.n).map(entry).max().unwrap_or(i64::MIN / 4)
    }

    /// The product.
    pub(super) fn product(&self, other: &Self) -> Self {
        let n = self.n;
        let wide = self.limbs + other.limbs + 1;
        let columns: Vec<u64> = (0..n * n).flat_map(|k| other.magnitude(k % n, k / n)).copied().collect();
        let mut sums = vec![0u64; n * n * wide];
        let mut negative = vec![false; n * n];
        let mut minus = vec![0u64; wide];
        for i in 0..n {
            for j in 0..n {
                let place = i * n + j;
                let plus = &mut sums[place * wide..(place + 1) * wide];
                minus.fill(0);
                for k in 0..n {
                    let column = &columns[(j * n + k) * other.limbs..(j * n + k + 1) * other.limbs];
                    let target =
                        if self.negative[i * n + k] == other.negative[k * n + j] { &mut *plus } else { &mut minus[..] };
                    limb::mul_add_into(target, self.magnitude(i, k), column);
                }
                if limb::compare(plus, &minus) == Ordering::Less {
                    limb::sub_into(&mut minus, plus);
                    plus.copy_from_slice(&minus);
                    negative[place] = true;
                } else {
                    limb::sub_into(plus, &minus);
                }
            }
        }
        // SOUND(hi): |PQ - pq| <= |p| e_Q + e_P |q| + e_P e_Q, and less than n units for the dropped bits.
        let (e, g) = (self.error, other.error);
        let error = self.norm_hi().mul_hi(g).add_hi(e.mul_hi(other.norm_hi())).add_hi(e.mul_hi(g));
        let error = error.add_hi(Self::units(n, self.fraction));
        Self::packed(n, self.fraction, &sums, wide, other.fraction, negative, error)
    }

    /// Entries sums / 2^shift in as few limbs as they need.
    fn packed(
        n: usize,
        fraction: u64,
        sums: &[u64],
        wide: usize,
        shift: u64,
        negative: Vec<bool>,
        error: Magnitude,
    ) -> Self {
        let longest = sums.chunks_exact(wide).map(|s| {
            let count = limb::significant(s);
            let bits = 64 * count as u64 - s[..count].last().map_or(0, |w| u64::from(w.leading_zeros()));
            bits.saturating_sub(shift).div_ceil(64) as usize
        });
        let limbs = longest.max().unwrap_or(0).max(1);
        let mut magnitudes = vec![0u64; n * n * limbs];
        for (target, sum) in magnitudes.chunks_exact_mut(limbs).zip(sums.chunks_exact(wide)) {
            limb::shift_right_into(target, sum, shift);
        }
        Self { n, limbs, fraction, magnitudes, negative, error }
    }

    /// sum of c_k matrices[k] + c_0 I for non-negative numbers c_k = scalars / 2^fraction, each in error by at most
    /// one unit.
    ///
    /// `terms` pairs c_k with the power X^k; `constant` is c_0. The norms of the powers are at most 1.
    pub(super) fn combination(n: usize, fraction: u64, constant: &BigUint, terms: &[(&BigUint, &Self)]) -> Self {
        let scalar_limbs =
            terms.iter().map(|(c, _)| c.bits()).chain([constant.bits()]).max().unwrap_or(0).div_ceil(64) as usize;
        let matrix_limbs = terms.iter().map(|(_, m)| m.limbs).max().unwrap_or(1);
        let wide = (scalar_limbs + matrix_limbs).max(scalar_limbs + (fraction / 64) as usize + 1) + 1;
        let mut sums = vec![0u64; n * n * wide];
        let mut negative = vec![false; n * n];
        let scalars: Vec<Vec<u64>> = terms.iter().map(|(c, _)| c.iter_u64_digits().collect()).collect();
        let diagonal: Vec<u64> = (constant << fraction).iter_u64_digits().collect();
        let mut minus = vec![0u64; wide];
        for place in 0..n * n {
            let plus = &mut sums[place * wide..(place + 1) * wide];
            minus.fill(0);
            if place / n == place % n {
                limb::add_into(plus, &diagonal);
            }
            for ((_, matrix), scalar) in terms.iter().zip(&scalars) {
                let target = if matrix.negative[place] { &mut minus[..] } else { &mut *plus };
                limb::mul_add_into(target, matrix.magnitude(place / n, place % n), scalar);
            }
            if limb::compare(plus, &minus) == Ordering::Less {
                limb::sub_into(&mut minus, plus);
                plus.copy_from_slice(&minus);
                negative[place] = true;
            } else {
                limb::sub_into(plus, &minus);
            }
        }
        // SOUND(hi): c_k <= 1 and |X^k| <= 1 (asked of the caller): each term adds its own error and one unit for c_k;
        // the shift drops less than n units; the constant one unit.
        let unit = Self::units(1, fraction);
        let error = terms
            .iter()
            .fold(Self::units(n + 1, fraction), |sum, (_, m)| sum.add_hi(m.error).add_hi(unit).add_hi(unit));
        Self::packed(n, fraction, &sums, wide, fraction, negative, error)
    }

    /// self + other.
    pub(super) fn sum(&self, other: &Self) -> Self {
        let wide = self.limbs.max(other.limbs) + 1;
        let n = self.n;
        let mut sums = vec![0u64; n * n * wide];
        let mut negative = self.negative.clone();
        let mut second = vec![0u64; wide];
        for place in 0..n * n {
            let first = &mut sums[place * wide..(place + 1) * wide];
            first[..self.limbs].copy_from_slice(self.magnitude(place / n, place % n));
            second.fill(0);
            second[..other.limbs].copy_from_slice(other.magnitude(place / n, place % n));
            if self.negative[place] == other.negative[place] {
                limb::add_into(first, &second);
            } else if limb::compare(first, &second) == Ordering::Less {
                limb::sub_into(&mut second, first);
                first.copy_from_slice(&second);
                negative[place] = other.negative[place];
            } else {
                limb::sub_into(first, &second);
            }
        }
        Self::packed(n, self.fraction, &sums, wide, 0, negative, self.error.add_hi(other.error))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn ball(entries: &[i64], halvings: u64, fraction: u64) -> Ball {
        let entries: Vec<BigInt> = entries.iter().map(|e| BigInt::from(*e)).collect();
        Ball::from_integers(2, &entries, &BigInt::one(), halvings, fraction)
    }

    proptest! {
        #[test]
        fn products_and_sums_of_exact_entries_are_exact(a in prop::collection::vec(any::<i32>(), 4), b in prop::collection::vec(any::<i64>(), 4)) {
            let a: Vec<i64> = a.into_iter().map(i64::from).collect();
            let (x, y) = (ball(&a, 0, 70), ball(&b, 0, 70));
            let (p, s) = (x.product(&y), x.sum(&y));
            for i in 0..2 {
                for j in 0..2 {
                    let exact: BigInt = (0..2).map(|k| BigInt::from(a[2 * i + k]) * BigInt::from(b[2 * k + j])).sum();
                    prop_assert_eq!(p.entry(i, j), exact << 70u32);
                    prop_assert_eq!(s.entry(i, j), (BigInt::from(a[2 * i + j]) + BigInt::from(b[2 * i + j])) << 70u32);
                }
            }
        }

        #[test]
        fn norm_bounds_lie_above(a in prop::collection::vec(any::<i64>(), 4), f in 1u64..90) {
            let x = ball(&a, 0, f);
            let sum = |i: usize| BigInt::from(a[i]).magnitude() + BigInt::from(a[i + 1]).magnitude();
            let truth = Magnitude::integer_lo(&BigInt::from(sum(0).max(sum(2))), 0);
            prop_assert!(x.norm_hi().compare(&truth) != Ordering::Less);
        }
    }
}
