//! Non-negative integers as slices of 64-bit limbs, lowest first: the inner loops of fixed-point matrices.
//!
//! Every function states which result fits; nothing is dropped silently.

use std::cmp::Ordering;

/// acc += a; whether a carry leaves `acc`. `acc` is at least as long as `a`.
pub(super) fn add_into(acc: &mut [u64], a: &[u64]) -> bool {
    let mut carry = false;
    let (low, high) = acc.split_at_mut(a.len());
    for (slot, x) in low.iter_mut().zip(a) {
        let (sum, c1) = slot.overflowing_add(*x);
        let (sum, c2) = sum.overflowing_add(u64::from(carry));
        *slot = sum;
        carry = c1 || c2;
    }
    for slot in high {
        if !carry {
            return false;
        }
        (*slot, carry) = slot.overflowing_add(1);
    }
    carry
}

/// acc -= a, for acc >= a; `acc` is at least as long as `a`.
pub(super) fn sub_into(acc: &mut [u64], a: &[u64]) {
    let mut borrow = false;
    let (low, high) = acc.split_at_mut(a.len());
    for (slot, x) in low.iter_mut().zip(a) {
        let (difference, b1) = slot.overflowing_sub(*x);
        let (difference, b2) = difference.overflowing_sub(u64::from(borrow));
        *slot = difference;
        borrow = b1 || b2;
    }
    for slot in high {
        if !borrow {
            return;
        }
        (*slot, borrow) = slot.overflowing_sub(1);
    }
}

/// Compares two numbers of equally many limbs.
pub(super) fn compare(a: &[u64], b: &[u64]) -> Ordering {
    a.iter().rev().cmp(b.iter().rev())
}

/// acc += a b; `acc` has room for the sum (at least one limb more than both factors together for sums of few products).
#[inline]
pub(super) fn mul_add_into(acc: &mut [u64], a: &[u64], b: &[u64]) {
    for (i, x) in a.iter().enumerate() {
        let x = u128::from(*x);
        if x == 0 {
            continue;
        }
        let mut carry = 0u128;
        let (low, high) = acc[i..].split_at_mut(b.len());
        for (slot, y) in low.iter_mut().zip(b) {
            // (2^64 - 1)^2 + 2 (2^64 - 1) = 2^128 - 1: no overflow.
            let t = x * u128::from(*y) + u128::from(*slot) + carry;
            *slot = t as u64;
            carry = t >> 64;
        }
        for slot in high {
            if carry == 0 {
                break;
            }
            let t = u128::from(*slot) + carry;
            *slot = t as u64;
            carry = t >> 64;
        }
    }
}

/// target = floor(a / 2^shift); `target` has room for it.
pub(super) fn shift_right_into(target: &mut [u64], a: &[u64], shift: u64) {
    let (words, bits) = ((shift / 64) as usize, (shift % 64) as u32);
    for (k, slot) in target.iter_mut().enumerate() {
        let low = a.get(k + words).copied().unwrap_or(0);
        let high = a.get(k + words + 1).copied().unwrap_or(0);
        *slot = if bits == 0 { low } else { low >> bits | high << (64 - bits) };
    }
}

/// The number of limbs without leading zeros.
pub(super) fn significant(a: &[u64]) -> usize {
    a.iter().rposition(|x| *x != 0).map_or(0, |k| k + 1)
}
