//! Dyadic numbers m 2^e with an integer mantissa, and their directed rounding.
//!
//! Addition, subtraction and multiplication round in a named direction to a number of mantissa bits; comparison
//! is exact. This is the only file of the crate in which digits are dropped.

use num_bigint::{BigInt, Sign};
use num_traits::{One, Signed, Zero};
use std::cmp::Ordering;

/// Which side of the exact value a rounded value lies on (or is equal to it).
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Direction {
    /// Not above the exact value.
    Down,
    /// Not below the exact value.
    Up,
}

/// The number `mantissa * 2^exponent`. Zero may have any exponent.
#[derive(Clone, Debug)]
pub struct Dyadic {
    mantissa: BigInt,
    exponent: i64,
}

impl Dyadic {
    /// The number `mantissa * 2^exponent`.
    pub fn new(mantissa: BigInt, exponent: i64) -> Self {
        Self { mantissa, exponent }
    }

    /// Zero.
    pub fn zero() -> Self {
        Self::new(BigInt::zero(), 0)
    }

    /// 2^exponent.
    pub fn power_of_two(exponent: i64) -> Self {
        Self::new(BigInt::one(), exponent)
    }

    /// The integer mantissa.
    pub fn mantissa(&self) -> &BigInt {
        &self.mantissa
    }

    /// The exponent of two.
    pub fn exponent(&self) -> i64 {
        self.exponent
    }

    /// The sign: `Less` below zero, `Equal` at zero, `Greater` above.
    pub fn sign(&self) -> Ordering {
        match self.mantissa.sign() {
            Sign::Minus => Ordering::Less,
            Sign::NoSign => Ordering::Equal,
            Sign::Plus => Ordering::Greater,
        }
    }

    /// The least k with |value| < 2^k; for zero, `i64::MIN / 2`.
    pub fn top(&self) -> i64 {
        match i64::try_from(self.mantissa.bits()) {
            Ok(0) => i64::MIN / 2,
            Ok(bits) => self.exponent.saturating_add(bits),
            Err(_) => i64::MAX / 2,
        }
    }

    /// -value.
    pub fn neg(&self) -> Self {
        Self::new(-&self.mantissa, self.exponent)
    }

    /// |value|.
    pub fn abs(&self) -> Self {
        Self::new(self.mantissa.abs(), self.exponent)
    }

    /// value * 2^shift, exactly.
    pub fn scale(&self, shift: i64) -> Self {
        Self::new(self.mantissa.clone(), self.exponent.saturating_add(shift))
    }

    /// The value rounded to at most `bits` mantissa bits.
    pub fn round(self, bits: u32, direction: Direction) -> Self {
        let excess = self.mantissa.bits().saturating_sub(u64::from(bits));
        if excess == 0 {
            return self;
        }
        let exponent = self.exponent.saturating_add(i64::try_from(excess).unwrap_or(i64::MAX));
        // SOUND: shifting a BigInt right is floor division by 2^excess, also for negatives (num-bigint's
        // documented behaviour; pinned by the test shift_right_floors_negatives); the ceiling of x is minus
        // the floor of -x.
        let mantissa = match direction {
            Direction::Down => self.mantissa >> excess,
            Direction::Up => -(-self.mantissa >> excess),
        };
        Self::new(mantissa, exponent)
    }

    /// self + other, rounded.
    pub fn add(&self, other: &Self, bits: u32, direction: Direction) -> Self {
        if self.mantissa.is_zero() {
            return other.clone().round(bits, direction);
        }
        if other.mantissa.is_zero() {
            return self.clone().round(bits, direction);
        }
        let (large, small) = if self.top() >= other.top() { (self, other) } else { (other, self) };
        let floor = large.top().saturating_sub(i64::from(bits)).saturating_sub(8);
        // SOUND: |small| < 2^small.top() <= 2^floor, so `nudge` is on the far side of `small` in the wanted
        // direction. This keeps the shift below a few times the operands' own lengths.
        let nudge;
        let small = if small.top() <= floor {
            nudge = match (direction, small.sign()) {
                (Direction::Down, Ordering::Less) => Self::new(-BigInt::one(), floor),
                (Direction::Up, Ordering::Greater) => Self::new(BigInt::one(), floor),
                (Direction::Down | Direction::Up, _) => return large.clone().round(bits, direction),
            };
            &nudge
        } else {
            small
        };
        let exponent = large.exponent.min(small.exponent);
        let aligned = |d: &Self| match u64::try_from(d.exponent.saturating_sub(exponent)) {
            Ok(shift) if shift > 0 => &d.mantissa << shift,
            Ok(_) | Err(_) => d.mantissa.clone(),
        };
        Self::new(aligned(large) + aligned(small), exponent).round(bits, direction)
    }

