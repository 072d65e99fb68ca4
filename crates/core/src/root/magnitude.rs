//! Upper and lower bounds of non-negative numbers, in one word and an exponent.
//!
//! A magnitude is mantissa * 2^exponent with a mantissa below 2^62. Each operation rounds in the direction of its
//! name. Cheap bounds of radii and norms, where a few bits are all that matters.

#[cfg(test)]
use crate::ToRational;
use keepout_checker::number::Dyadic;
use num_bigint::BigInt;
use num_traits::ToPrimitive;
use std::cmp::Ordering;

const MANTISSA_BITS: u32 = 62;

/// A non-negative number that bounds another one from the side named by the function that made it.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Magnitude {
    mantissa: u64,
    exponent: i64,
}

impl Magnitude {
    pub(crate) fn zero() -> Self {
        Self { mantissa: 0, exponent: 0 }
    }

    pub(crate) fn one() -> Self {
        Self { mantissa: 1, exponent: 0 }
    }

    /// mantissa * 2^exponent, exactly.
    pub(crate) fn exact(mantissa: u32, exponent: i64) -> Self {
        Self { mantissa: mantissa.into(), exponent }
    }

    /// The least k with value < 2^k; very negative for 0.
    pub(crate) fn top(&self) -> i64 {
        if self.mantissa == 0 {
            return i64::MIN / 4;
        }
        self.exponent + i64::from(64 - self.mantissa.leading_zeros())
    }

    fn from_wide(value: u128, exponent: i64, up: bool) -> Self {
        let excess = (128 - value.leading_zeros()).saturating_sub(MANTISSA_BITS);
        let mut mantissa = (value >> excess) as u64;
        // SOUND(hi): the dropped part is below one unit; the carry to 2^62 is harmless for the type.
        if up && (u128::from(mantissa) << excess) != value {
            mantissa += 1;
        }
        Self { mantissa, exponent: exponent + i64::from(excess) }
    }

    /// Not below value * 2^exponent.
    pub(crate) fn wide_hi(value: u128, exponent: i64) -> Self {
        Self::from_wide(value, exponent, true)
    }

    fn from_integer(value: &BigInt, exponent: i64, up: bool) -> Self {
        let bits = value.bits();
        if bits <= u64::from(MANTISSA_BITS) {
            return Self { mantissa: value.magnitude().to_u64().unwrap_or(0), exponent };
        }
        let excess = bits - u64::from(MANTISSA_BITS);
        let top = (value.magnitude() >> excess).to_u64().unwrap_or(0);
        // SOUND(hi): + 1 unit covers the bits that the shift dropped.
        Self { mantissa: top + u64::from(up), exponent: exponent + excess as i64 }
    }

    /// Not above |value| 2^exponent.
    pub(crate) fn integer_lo(value: &BigInt, exponent: i64) -> Self {
        Self::from_integer(value, exponent, false)
    }

    /// Not below |value| 2^exponent.
    pub(crate) fn integer_hi(value: &BigInt, exponent: i64) -> Self {
        Self::from_integer(value, exponent, true)
    }

    pub(crate) fn mul_lo(self, other: Self) -> Self {
        let product = u128::from(self.mantissa) * u128::from(other.mantissa);
        Self::from_wide(product, self.exponent + other.exponent, false)
    }

    pub(crate) fn mul_hi(self, other: Self) -> Self {
        let product = u128::from(self.mantissa) * u128::from(other.mantissa);
        Self::from_wide(product, self.exponent + other.exponent, true)
    }

    fn add(self, other: Self, up: bool) -> Self {
        if self.mantissa == 0 || other.mantissa == 0 {
            return if self.mantissa == 0 { other } else { self };
        }
        let (large, small) = if self.top() >= other.top() { (self, other) } else { (other, self) };
        let base = u128::from(large.mantissa) << 62;
        let exponent = large.exponent - 62;
        let shift = exponent - small.exponent;
        // SOUND: a part below the unit counts as one unit upwards, as nothing downwards. The left shift loses nothing:
        // the smaller number is below 2^(top of the larger), so below 2^(63 + 62) units.
        let part = match shift {
            s if s <= 0 => u128::from(small.mantissa) << s.unsigned_abs(),
            s if s > 0 && s < 64 => (u128::from(small.mantissa) >> s) + u128::from(up),
            _ => u128::from(up),
        };
        Self::from_wide(base + part, exponent, up)
    }

