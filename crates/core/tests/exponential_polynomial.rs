//! The ring of exponential polynomials: identities, cancellations, exact coefficients, dominance, enclosures.

use keepout_checker::number::{Complex, Dyadic, Interval};
use keepout_core::ToRational;
use keepout_core::structure::Evidence;
use keepout_core::{CoreError, ExponentialPolynomial, IntegerPolynomial, RationalMatrix, enclose_exponential};
use num_bigint::BigInt;
use num_rational::BigRational;
use proptest::prelude::*;

fn ratio(p: i64, q: i64) -> BigRational {
    BigRational::new(p.into(), q.into())
}

fn constant(p: i64) -> ExponentialPolynomial {
    ExponentialPolynomial::constant(ratio(p, 1))
}

fn exp(p: i64, q: i64) -> ExponentialPolynomial {
    ExponentialPolynomial::exponential(&ratio(p, q))
}

#[test]
fn squares_of_cosine_and_sine_add_to_one() {
    for w in [ratio(1, 1), ratio(3, 7), ratio(22, 5)] {
        let (c, s) = (ExponentialPolynomial::cosine(&w), ExponentialPolynomial::sine(&w));
        assert_eq!(&c.power(2) + &s.power(2), constant(1));
        assert_eq!(
            &(&(&s * &c) * &constant(2)) - &ExponentialPolynomial::sine(&(w * ratio(2, 1))),
            ExponentialPolynomial::zero()
        );
    }
}

#[test]
fn exponents_that_cancel_disappear_from_the_annihilator() {
    let sum = &exp(-1, 2) + &exp(3, 1);
    assert_eq!(sum.annihilator(), IntegerPolynomial::from_small(&[-3, -5, 2]));
    assert_eq!((&sum - &exp(3, 1)), exp(-1, 2));
    assert_eq!(&exp(-1, 2) * &exp(1, 2), constant(1));
    assert!((&sum - &sum).is_zero());
    assert_eq!(ExponentialPolynomial::zero().annihilator(), IntegerPolynomial::one());
}

#[test]
fn powers_of_time_multiply() {
    let t = ExponentialPolynomial::time();
    let cube = t.power(3);
    assert_eq!(cube.order(), 4);
    assert_eq!(cube.derivatives(6), [0, 0, 0, 6, 0, 0].map(|v| ratio(v, 1)));
    assert_eq!(cube.derivative(), &t.power(2) * &constant(3));
    assert_eq!((&t * &exp(-2, 3)).annihilator(), IntegerPolynomial::from_small(&[4, 12, 9]));
}

#[test]
fn coefficients_of_a_defective_trace_are_exact() {
    // Ward's example 1, entry (1, 2): 2t e^3t/3 + 4 e^6t/9 - 4 e^3t/9.
    let a = RationalMatrix::from_integers(&[vec![4, 2, 0], vec![1, 4, 1], vec![1, 1, 4]]).unwrap();
    let unit = |k: usize| (0..3).map(|i| ratio(i64::from(i == k), 1)).collect::<Vec<_>>();
    let g = ExponentialPolynomial::trace(&a, &unit(0), &unit(1)).unwrap();
    let found: Vec<_> = g.coefficients().iter().map(|c| (c.factor.to_string(), c.power, c.element())).collect();
    let expected = [
        ("z - 6".to_string(), 0, vec![ratio(4, 9)]),
        ("z - 3".to_string(), 0, vec![ratio(-4, 9)]),
        ("z - 3".to_string(), 1, vec![ratio(2, 3)]),
    ];
    assert_eq!(found, expected);
}