    /// self * other, rounded.
    pub fn mul(&self, other: &Self, bits: u32, direction: Direction) -> Self {
        let exponent = self.exponent.saturating_add(other.exponent);
        Self::new(&self.mantissa * &other.mantissa, exponent).round(bits, direction)
    }

    /// numerator / denominator, rounded to `bits` bits or one more. The denominator is not 0.
    pub fn quotient(numerator: &BigInt, denominator: &BigInt, bits: u32, direction: Direction) -> Self {
        if numerator.is_zero() || denominator.is_zero() {
            return Self::zero();
        }
        let (numerator, denominator) = if denominator.is_negative() {
            (-numerator, -denominator)
        } else {
            (numerator.clone(), denominator.clone())
        };
        let shift = (u64::from(bits) + 1 + denominator.bits()).saturating_sub(numerator.bits());
        let shifted = numerator << shift;
        // SOUND: `div_floor` is the floor of the exact quotient; the ceiling of x is minus the floor of -x.
        let mantissa = match direction {
            Direction::Down => num_integer::Integer::div_floor(&shifted, &denominator),
            Direction::Up => -num_integer::Integer::div_floor(&-shifted, &denominator),
        };
        Self::new(mantissa, i64::try_from(shift).map_or(i64::MIN, |s| -s))
    }

    /// self / other, rounded to `bits` bits or one more. `other` is not 0.
    pub fn div(&self, other: &Self, bits: u32, direction: Direction) -> Self {
        let quotient = Self::quotient(&self.mantissa, &other.mantissa, bits, direction);
        quotient.scale(self.exponent.saturating_sub(other.exponent))
    }
}

impl Dyadic {
    /// An upper bound of the square root of a number that is not negative, about `bits` bits long; of a negative one: 0.
    pub fn sqrt_up(&self, bits: u32) -> Self {
        if self.sign() != Ordering::Greater {
            return Self::zero();
        }
        // m 2^e = (m 2^s) 2^(e - s) with e - s even: the square root is sqrt(m 2^s) 2^((e - s) / 2).
        let wanted = i64::from(bits).saturating_mul(2) - i64::try_from(self.mantissa.bits()).unwrap_or(0);
        let shift = wanted.max(0) + (wanted.max(0) + self.exponent).rem_euclid(2);
        let scaled = &self.mantissa << u64::try_from(shift).unwrap_or(0);
        // SOUND(hi): floor(sqrt(x)) + 1 > sqrt(x).
        Self::new(scaled.sqrt() + BigInt::one(), (self.exponent - shift) / 2)
    }
}

impl PartialEq for Dyadic {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other) == Ordering::Equal
    }
}

impl Eq for Dyadic {}

impl PartialOrd for Dyadic {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for Dyadic {
    fn cmp(&self, other: &Self) -> Ordering {
        let by_sign = self.sign().cmp(&other.sign());
        if by_sign != Ordering::Equal || self.mantissa.is_zero() {
            return by_sign;
        }
        let by_size = self.top().cmp(&other.top());
        if by_size != Ordering::Equal {
            return if self.mantissa.is_negative() { by_size.reverse() } else { by_size };
        }
        // Equal tops: the exponents differ by less than the longer mantissa, so the shift is short.
        match u64::try_from(self.exponent.saturating_sub(other.exponent)) {
            Ok(shift) => (&self.mantissa << shift).cmp(&other.mantissa),
            Err(_) => self.mantissa.cmp(&(&other.mantissa << self.exponent.abs_diff(other.exponent))),
        }
    }
}
