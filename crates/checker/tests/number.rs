//! Dyadic numbers, intervals and rectangles: every result contains the exact one, at 2 to 12 bits, where rounding is coarse.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::indexing_slicing,
    clippy::default_numeric_fallback,
    clippy::as_conversions,
    reason = "a test fails by panicking"
)]

mod sample;

use keepout_checker::number::{Complex, Direction, Dyadic, Interval, Rational};
use num_bigint::BigInt;
use num_traits::{Signed, Zero};
use sample::{Source, contains, dyadic, exact, rational};

fn grid() -> Vec<Dyadic> {
    (-9..=9).flat_map(|m| (-2..=2).map(move |e| dyadic(m, e))).collect()
}

/// All intervals with ends among a few numbers of both signs.
fn intervals() -> Vec<Interval> {
    let ends: Vec<Dyadic> = [-13, -5, -1, 0, 1, 3, 11].iter().map(|m| dyadic(*m, -2)).collect();
    let from = |i: usize| ends[i..].iter().map(move |hi| (i, hi.clone()));
    (0..ends.len()).flat_map(from).map(|(i, hi)| Interval::hull(ends[i].clone(), hi)).collect()
}

/// Ends, thirds and middle.
fn members(x: &Interval) -> Vec<Rational> {
    let (lo, hi) = (exact(x.lo()), exact(x.hi()));
    ["0", "1/3", "1/2", "2/3", "1"].iter().map(|part| &lo + (&hi - &lo) * rational(part)).collect()
}

fn is_within(inner: &Interval, outer: &Interval) -> bool {
    outer.lo() <= inner.lo() && inner.hi() <= outer.hi()
}

#[test]
fn shift_right_floors_negatives() {
    assert_eq!(BigInt::from(-7) >> 1_u64, BigInt::from(-4));
    assert_eq!(BigInt::from(-8) >> 1_u64, BigInt::from(-4));
    assert_eq!(BigInt::from(-1) >> 100_u64, BigInt::from(-1));
    let big: BigInt = -(BigInt::from(1) << 200_u64) - 1;
    assert_eq!(big >> 200_u64, BigInt::from(-2));
}

#[test]
fn rounded_sums_products_and_quotients_lie_on_their_side() {
    for a in grid() {
        for b in grid() {
            let (x, y) = (exact(&a), exact(&b));
            for bits in 2..=5 {
                for direction in [Direction::Down, Direction::Up] {
                    let side = |rounded: &Dyadic, truth: &Rational| match direction {
                        Direction::Down => exact(rounded) <= *truth,
                        Direction::Up => exact(rounded) >= *truth,
                    };
                    let (sum, product) = (a.add(&b, bits, direction), a.mul(&b, bits, direction));
                    assert!(side(&sum, &(&x + &y)), "{a:?} + {b:?} at {bits} {direction:?}");
                    assert!(side(&product, &(&x * &y)), "{a:?} * {b:?} at {bits} {direction:?}");
                    // An Up-rounding may carry into one more bit: then the mantissa is a power of two.
                    for result in [&sum, &product] {
                        let odd = result.mantissa().abs() >> result.mantissa().trailing_zeros().unwrap_or(0);
                        assert!(odd.bits() <= u64::from(bits), "{result:?} is longer than {bits} bits");
                    }
                    if !y.is_zero() {
                        assert!(side(&a.div(&b, bits, direction), &(&x / &y)), "{a:?} / {b:?} at {bits} {direction:?}");
                    }
                }
            }
        }
    }
}

#[test]
fn rounding_down_and_up_are_less_than_one_unit_apart() {
    let mut source = Source(1);
    for _ in 0..2_000 {
        let (a, b) = (source.dyadic(5_000), source.dyadic(5_000));
        for bits in 2..=12 {
            let gap = exact(&a.mul(&b, bits, Direction::Up)) - exact(&a.mul(&b, bits, Direction::Down));
            let product = exact(&a) * exact(&b);
            let unit = product.abs() / Rational::from_integer(BigInt::from(1) << (bits - 1));
            assert!(gap <= unit, "{a:?} * {b:?} at {bits} bits");
        }
    }
}

#[test]
fn sums_of_numbers_of_very_different_size_lie_on_their_side() {
    for (large, small) in [(1, 1), (1, -1), (-1, 1), (-1, -1), (5, 3), (-5, 7)] {
        for distance in [3, 9, 10, 11, 12, 20, 200] {
            let (a, b) = (dyadic(large, 0), dyadic(small, -distance));
            let truth = exact(&a) + exact(&b);
            for bits in 2..=6 {
                for (x, y) in [(&a, &b), (&b, &a)] {
                    assert!(exact(&x.add(y, bits, Direction::Down)) <= truth, "{a:?} {b:?} {bits}");
                    assert!(exact(&x.add(y, bits, Direction::Up)) >= truth, "{a:?} {b:?} {bits}");
                }
            }
        }
    }
}

#[test]
fn comparison_agrees_with_exact_values() {
    for a in grid() {
        for b in grid() {
            assert_eq!(a.cmp(&b), exact(&a).cmp(&exact(&b)), "{a:?} {b:?}");
        }
    }
    assert!(dyadic(1, 1 << 40) > dyadic(7, -(1 << 40)));
    assert!(dyadic(-1, 1 << 40) < dyadic(-7, -(1 << 40)));
}

