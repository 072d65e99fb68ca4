//! Formulas with unknown signs, widened zones, and bounds of leading parts.
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
use keepout_checker::certificate::{Factor, RootFamily, Sign};
use keepout_checker::formula::{IndexedFormula, claimed_formula, holds};
use keepout_checker::lead::{LeadForm, halves, whole_torus};
use keepout_checker::limits::Budget;
use keepout_checker::number::{Complex, Dyadic, Interval, Rational};
use keepout_checker::polynomial::Polynomial;
use keepout_checker::root::RootTable;
use keepout_checker::signs::SignSet;
use keepout_checker::statement::{Atom, Claim, Expression, Formula, Relation, Statement, Term, Variable};
use keepout_checker::trace::{ClosedForm, Stretch};
use sample::{DECAY, Source, certificate, contains, dyadic, exact, rational};
use std::cmp::Ordering;

const RELATIONS: [Relation; 6] = [
    Relation::Negative,
    Relation::NonPositive,
    Relation::Zero,
    Relation::NonNegative,
    Relation::Positive,
    Relation::NonZero,
];

const SIGNS: [Sign; 3] = [Ordering::Less, Ordering::Equal, Ordering::Greater];

fn variable(i: usize) -> Expression {
    Expression { terms: vec![Term { coefficient: rational("1"), powers: vec![(Variable::State(i), 1)] }] }
}

fn random_formula(source: &mut Source, depth: u32) -> Formula {
    let kind = source.signed(3);
    if depth == 0 || kind > 1 {
        let relation = RELATIONS[usize::try_from(source.signed(100) + 100).unwrap() % 6];
        let polynomial = variable(usize::try_from(source.signed(1) + 1).unwrap());
        return Formula::Atom(Atom { polynomial, relation });
    }
    let parts = (0..source.signed(1) + 2).map(|_| random_formula(source, depth - 1)).collect();
    if kind > -1 { Formula::And(parts) } else { Formula::Or(parts) }
}

/// The truth at a point, by the definition.
fn naive(formula: &Formula, point: &[Sign]) -> bool {
    match formula {
        Formula::And(parts) => parts.iter().all(|p| naive(p, point)),
        Formula::Or(parts) => parts.iter().any(|p| naive(p, point)),
        Formula::Atom(atom) => {
            let (Variable::State(i), _) = atom.polynomial.terms[0].powers[0] else { panic!() };
            holds(atom.relation, point[i])
        }
    }
}

#[test]
fn relations_hold_for_the_signs_of_their_numbers() {
    let rows = [
        (Relation::Negative, [true, false, false]),
        (Relation::NonPositive, [true, true, false]),
        (Relation::Zero, [false, true, false]),
        (Relation::NonNegative, [false, true, true]),
        (Relation::Positive, [false, false, true]),
        (Relation::NonZero, [true, false, true]),
    ];
    for (relation, expected) in rows {
        assert_eq!(SIGNS.map(|sign| holds(relation, sign)), expected, "{relation:?}");
    }
}

/// The sets of possible signs but the empty one.
fn sets() -> Vec<SignSet> {
    let [less, equal, greater] = SIGNS.map(SignSet::only);
    vec![SignSet::ANY, less, equal, greater, less.or(equal), equal.or(greater), less.or(greater)]
}

#[test]
fn a_truth_from_possible_signs_is_the_truth_for_each_choice_of_them() {
    let mut source = Source(10);
    let sets = sets();
    let mut decided = 0;
    for _ in 0..200 {
        let formula = random_formula(&mut source, 3);
        let indexed = IndexedFormula::new(&formula);
        for code in 0..343 {
            let known = [sets[code % 7], sets[code / 7 % 7], sets[code / 49]];
            let mut signs = vec![SignSet::ANY; indexed.polynomials.len()];
            for (i, set) in known.iter().enumerate() {
                if let Some(p) = indexed.polynomials.iter().position(|p| *p == variable(i)) {
                    signs[p] = *set;
                }
            }
            let Some(truth) = indexed.truth(&signs) else { continue };
            decided += 1;
            for a in known[0].members() {
                for b in known[1].members() {
                    for c in known[2].members() {
                        assert_eq!(naive(&formula, &[a, b, c]), truth, "{formula:?} at {a:?} {b:?} {c:?}");
                    }
                }
            }
        }
    }
    assert!(decided > 10_000, "{decided}");
}

#[test]
fn empty_conjunctions_are_true_and_empty_disjunctions_false() {
    let truth = |formula| IndexedFormula::new(&formula).truth(&[]);
    assert_eq!(truth(Formula::And(vec![])), Some(true));
    assert_eq!(truth(Formula::Or(vec![])), Some(false));
}

