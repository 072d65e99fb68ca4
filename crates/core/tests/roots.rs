//! Root discs against known roots, Sturm counts, Vieta's formulas and themselves at other precisions.

use keepout_checker::number::{Dyadic, Interval};
use keepout_core::ToRational;
use keepout_core::{CoreError, IntegerPolynomial, RootDisc, enclose_roots};
use num_bigint::BigInt;
use num_rational::BigRational;
use num_traits::{Signed, Zero};
use proptest::prelude::*;

fn small(c: &[i64]) -> IntegerPolynomial {
    IntegerPolynomial::from_small(c)
}

fn rational(d: &Dyadic) -> BigRational {
    d.to_rational().unwrap()
}

fn contains(interval: &Interval, value: &BigRational) -> bool {
    rational(interval.lo()) <= *value && *value <= rational(interval.hi())
}

/// Number of distinct real roots by Sturm's sequence over the rationals: a naive oracle.
fn sturm_count(p: &IntegerPolynomial) -> usize {
    let mut sequence = vec![p.clone(), p.derivative()];
    loop {
        let (a, b) = (&sequence[sequence.len() - 2], &sequence[sequence.len() - 1]);
        if b.is_zero() {
            break;
        }
        let (factor, r) = a.pseudo_remainder(b);
        let r = if factor.is_negative() { r } else { -&r };
        let content = r.content();
        let reduced = r.coefficients().iter().map(|c| c / &content).collect();
        sequence.push(if r.is_zero() { r } else { IntegerPolynomial::new(reduced) });
    }
    sequence.pop();
    let changes = |negative: bool| {
        let signs: Vec<bool> =
            sequence.iter().map(|s| s.leading().is_positive() != (negative && s.degree() % 2 == 1)).collect();
        signs.windows(2).filter(|w| w[0] != w[1]).count()
    };
    changes(true) - changes(false)
}

fn check(p: &IntegerPolynomial, bits: u32) -> Vec<RootDisc> {
    let roots = enclose_roots(p, bits).unwrap();
    assert_eq!(roots.len(), p.degree());
    assert_eq!(roots.iter().filter(|r| r.is_real()).count(), sturm_count(p), "real roots of {p}");
    for (i, r) in roots.iter().enumerate() {
        let (re, im, radius) = (rational(&r.re), rational(&r.im), rational(&r.radius));
        let bound = BigRational::new(1.into(), BigInt::from(1) << bits);
        assert!(&radius * &radius <= (&re * &re + &im * &im) * &bound * &bound, "radius of a root of {p}");
        assert!(r.is_real() || roots.contains(&r.conjugate()));
        for other in &roots[i + 1..] {
            let (dx, dy) = (&re - rational(&other.re), &im - rational(&other.im));
            let sum = &radius + rational(&other.radius);
            assert!(dx.clone() * dx + dy.clone() * dy > sum.clone() * sum, "discs of {p} meet");
        }
    }
    let sum = roots.iter().fold(Interval::integer(0), |s, r| s.add(&r.enclose_re(), bits + 64));
    let vieta = -BigRational::new(p.coefficient(p.degree() - 1), p.leading());
    assert!(contains(&sum, &vieta), "sum of the roots of {p}");
    roots
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(200))]

    #[test]
    fn random_polynomials_have_proven_discs(c in prop::collection::vec(-1000i64..1000, 2..16), bits in 2u32..200) {
        let p = small(&c).square_free_part();
        if !p.is_constant() {
            check(&p, bits);
        }
    }

    #[test]
    fn rational_roots_lie_in_their_discs(roots in prop::collection::btree_set((-60i64..60, 1i64..9), 1..9), bits in 20u32..150) {
        let p = roots.iter().fold(IntegerPolynomial::one(), |p, (a, b)| &p * &small(&[-a, *b])).square_free_part();
        let discs = check(&p, bits);
        for (a, b) in roots {
            let value = BigRational::new(a.into(), b.into());
            prop_assert_eq!(discs.iter().filter(|d| contains(&d.enclose_re(), &value)).count(), 1);
        }
    }

    #[test]
    fn two_precisions_overlap(c in prop::collection::vec(-50i64..50, 3..9)) {
        let p = small(&c).square_free_part();
        if !p.is_constant() {
            let (coarse, fine) = (check(&p, 10), check(&p, 400));
            for f in &fine {
                let meets = |c: &&RootDisc| !c.enclose_re().is_disjoint(&f.enclose_re()) && !c.enclose_im().is_disjoint(&f.enclose_im());
                prop_assert!(coarse.iter().any(|c| meets(&c)));
            }
        }
    }
}

