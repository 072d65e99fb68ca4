//! Polynomials against naive evaluation, and discs of roots: what is proved, and what is refused.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::indexing_slicing,
    clippy::default_numeric_fallback,
    clippy::as_conversions,
    reason = "a test fails by panicking"
)]

mod sample;

use keepout_checker::Limits;
use keepout_checker::certificate::{Factor, RootFamily, RootRef};
use keepout_checker::error::{Obligation, Rejection, Rule};
use keepout_checker::limits::Budget;
use keepout_checker::number::{Complex, Dyadic, Interval, Rational};
use keepout_checker::polynomial::Polynomial;
use keepout_checker::root::RootTable;
use sample::{Source, contains, dyadic, exact, rational, value};

fn polynomial(coefficients: &str) -> Polynomial {
    Polynomial::new(coefficients.split_whitespace().map(rational).collect())
}

/// The monic polynomial with these roots.
fn with_roots(roots: &[Rational]) -> Polynomial {
    let factor = |r: &Rational| Polynomial::new(vec![-r, rational("1")]);
    roots.iter().fold(Polynomial::one(), |product, r| product.mul(&factor(r)))
}

fn family(coefficients: &str, centres: &[(Dyadic, Dyadic)]) -> RootFamily {
    RootFamily { polynomial: polynomial(coefficients), centres: centres.to_vec() }
}

fn table(families: &[RootFamily], bits: u32) -> Result<RootTable, Rejection> {
    RootTable::new(families, bits, &mut Budget::new(&Limits::default()))
}

fn not_separated(position: usize) -> Rejection {
    Rejection::Inconclusive { rule: Rule::Trace, obligation: Obligation::RootsAreSeparated, position }
}

const ONE: (i64, i64) = (1, 0);

fn at(re: (i64, i64), im: (i64, i64)) -> (Dyadic, Dyadic) {
    (dyadic(re.0, re.1), dyadic(im.0, im.1))
}

#[test]
fn products_powers_and_reflections_agree_with_values() {
    let mut source = Source(6);
    for _ in 0..200 {
        let mut random = || Polynomial::new((0..5).map(|_| source.rational()).collect());
        let (p, q) = (random(), random());
        let (x, c) = (source.rational(), source.rational());
        assert_eq!(value(&p.mul(&q), &x), value(&p, &x) * value(&q, &x));
        assert_eq!(value(&p.power(3), &x), value(&p, &x).pow(3));
        assert_eq!(value(&p.reflected(&c), &x), value(&p, &(&c - &x)));
    }
}

#[test]
fn power_sums_are_those_of_the_roots() {
    let mut source = Source(7);
    for degree in 1..6 {
        let roots: Vec<Rational> = (0..degree).map(|_| source.rational()).collect();
        let sums = with_roots(&roots).power_sums(9);
        for (k, sum) in sums.iter().enumerate() {
            let naive: Rational = roots.iter().map(|r| r.pow(i32::try_from(k).unwrap())).sum();
            assert_eq!(*sum, naive, "power sum {k} of {roots:?}");
        }
    }
}

#[test]
fn taylor_coefficients_contain_the_exact_ones() {
    let mut source = Source(8);
    for _ in 0..100 {
        let coefficients: Vec<Rational> = (0..6).map(|_| source.rational()).collect();
        let p = Polynomial::new(coefficients.clone());
        let at = source.rational();
        for bits in [4, 12, 64] {
            let row = p.taylor(&Complex::real(Interval::rational(&at, bits)), 8, bits);
            assert_eq!(row.len(), 8);
            for (k, enclosure) in row.iter().enumerate() {
                // sum_i c_i binom(i, k) at^(i-k)
                let mut truth = rational("0");
                for (i, c) in coefficients.iter().enumerate().skip(k) {
                    let binomial = (0..k).fold(rational("1"), |b, j| {
                        b * Rational::from_integer((i - j).into()) / Rational::from_integer((j + 1).into())
                    });
                    truth += c * binomial * at.pow(i32::try_from(i - k).unwrap());
                }
                assert!(contains(&enclosure.re, &truth), "coefficient {k} of {p:?} at {at}, {bits} bits");
            }
        }
    }
}

#[test]
fn discs_enclose_the_square_roots_of_two() {
    let roots = [at((-181, -7), (0, 0)), at((181, -7), (0, 0))];
    for bits in [16, 64, 200] {
        let table = table(&[family("-2 0 1", &roots)], bits).unwrap();
        for root in table.roots() {
            assert!(root.is_real);
            let [low, high] = [root.value.re.lo(), root.value.re.hi()].map(exact);
            let squares = [&low * &low, &high * &high];
            assert!(squares.iter().min().unwrap() < &rational("2") && squares.iter().max().unwrap() > &rational("2"));
        }
    }
}