#[test]
fn margins_widen_single_comparisons_only() {
    let widened = |inside: Formula, margin: &str| {
        let mut statement: Statement = certificate(DECAY).statement;
        statement.zone.inside = inside;
        statement.claim = Claim::Never { margin: rational(margin) };
        claimed_formula(&statement)
    };
    let shifted = |constant: &str, relation| {
        let mut polynomial = variable(0);
        polynomial.terms.push(Term { coefficient: rational(constant), powers: vec![] });
        Formula::Atom(Atom { polynomial, relation })
    };
    let atom = |relation| Formula::Atom(Atom { polynomial: variable(0), relation });
    for relation in RELATIONS {
        assert_eq!(widened(atom(relation), "0"), Some(atom(relation)));
        let above = shifted("2", Relation::NonNegative);
        let below = shifted("-2", Relation::NonPositive);
        let expected = match relation {
            Relation::Positive | Relation::NonNegative => Some(above),
            Relation::Negative | Relation::NonPositive => Some(below),
            Relation::Zero => Some(Formula::And(vec![above, below])),
            Relation::NonZero => None,
        };
        assert_eq!(widened(atom(relation), "2"), expected);
    }
    // A constant that is there is moved, one that vanishes is dropped.
    assert_eq!(widened(shifted("-3", Relation::Positive), "3"), Some(atom(Relation::NonNegative)));
    assert_eq!(widened(Formula::And(vec![atom(Relation::Zero)]), "2"), None);
}

/// The closed form of exp(-t) / 2 + cos t, and its roots: -1, i.
fn wave_and_decay() -> ClosedForm {
    let polynomial = |c: &[&str]| Polynomial::new(c.iter().map(|x| rational(x)).collect());
    let families = [
        RootFamily { polynomial: polynomial(&["1", "1"]), centres: vec![(dyadic(-1, 0), dyadic(0, 0))] },
        RootFamily { polynomial: polynomial(&["1", "0", "1"]), centres: vec![(dyadic(0, 0), dyadic(1, 0))] },
    ];
    let mut budget = Budget::new(&Limits::default());
    let table = RootTable::new(&families, 128, &mut budget).unwrap();
    let factors = [0, 1].map(|family| Factor { family, multiplicity: 1 });
    let derivatives = ["3/2", "-1/2", "-1/2"].map(rational);
    ClosedForm::new(&factors, &derivatives, &table, 128, 0, &mut budget).unwrap()
}

#[test]
fn closed_forms_have_the_coefficients_of_partial_fractions() {
    let form = wave_and_decay();
    let found: Vec<&Complex> = form.terms.iter().map(|t| &t.coefficients[0]).collect();
    // cos t is twice the real part of exp(i t) / 2.
    for coefficient in found {
        assert!(contains(&coefficient.re, &rational("1/2")) && contains(&coefficient.im, &rational("0")));
    }
}

#[test]
fn lower_terms_are_bounded_by_their_value_at_the_start() {
    let form = wave_and_decay();
    let lead = |t0: &str| LeadForm::new(&form, &[(1, vec![1])], &dyadic(0, 0), &rational(t0), 0, 128).unwrap();
    // exp(-2) / 2 = 0.067667641618306345946...
    let rest = exact(lead("2").rest());
    assert!(rest >= rational("67667641618306345946/1000000000000000000000"), "not an upper bound");
    assert!(rest <= rational("67667641618306345947/1000000000000000000000") * rational("2"), "far too large");
    assert_eq!(lead("2").count(), 1);
}

#[test]
fn leading_parts_are_enclosed_on_boxes_of_angles() {
    let form = wave_and_decay();
    let lead = LeadForm::new(&form, &[(1, vec![1])], &dyadic(0, 0), &rational("2"), 0, 128).unwrap();
    let at = |angle: &str, radius: &str| lead.enclose(&vec![(rational(angle), rational(radius))]).unwrap();
    for i in 0..40 {
        // cos at the centre and the ends of a box, by the checker's own exponential at another precision.
        for part in ["-1/4", "0", "1/4"] {
            let angle = Rational::new(i.into(), 6.into()) + rational(part);
            let turn = Complex { re: Interval::integer(0), im: Interval::rational(&angle, 200) };
            let cosine = turn.exp(200).unwrap().re;
            let value = at(&Rational::new(i.into(), 6.into()).to_string(), "1/4");
            assert!(value.lo() <= cosine.hi() && cosine.lo() <= value.hi(), "box {i}");
        }
    }
    assert_eq!(at("0", "1/4").certain_sign(), Some(Ordering::Greater));
    assert_eq!(at("3", "1/4").certain_sign(), Some(Ordering::Less));
    assert_eq!(at("3/2", "1/4").certain_sign(), None);
}

#[test]
fn a_term_that_may_still_rise_or_lead_is_not_decided() {
    let form = wave_and_decay();
    // Said to lead: the decaying term. Then the wave is not certainly lower.
    assert!(LeadForm::new(&form, &[(0, vec![0])], &dyadic(-1, 0), &rational("2"), 0, 128).is_err());
    // A lower bound of the leading real part that does not exceed the lower one.
    assert!(LeadForm::new(&form, &[(1, vec![1])], &dyadic(-1, 0), &rational("2"), 0, 128).is_err());
}

