//! Relative motion about a circular orbit (Clohessy-Wiltshire equations, textbook): spheres just inside and just outside the closest approach.
//!
//! The least distances were computed with python-flint, see reference/relative_motion.py.

use keepout_checker::number::Rational;
use keepout_checker::statement::{Atom, Expression, Formula, Relation, Term, Variable};
use keepout_synthesis::{Options, Outcome, certify};
use keepout_tests::reference::{bounds, group, list};
use keepout_tests::system::{System, rational};
use serde_json::Value;

/// |position - centre|^2 <= square, the positions being the first three states.
fn within(centre: &[Rational], square: &Rational) -> Formula {
    let mut constant = -square;
    let mut terms = Vec::new();
    for (i, c) in centre.iter().enumerate() {
        terms.push(Term { coefficient: rational("1"), powers: vec![(Variable::State(i), 2)] });
        terms.push(Term { coefficient: c * rational("-2"), powers: vec![(Variable::State(i), 1)] });
        constant += c * c;
    }
    terms.push(Term { coefficient: constant, powers: vec![] });
    terms.retain(|t| t.coefficient != rational("0"));
    Formula::Atom(Atom { polynomial: Expression { terms }, relation: Relation::NonPositive })
}

fn system(case: &Value) -> System {
    let a: Vec<Vec<Rational>> = case["a"].as_array().unwrap().iter().map(list).collect();
    System { c: vec![rational("0"); a.len()], a, start: list(&case["start"]) }
}

#[test]
fn spheres_a_millionth_smaller_and_larger_than_the_closest_approach_are_told_apart() {
    let cases = group("relative_motion");
    assert_eq!(cases.len(), 8);
    for case in cases {
        let (low, high) = bounds(&case["distance_squared"]);
        let centre = list(&case["centre"]);
        let options = Options { margin: false, ..Options::default() };
        let smaller = system(&case).statement(within(&centre, &(low * rational("999999/1000000"))));
        let outcome = certify(&smaller, &options).unwrap();
        assert!(matches!(outcome, Outcome::Clear { .. }), "{case}: {outcome:?}");
        let larger = system(&case).statement(within(&centre, &(high * rational("1000001/1000000"))));
        let outcome = certify(&larger, &options).unwrap();
        assert!(matches!(outcome, Outcome::Enters { .. }), "{case}: {outcome:?}");
    }
}
