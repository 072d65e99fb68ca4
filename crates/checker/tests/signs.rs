//! Sign sets against numbers: what an identity says of signs holds for each choice of numbers.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::indexing_slicing,
    clippy::default_numeric_fallback,
    clippy::as_conversions,
    reason = "a test fails by panicking"
)]

use keepout_checker::certificate::{Identity, Sign};
use keepout_checker::signs::{SignSet, narrow};
use std::cmp::Ordering;

mod sample;

use sample::Source;

const VALUES: [i64; 5] = [-3, -1, 0, 1, 2];

fn sign(value: i64) -> Sign {
    value.cmp(&0)
}

fn contains(set: SignSet, wanted: Sign) -> bool {
    set.members().any(|sign| sign == wanted)
}

/// The value of the sum at a point; function 0 is the target, the point starts with function 1.
fn value(identity: &Identity, point: &[i64]) -> i64 {
    let product = |factors: &Vec<(usize, u32)>| factors.iter().map(|(f, k)| point[f - 1].pow(*k)).product::<i64>();
    identity.summands.iter().map(product).sum()
}

#[test]
fn the_sign_of_a_sum_of_products_is_among_those_that_are_deduced() {
    let mut source = Source(3);
    let mut narrowed = 0;
    for _ in 0..500 {
        let mut below = |n: i64| (source.signed(n - 1).unsigned_abs()) as usize;
        let summands =
            (0..1 + below(3)).map(|_| (0..1 + below(3)).map(|_| (1 + below(3), 1 + below(4) as u32)).collect());
        let identity = Identity { target: 0, summands: summands.collect() };
        for code in 0..125 {
            let point = [VALUES[code % 5], VALUES[code / 5 % 5], VALUES[code / 25]];
            // Each function's sign alone, or one more sign that it could have had.
            let more = |v: i64| {
                if below(2) == 0 {
                    SignSet::only(sign(v))
                } else {
                    SignSet::only(sign(v)).or(SignSet::only(Ordering::Equal))
                }
            };
            let mut signs = vec![SignSet::ANY];
            signs.extend(point.map(more));
            narrow(&mut signs, std::slice::from_ref(&identity));
            assert!(contains(signs[0], sign(value(&identity, &point))), "{identity:?} at {point:?}: {:?}", signs[0]);
            narrowed += usize::from(signs[0] != SignSet::ANY);
        }
    }
    assert!(narrowed > 20_000, "{narrowed}");
}

#[test]
fn squares_are_not_negative_whatever_their_root_is() {
    let square = Identity { target: 0, summands: vec![vec![(1, 2)]] };
    let mut signs = vec![SignSet::ANY; 2];
    narrow(&mut signs, &[square]);
    assert_eq!(signs[0], SignSet::only(Ordering::Equal).or(SignSet::only(Ordering::Greater)));
}

#[test]
fn what_is_known_stays_where_an_identity_contradicts_it() {
    let square = Identity { target: 0, summands: vec![vec![(1, 2)]] };
    let mut signs = vec![SignSet::only(Ordering::Less), SignSet::ANY];
    narrow(&mut signs, &[square]);
    assert_eq!(signs[0], SignSet::only(Ordering::Less));
}

#[test]
fn identities_narrow_one_after_the_other() {
    let first = Identity { target: 1, summands: vec![vec![(2, 2)], vec![(3, 1)]] };
    let second = Identity { target: 0, summands: vec![vec![(1, 1), (3, 1)]] };
    let mut signs = vec![SignSet::ANY; 3];
    signs.push(SignSet::only(Ordering::Greater));
    narrow(&mut signs, &[first, second]);
    assert_eq!(signs[..2], [SignSet::only(Ordering::Greater); 2]);
}