#[test]
fn conjugate_pairs_are_told_from_real_roots() {
    let table = table(&[family("-1 1 -1 1", &[at(ONE, (0, 0)), at((1, -9), ONE)])], 64).unwrap();
    let kinds: Vec<bool> = table.roots().iter().map(|r| r.is_real).collect();
    assert_eq!(kinds, [true, false]);
    assert!(contains(&table.roots()[1].value.re, &rational("0")));
    assert!(contains(&table.roots()[1].value.im, &rational("1")));
    let conjugate = table.get(RootRef { index: 1, conjugate: true }).unwrap();
    assert!(contains(&conjugate.value.im, &rational("-1")));
}

#[test]
fn poor_centres_cost_width_and_wrong_ones_are_refused() {
    // z^2 - 1: discs of radius 2 |W| around +-a, W = (a^2 - 1) / (2 a).
    let pair = |a: (i64, i64)| [family("-1 0 1", &[at((-a.0, a.1), (0, 0)), at(a, (0, 0))])];
    let good = table(&pair(ONE), 64).unwrap();
    let poor = table(&pair((9, -3)), 64).unwrap();
    for (g, p) in good.roots().iter().zip(poor.roots()) {
        assert!(p.value.re.lo() < g.value.re.lo() && p.value.re.hi() > g.value.re.hi());
    }
    let elsewhere = [family("-1 0 1", &[at((3, 0), (0, 0)), at((5, 0), (0, 0))])];
    assert_eq!(table(&elsewhere, 64).unwrap_err(), not_separated(0));
    // Real centres for roots that are not real; a pair for real roots.
    let real = [family("1 0 1", &[at((-1, 0), (0, 0)), at(ONE, (0, 0))])];
    assert_eq!(table(&real, 64).unwrap_err(), not_separated(0));
    let pair = [family("-1 0 1", &[at((0, 0), ONE)])];
    assert_eq!(table(&pair, 64).unwrap_err(), not_separated(0));
}

#[test]
fn double_roots_are_refused() {
    // (z - 1)^2, with equal and with different centres.
    for offset in [0, 1, 1 << 20] {
        let centres = [at(((1 << 30) - offset, -30), (0, 0)), at(((1 << 30) + offset, -30), (0, 0))];
        assert_eq!(table(&[family("1 -2 1", &centres)], 64).unwrap_err(), not_separated(0));
        let pair = [at(ONE, (offset, -30))];
        if offset > 0 {
            assert_eq!(table(&[family("1 -2 1", &pair)], 64).unwrap_err(), not_separated(0));
        }
    }
}

#[test]
fn families_that_share_a_root_are_refused() {
    let first = family("-1 0 1", &[at((-1, 0), (0, 0)), at(ONE, (0, 0))]);
    let second = family("-1 1", &[at(ONE, (0, 0))]);
    assert!(table(std::slice::from_ref(&first), 64).is_ok());
    assert_eq!(table(&[first, second], 64).unwrap_err(), not_separated(0));
}

#[test]
fn roots_close_together_need_the_bits() {
    // (z - 1)(z - 1 - 2^-40)
    let gap = "1/1099511627776";
    let (a, b) = (rational("1"), rational("1") + rational(gap));
    let families = [RootFamily {
        polynomial: with_roots(&[a, b]),
        centres: vec![at(ONE, (0, 0)), (dyadic((1 << 40) + 1, -40), dyadic(0, 0))],
    }];
    assert_eq!(table(&families, 20).unwrap_err(), not_separated(0));
    assert!(table(&families, 120).is_ok());
}

#[test]
fn real_parts_on_a_line_are_proved_and_a_moved_line_is_not() {
    // z^2 + 2 z + 5: -1 +- 2 i; z^2 - 2: on no common vertical line.
    let table = table(
        &[family("5 2 1", &[at((-1, 0), (2, 0))]), family("-2 0 1", &[at((-181, -7), (0, 0)), at((181, -7), (0, 0))])],
        64,
    )
    .unwrap();
    assert_eq!(table.is_on_line(0, &rational("-1"), 64), Some(true));
    assert_eq!(table.is_on_line(0, &rational("-1000001/1000000"), 64), Some(false));
    // z^2 - 2 is symmetric about 0, but its roots change places.
    assert_eq!(table.is_on_line(1, &rational("0"), 64), None);
    assert_eq!(table.is_on_line(9, &rational("0"), 64), None);
}

#[test]
fn candidates_are_the_roots_that_a_value_can_be() {
    let table = table(&[family("1 0 1", &[at((0, 0), ONE)]), family("4 0 1", &[at((0, 0), (2, 0))])], 64).unwrap();
    let both = [0, 1].map(|family| Factor { family, multiplicity: 1 });
    let value = |im: &str| Complex { re: Interval::integer(0), im: Interval::rational(&rational(im), 64) };
    assert_eq!(table.candidates(&value("2"), &both), [RootRef { index: 1, conjugate: false }]);
    assert_eq!(table.candidates(&value("-1"), &both), [RootRef { index: 0, conjugate: true }]);
    assert_eq!(table.candidates(&value("2"), &both[..1]), []);
    assert_eq!(table.candidates(&value("3/2"), &both), []);
}