#[test]
fn enclosures_of_rationals_contain_them() {
    let mut source = Source(2);
    for _ in 0..3_000 {
        let value = source.rational();
        for bits in 2..=12 {
            let interval = Interval::rational(&value, bits);
            assert!(contains(&interval, &value), "{value} at {bits} bits");
            let width = exact(interval.hi()) - exact(interval.lo());
            assert!(width <= value.abs() / Rational::from_integer(BigInt::from(1) << (bits - 1)), "{value} {bits}");
        }
    }
}

#[test]
fn interval_operations_contain_the_results_of_members() {
    for x in intervals() {
        for bits in 2..=6 {
            let (square, cube) = (x.square(bits), x.power(3, bits));
            let third = x.div_integer(3, bits);
            for p in members(&x) {
                assert!(contains(&square, &(&p * &p)), "{x:?}^2 at {bits}");
                assert!(contains(&cube, &(&p * &p * &p)), "{x:?}^3 at {bits}");
                assert!(contains(&third, &(&p / rational("3"))), "{x:?}/3 at {bits}");
                assert!(contains(&x.neg(), &-&p));
                assert!(contains(&x.scale(-3), &(&p / rational("8"))));
                assert!(exact(&x.abs_hi()) >= p.abs());
            }
            for y in intervals() {
                let (sum, difference, product) = (x.add(&y, bits), x.sub(&y, bits), x.mul(&y, bits));
                for (p, q) in members(&x).iter().flat_map(|p| members(&y).into_iter().map(move |q| (p.clone(), q))) {
                    assert!(contains(&sum, &(&p + &q)), "{x:?} + {y:?} at {bits}");
                    assert!(contains(&difference, &(&p - &q)), "{x:?} - {y:?} at {bits}");
                    assert!(contains(&product, &(&p * &q)), "{x:?} * {y:?} at {bits}");
                }
            }
        }
    }
}

#[test]
fn products_at_many_bits_are_exact_hulls() {
    for x in intervals() {
        for y in intervals() {
            let corners: Vec<Rational> =
                [x.lo(), x.hi()].into_iter().flat_map(|a| [y.lo(), y.hi()].map(|b| exact(a) * exact(b))).collect();
            let product = x.mul(&y, 60);
            assert_eq!(exact(product.lo()), corners.iter().min().unwrap().clone(), "{x:?} {y:?}");
            assert_eq!(exact(product.hi()), corners.iter().max().unwrap().clone(), "{x:?} {y:?}");
        }
    }
}

#[test]
fn reciprocals_contain_those_of_members_and_zero_is_refused() {
    for x in intervals() {
        for bits in 2..=6 {
            match x.recip(bits) {
                Some(inverse) => {
                    assert!(members(&x).iter().all(|p| contains(&inverse, &p.recip())), "1/{x:?} at {bits}");
                }
                None => assert!(contains(&x, &rational("0"))),
            }
        }
    }
}

#[test]
fn signs_are_certain_only_where_all_members_share_them() {
    for x in intervals() {
        let signs: Vec<_> = [x.lo(), x.hi()].iter().map(|end| end.sign()).collect();
        let zero_inside = contains(&x, &rational("0"));
        match x.certain_sign() {
            Some(sign) => assert!(signs.iter().all(|s| *s == sign)),
            None => assert!(zero_inside && signs[0] != signs[1]),
        }
    }
}

#[test]
fn larger_operands_give_larger_results() {
    let all = intervals();
    for x in &all {
        for wide in all.iter().filter(|w| is_within(x, w)) {
            for y in all.iter().step_by(3) {
                for bits in [2, 3, 5] {
                    assert!(is_within(&x.add(y, bits), &wide.add(y, bits)));
                    assert!(is_within(&x.mul(y, bits), &wide.mul(y, bits)), "{x:?} in {wide:?}, times {y:?}");
                }
            }
            assert!(is_within(&x.square(4), &wide.square(4)));
            if let (Some(narrow), Some(wide)) = (x.recip(4), wide.recip(4)) {
                assert!(is_within(&narrow, &wide));
            }
        }
    }
}

#[test]
fn two_precisions_overlap() {
    let mut source = Source(3);
    for _ in 0..500 {
        let (p, q) = (source.rational(), source.rational());
        let at = |bits| Interval::rational(&p, bits).mul(&Interval::rational(&q, bits), bits);
        for bits in 2..=12 {
            assert!(!at(bits).is_disjoint(&at(200)), "{p} * {q} at {bits}");
        }
    }
}

#[test]
fn complex_operations_contain_the_exact_results() {
    let mut source = Source(4);
    for _ in 0..500 {
        let [a, b, c, d] = [(); 4].map(|()| source.rational());
        for bits in 2..=12 {
            let number = |re: &Rational, im: &Rational| Complex {
                re: Interval::rational(re, bits),
                im: Interval::rational(im, bits),
            };
            let (z, w) = (number(&a, &b), number(&c, &d));
            let has = |z: &Complex, re: Rational, im: Rational| contains(&z.re, &re) && contains(&z.im, &im);
            assert!(has(&z.mul(&w, bits), &a * &c - &b * &d, &a * &d + &b * &c));
            assert!(has(&z.square(bits), &a * &a - &b * &b, &a * &b * rational("2")));
            assert!(contains(&z.abs_squared(bits), &(&a * &a + &b * &b)));
            let size = exact(&z.abs_hi(bits));
            assert!(&size * &size >= &a * &a + &b * &b);
            if let Some(inverse) = z.recip(bits) {
                let norm = &a * &a + &b * &b;
                assert!(has(&inverse, &a / &norm, -(&b / &norm)));
            }
        }
    }
}