    pub(crate) fn add_hi(self, other: Self) -> Self {
        self.add(other, true)
    }

    pub(crate) fn add_lo(self, other: Self) -> Self {
        self.add(other, false)
    }

    /// Not below self / other; `None` for other = 0.
    pub(crate) fn div_hi(self, other: Self) -> Option<Self> {
        if other.mantissa == 0 {
            return None;
        }
        let scaled = u128::from(self.mantissa) << 64;
        let divisor = u128::from(other.mantissa);
        // SOUND(hi): rounded up by div_ceil, then once more by from_wide.
        Some(Self::from_wide(scaled.div_ceil(divisor), self.exponent - 64 - other.exponent, true))
    }

    fn even(self) -> (u128, i64) {
        let shift = 62 + (self.exponent.rem_euclid(2)) as u32;
        (u128::from(self.mantissa) << shift, (self.exponent - i64::from(shift)) / 2)
    }

    pub(crate) fn sqrt_hi(self) -> Self {
        let (value, exponent) = self.even();
        let root = value.isqrt();
        Self::from_wide(root + u128::from(root * root != value), exponent, true)
    }

    pub(crate) fn sqrt_lo(self) -> Self {
        let (value, exponent) = self.even();
        Self::from_wide(value.isqrt(), exponent, false)
    }

    /// self * 2^shift, exactly.
    pub(crate) fn shifted(self, shift: i64) -> Self {
        Self { mantissa: self.mantissa, exponent: self.exponent + shift }
    }

    pub(crate) fn to_dyadic(self) -> Dyadic {
        Dyadic::new(BigInt::from(self.mantissa), self.exponent)
    }

    /// Compares the two numbers exactly.
    pub(crate) fn compare(&self, other: &Self) -> Ordering {
        if self.mantissa == 0 || other.mantissa == 0 {
            return self.mantissa.cmp(&other.mantissa);
        }
        self.top().cmp(&other.top()).then_with(|| {
            let normal = |m: u64| m << m.leading_zeros();
            normal(self.mantissa).cmp(&normal(other.mantissa))
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use keepout_checker::number::Rational;
    use proptest::prelude::*;

    fn exact(m: Magnitude) -> Rational {
        m.to_dyadic().to_rational().unwrap()
    }

    /// Short and long mantissas: sums of very different lengths are where bits can get lost.
    fn mantissa() -> impl Strategy<Value = u64> {
        (any::<u64>(), 2u32..=64).prop_map(|(m, shift)| if shift == 64 { 0 } else { m >> shift })
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(4000))]

        #[test]
        fn bounds_lie_on_their_side(a in mantissa(), e in -80i64..80, b in mantissa(), g in -80i64..80) {
            prop_assume!(b > 0);
            let (x, y) = (Magnitude { mantissa: a, exponent: e }, Magnitude { mantissa: b, exponent: g });
            let (p, q) = (exact(x), exact(y));
            prop_assert!(exact(x.mul_lo(y)) <= &p * &q && exact(x.mul_hi(y)) >= &p * &q);
            prop_assert!(exact(x.add_lo(y)) <= &p + &q && exact(x.add_hi(y)) >= &p + &q);
            prop_assert!(exact(x.div_hi(y).unwrap()) >= &p / &q);
            let (lo, hi) = (exact(x.sqrt_lo()), exact(x.sqrt_hi()));
            prop_assert!(&lo * &lo <= p && &hi * &hi >= p);
            prop_assert_eq!(x.compare(&y), p.cmp(&q));
        }

        #[test]
        fn integers_are_bounded(value in any::<i128>(), e in -9i64..9) {
            let big = BigInt::from(value);
            let truth = Dyadic::new(big.clone(), e).abs().to_rational().unwrap();
            prop_assert!(exact(Magnitude::integer_lo(&big, e)) <= truth);
            prop_assert!(exact(Magnitude::integer_hi(&big, e)) >= truth);
        }
    }
}