#[test]
fn lower_coefficient_that_vanishes_at_one_root_only_is_recognised() {
    // t (e^t + e^2t) + e^t: the factor (z-1)(z-2) has multiplicity 2, the coefficient of t^0 vanishes at 2 only.
    let t = ExponentialPolynomial::time();
    let g = &(&t * &(&exp(1, 1) + &exp(2, 1))) + &exp(1, 1);
    assert_eq!(g.factors(), [(IntegerPolynomial::from_small(&[2, -3, 1]), 2)]);
    let coefficients = g.coefficients();
    assert_eq!(coefficients[0].vanishing, IntegerPolynomial::from_small(&[-2, 1]));
    assert!(coefficients[1].vanishing.is_constant());
    assert_eq!(coefficients[0].element(), [ratio(2, 1), ratio(-1, 1)]);
    let discs = keepout_core::enclose_roots(&g.factors()[0].0, 40).unwrap();
    assert_eq!(discs.iter().map(|d| coefficients[0].vanishes_at(d, 40)).collect::<Vec<_>>(), [Some(false), Some(true)]);
    let order: Vec<_> =
        g.dominance(40, 400).unwrap().iter().map(|c| (c.rate.rational.clone().unwrap(), c.power)).collect();
    assert_eq!(order, [(ratio(2, 1), 1), (ratio(1, 1), 1), (ratio(1, 1), 0)]);
}

#[test]
fn dominance_of_damped_oscillation_joins_equal_rates() {
    // e^-t (cos 2t + cos 3t) + t^2 e^-2t + 1/10^9: lead is the constant.
    let damped =
        &exp(-1, 1) * &(&ExponentialPolynomial::cosine(&ratio(2, 1)) + &ExponentialPolynomial::cosine(&ratio(3, 1)));
    let small = &ExponentialPolynomial::time().power(2) * &exp(-2, 1);
    let g = &(&damped + &small) + &ExponentialPolynomial::constant(ratio(1, 1_000_000_000));
    let order = g.dominance(64, 512).unwrap();
    let facts: Vec<_> =
        order.iter().map(|c| (c.exponents.len(), c.power, c.rate.rational.clone(), c.rate.equality)).collect();
    let expected = [(1, 0, 0), (2, 0, -1), (1, 2, -2)].map(|(k, j, r)| (k, j, Some(ratio(r, 1)), Evidence::Proved));
    assert_eq!(facts, expected);
}

#[test]
fn orders_that_do_not_match_are_refused() {
    let m = IntegerPolynomial::from_small(&[1, 0, 1]);
    assert!(matches!(
        ExponentialPolynomial::new(&m, &[ratio(1, 1)]),
        Err(CoreError::Shape { expected: 2, found: 1, .. })
    ));
    // A larger annihilator than needed is reduced: cosine under z (z^2 + 1).
    let padded =
        ExponentialPolynomial::new(&IntegerPolynomial::from_small(&[0, 1, 0, 1]), &[1, 0, -1].map(|v| ratio(v, 1)))
            .unwrap();
    assert_eq!(padded, ExponentialPolynomial::cosine(&ratio(1, 1)));
}

#[test]
fn late_times_cost_no_accuracy() {
    let g = &ExponentialPolynomial::cosine(&ratio(1, 1)) + &exp(-1, 1);
    let t = 1_000_000;
    let value = g.closed_form(64).unwrap().enclose(&Interval::integer(t)).unwrap();
    let exact = Complex { re: Interval::integer(0), im: Interval::integer(t) }.exp(200).unwrap().re;
    assert!(!value.is_disjoint(&exact));
    let width = value.hi().to_rational().unwrap() - value.lo().to_rational().unwrap();
    assert!(width < ratio(1, 1 << 60));
}

fn leaf() -> impl Strategy<Value = ExponentialPolynomial> {
    let rate = (-6i64..6, 1i64..4).prop_map(|(p, q)| ratio(p, q));
    prop_oneof![
        rate.clone().prop_map(|r| ExponentialPolynomial::exponential(&r)),
        rate.clone().prop_map(|r| ExponentialPolynomial::cosine(&r)),
        rate.clone().prop_map(|r| ExponentialPolynomial::sine(&r)),
        rate.prop_map(ExponentialPolynomial::constant),
        Just(ExponentialPolynomial::time()),
    ]
}

