//! Suprema of unit step responses: a limit just above is clear for all time, just below is passed.
//!
//! Sources: Bessel and Butterworth low-pass polynomials (any filter handbook); ITAE forms: Graham & Lathrop, Trans. AIEE 72 II (1953);
//! second order: overshoot exp(-pi z / sqrt(1 - z^2)), e.g. Ogata, Modern Control Engineering, 5e, sec. 5-3 (from memory). The
//! suprema were computed with python-flint, see reference/derive.py.

use keepout_checker::number::Rational;
use keepout_checker::statement::{Atom, Claim, Expression, Formula, Relation, Term, Variable};
use keepout_synthesis::{Options, Outcome, certify};
use keepout_tests::reference::{bounds, group, list};
use keepout_tests::system::{System, rational};

fn at_least(limit: &Rational) -> Formula {
    let terms = vec![
        Term { coefficient: rational("1"), powers: vec![(Variable::State(0), 1)] },
        Term { coefficient: -limit, powers: vec![] },
    ];
    Formula::Atom(Atom { polynomial: Expression { terms }, relation: Relation::NonNegative })
}

#[test]
fn limits_a_billionth_above_and_below_the_supremum_are_told_apart() {
    let cases = group("step_responses");
    assert_eq!(cases.len(), 17);
    for case in cases {
        let system = System::step_response(&list(&case["denominator"]));
        let (low, high) = bounds(&case["supremum"]);
        let billionth = rational("1/1000000000");
        let above =
            certify(&system.statement(at_least(&(&high * (rational("1") + &billionth)))), &Options::default()).unwrap();
        let Outcome::Clear { margin: Some(margin), .. } = above else { panic!("{}: not clear", case["name"]) };
        // The margin is a billionth of the supremum: certified from below, to a millionth of it.
        let exact = &low * &billionth;
        assert!(margin.certified <= &high * &billionth + (&high - &low), "{}: margin too large", case["name"]);
        assert!(
            margin.certified >= exact * rational("999999/1000000"),
            "{}: margin {} too small",
            case["name"],
            margin.certified
        );
        let below =
            certify(&system.statement(at_least(&(&low * (rational("1") - &billionth)))), &Options::default()).unwrap();
        assert!(matches!(below, Outcome::Enters { .. }), "{}: not entered", case["name"]);
    }
}

#[test]
fn the_supremum_is_reached_at_the_time_of_the_first_peak() {
    for case in group("step_responses") {
        let system = System::step_response(&list(&case["denominator"]));
        let (low, _) = bounds(&case["supremum"]);
        let outcome =
            certify(&system.statement(at_least(&(&low - rational("1/1000000000000")))), &Options::default()).unwrap();
        let Outcome::Enters { proof } = outcome else { panic!("{}: not entered", case["name"]) };
        let Claim::Enters { from, to, first } = &proof.statement().claim else { panic!() };
        let (earliest, latest) = bounds(&case["time"]);
        assert!(
            first & (*to <= latest) & (*from >= earliest * rational("9999/10000")),
            "{}: {from} {to}",
            case["name"]
        );
        assert!((to - from) <= to * rational("1/1000000000"), "{}: the bracket is too wide", case["name"]);
    }
}