#[test]
fn halved_boxes_cover_the_torus() {
    // 44/7 > 2 pi, since pi < 22/7; and 2 pi > 6.28, so that little is covered twice.
    let ends = |(centre, radius): &(Rational, Rational)| (centre - radius, centre + radius);
    let torus = whole_torus(2);
    assert_eq!(ends(&torus[0]), (rational("0"), rational("44/7")));
    let (lower, upper) = halves(&torus, 1).unwrap();
    assert_eq!(ends(&lower[1]), (rational("0"), rational("44/7") / rational("2")));
    assert_eq!(ends(&upper[1]), (rational("44/7") / rational("2"), rational("44/7")));
    assert_eq!((&lower[0], &upper[0]), (&torus[0], &torus[0]));
    assert_eq!(halves(&torus, 2), None);
}

#[test]
fn enclosures_over_a_stretch_contain_the_values_in_it() {
    let form = wave_and_decay();
    let value = |t: &Rational, bits: u32| {
        let exp = Complex::real(Interval::rational(&-t, bits)).exp(bits).unwrap().re.scale(-1);
        let turn = Complex { re: Interval::integer(0), im: Interval::rational(t, bits) };
        exp.add(&turn.exp(bits).unwrap().re, bits)
    };
    for (centre, half_width) in [("0", "1/2"), ("1", "1"), ("10", "1/8"), ("3", "0"), ("2", "4")] {
        let (centre, half_width) = (rational(centre), rational(half_width));
        for (order, bits) in [(1, 12), (3, 24), (8, 64), (30, 128)] {
            let stretch = Stretch { centre: &centre, half_width: &half_width, order, bits };
            let enclosure = form.enclose(stretch, &mut Budget::new(&Limits::default())).unwrap().unwrap();
            for part in ["-1", "-1/3", "0", "1/2", "1"] {
                let t = &centre + &half_width * rational(part);
                let truth = value(&t, 200);
                assert!(enclosure.lo() <= truth.hi() && truth.lo() <= enclosure.hi(), "t = {t}, order {order}");
            }
        }
    }
}

#[test]
fn quotients_by_a_power_of_time_contain_their_values() {
    // g = exp(-t) / 2 + cos t - 3/2 + t / 2 has a zero of order 2 at 0.
    let polynomial = |c: &[&str]| Polynomial::new(c.iter().map(|x| rational(x)).collect());
    let real = |x| vec![(dyadic(x, 0), dyadic(0, 0))];
    let families = [
        RootFamily { polynomial: polynomial(&["1", "1"]), centres: real(-1) },
        RootFamily { polynomial: polynomial(&["1", "0", "1"]), centres: vec![(dyadic(0, 0), dyadic(1, 0))] },
        RootFamily { polynomial: polynomial(&["0", "1"]), centres: real(0) },
    ];
    let mut budget = Budget::new(&Limits::default());
    let table = RootTable::new(&families, 128, &mut budget).unwrap();
    let factors = [(0, 1), (1, 1), (2, 2)].map(|(family, multiplicity)| Factor { family, multiplicity });
    let derivatives = ["0", "0", "-1/2", "-1/2", "3/2"].map(rational);
    let form = ClosedForm::new(&factors, &derivatives, &table, 128, 0, &mut budget).unwrap();
    let (centre, half_width) = (rational("0"), rational("1/2"));
    let stretch = Stretch { centre: &centre, half_width: &half_width, order: 12, bits: 128 };
    let quotient = form.quotient(2, stretch, &mut budget).unwrap().unwrap();
    for t in ["1/100", "1/4", "1/2", "-1/2"] {
        let t = rational(t);
        let exp = Complex::real(Interval::rational(&-&t, 200)).exp(200).unwrap().re.scale(-1);
        let turn = Complex { re: Interval::integer(0), im: Interval::rational(&t, 200) }.exp(200).unwrap().re;
        let line = Interval::rational(&(&t / rational("2") - rational("3/2")), 200);
        let truth = exp.add(&turn, 200).add(&line, 200).mul(&Interval::rational(&(&t * &t).recip(), 200), 200);
        assert!(quotient.lo() <= truth.hi() && truth.lo() <= quotient.hi(), "t = {t}");
    }
    // At 0 the quotient is g''(0) / 2.
    assert!(contains(&quotient, &rational("-1/4")));
    assert_eq!(quotient.certain_sign(), Some(Ordering::Less));
    let zero_width = Stretch { half_width: &centre, ..stretch };
    assert_eq!(form.quotient(2, zero_width, &mut budget).unwrap(), None);
    assert_eq!(form.quotient(12, stretch, &mut budget).unwrap(), None);
    assert!(Dyadic::zero() > *quotient.hi());
}