fn sum_of_products() -> impl Strategy<Value = ExponentialPolynomial> {
    prop::collection::vec((leaf(), leaf(), -3i64..4), 1..4).prop_map(|terms| {
        terms.iter().fold(ExponentialPolynomial::zero(), |sum, (a, b, c)| &sum + &(&(a * b) * &constant(*c)))
    })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn ring_laws_hold(a in sum_of_products(), b in leaf(), c in leaf()) {
        prop_assert_eq!(&(&a + &b) * &c, &(&a * &c) + &(&b * &c));
        prop_assert_eq!(&a * &b, &b * &a);
        prop_assert_eq!((&a * &b).derivative(), &(&a.derivative() * &b) + &(&a * &b.derivative()));
        prop_assert!((&a - &a).is_zero());
    }

    #[test]
    fn closed_form_agrees_with_the_series_of_derivatives(g in sum_of_products()) {
        // Near 0 the Taylor polynomial with 30 exact derivatives is accurate: |g^(k)| <= C 40^k here.
        let t = ratio(1, 64);
        let derivatives = g.derivatives(40);
        let mut term = ratio(1, 1);
        let mut sum = ratio(0, 1);
        for (k, y) in derivatives.iter().enumerate() {
            if k > 0 {
                term = term * &t / ratio(k as i64, 1);
            }
            sum += y * &term;
        }
        let point = Interval::point(Dyadic::power_of_two(-6));
        let value = g.closed_form(80).unwrap().enclose(&point).unwrap();
        let slack = BigRational::new(1.into(), BigInt::from(1) << 70);
        prop_assert!(value.lo().to_rational().unwrap() <= &sum + &slack && value.hi().to_rational().unwrap() >= &sum - &slack);
        let slope = g.closed_form(80).unwrap().derivative().enclose(&point).unwrap();
        let other = g.derivative().closed_form(80).unwrap().enclose(&point).unwrap();
        prop_assert!(!slope.is_disjoint(&other));
    }

    #[test]
    fn enclosure_over_an_interval_contains_the_points(g in sum_of_products(), start in 0i64..200, length in 1i64..60, place in 0i64..=10) {
        let dyadic = |p: i64| Dyadic::new(BigInt::from(p), -8);
        let form = g.closed_form(60).unwrap();
        let wide = form.enclose(&Interval::hull(dyadic(10 * start), dyadic(10 * start + 10 * length))).unwrap();
        let point = form.enclose(&Interval::point(dyadic(10 * start + place * length))).unwrap();
        prop_assert!(!wide.is_disjoint(&point));
    }

    #[test]
    fn traces_agree_with_the_matrix_exponential(rows in prop::collection::vec(prop::collection::vec(-4i64..5, 4), 4), h in prop::collection::vec(-3i64..4, 4), t in 1i64..5) {
        let a = RationalMatrix::from_integers(&rows).unwrap();
        let h: Vec<_> = h.into_iter().map(|v| ratio(v, 1)).collect();
        let start: Vec<_> = [1, -1, 2, 0].map(|v| ratio(v, 1)).to_vec();
        let g = ExponentialPolynomial::trace(&a, &h, &start).unwrap();
        let exp = enclose_exponential(&a, &ratio(t, 4), 60).unwrap();
        let x = exp.apply(&start.iter().map(|v| Interval::rational(v, 100)).collect::<Vec<_>>(), 200).unwrap();
        let expected = h.iter().zip(&x).fold(Interval::integer(0), |s, (c, x)| s.add(&x.mul(&Interval::rational(c, 100), 200), 200));
        let value = g.closed_form(60).unwrap().enclose(&Interval::rational(&ratio(t, 4), 100)).unwrap();
        prop_assert!(!value.is_disjoint(&expected));
        // Coefficients: exact elements lie in the enclosures of the closed form.
        let form = g.closed_form(60).unwrap();
        for c in g.coefficients() {
            let element = c.element();
            for term in form.terms().iter().filter(|t| g.factors()[t.factor].0 == c.factor && t.power == c.power) {
                let mu = term.exponent.enclose();
                let value = element.iter().rev().fold(Complex::zero(), |v, r| v.mul(&mu, 200).add(&Complex::real(Interval::rational(r, 200)), 200));
                prop_assert!(!value.re.is_disjoint(&term.coefficient.re) && !value.im.is_disjoint(&term.coefficient.im));
            }
        }
    }
}