#[test]
fn wilkinson_polynomial_of_degree_40_has_its_integer_roots() {
    let p = (1..=40).fold(IntegerPolynomial::one(), |p, k| &p * &small(&[-k, 1]));
    let discs = check(&p, 64);
    for (k, d) in discs.iter().enumerate() {
        assert!(contains(&d.enclose_re(), &BigRational::from_integer((k + 1).into())));
    }
}

#[test]
fn nearly_equal_roots_of_mignotte_polynomials_are_separated() {
    // z^d - 2 (a z - 1)^2 has two real roots at distance about 2 a^(-d/2 - 1).
    for (d, a) in [(9, 100i64), (20, 10), (16, 1000)] {
        let square = small(&[1, -2 * a, a * a]).scale(&(-2).into());
        let mut power = vec![0; d + 1];
        power[d] = 1;
        check(&(&small(&power) + &square), 53);
    }
}

#[test]
fn roots_of_very_different_size_are_found() {
    let mut p = small(&[0, 1]);
    for k in [-60, -20, 0, 30, 90i32] {
        let (num, den) = (BigInt::from(1) << k.max(0), BigInt::from(1) << (-k).max(0));
        p = &p * &IntegerPolynomial::new(vec![num.clone() * &num, BigInt::zero(), &den * &den]);
    }
    assert_eq!(check(&p, 80).iter().filter(|r| !r.is_real()).count(), 10);
}

#[test]
fn cyclotomic_roots_lie_on_the_unit_circle() {
    let mut c = vec![0; 61];
    (c[0], c[60]) = (-1, 1);
    for r in check(&small(&c), 60) {
        assert!(contains(&r.enclose().abs_squared(100), &BigRational::from_integer(1.into())));
    }
}

#[test]
fn repeated_factors_constants_and_huge_requests_are_refused() {
    assert_eq!(enclose_roots(&small(&[1, 2, 1]), 50), Err(CoreError::NotSquareFree));
    assert_eq!(enclose_roots(&small(&[7]), 50), Err(CoreError::ConstantPolynomial));
    assert!(matches!(enclose_roots(&small(&[-2, 0, 1]), u32::MAX), Err(CoreError::LimitExceeded { .. })));
}

#[test]
fn independent_ball_library_finds_the_same_roots() {
    for line in include_str!("oracle/roots.txt").lines() {
        let (coefficients, values) = line.split_once(" | ").unwrap();
        let p = IntegerPolynomial::new(coefficients.split(' ').map(|c| c.parse().unwrap()).collect());
        let discs = check(&p, 100);
        let mut free: Vec<&RootDisc> = discs.iter().collect();
        for value in values.split(' ') {
            let (re, im) = value.split_once(',').unwrap();
            let (re, im) = (decimal(re), decimal(im));
            let place = free.iter().position(|d| {
                let (dx, dy) = (rational(&d.re) - &re, rational(&d.im) - &im);
                // The printed value has 40 digits: more than 120 bits.
                let slack =
                    rational(&d.radius) + (re.abs() + im.abs()) / BigRational::from_integer(BigInt::from(1) << 120);
                dx.clone() * dx + dy.clone() * dy <= slack.clone() * slack
            });
            assert!(place.is_some(), "{value} of {line}");
            free.remove(place.unwrap());
        }
        assert!(free.is_empty());
    }
}

fn decimal(text: &str) -> BigRational {
    let (mantissa, exponent) = text.split_once('e').unwrap_or((text, "0"));
    let (whole, fraction) = mantissa.split_once('.').unwrap_or((mantissa, ""));
    let digits: BigInt = format!("{whole}{fraction}").parse().unwrap();
    let exponent = exponent.parse::<i32>().unwrap() - fraction.len() as i32;
    BigRational::from_integer(digits) * BigRational::from_integer(10.into()).pow(exponent)
}
