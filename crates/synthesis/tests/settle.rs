//! First whole cases: each verdict from a statement built by hand.

use keepout_checker::statement::*;
use keepout_synthesis::{Options, Outcome, certify};

fn q(text: &str) -> Rational {
    let (p, q) = text.split_once('/').unwrap_or((text, "1"));
    Rational::new(p.parse().unwrap(), q.parse().unwrap())
}

/// x' = A x + c from x0, zone p rel 0 with p a list of (coefficient, powers of the states).
fn statement(a: &[&[&str]], c: &[&str], x0: &[&str], p: &[(&str, &[u32])], relation: Relation) -> Statement {
    let states = x0.iter().enumerate().map(|(i, s)| State { name: format!("x{i}"), unit: None, start: q(s) }).collect();
    let rates = a
        .iter()
        .zip(c)
        .map(|(row, c)| Affine {
            terms: row
                .iter()
                .enumerate()
                .filter(|(_, v)| **v != "0")
                .map(|(j, v)| (q(v), Variable::State(j)))
                .collect(),
            offset: q(c),
        })
        .collect();
    let terms = p
        .iter()
        .map(|(c, powers)| Term {
            coefficient: q(c),
            powers: powers.iter().enumerate().filter(|(_, k)| **k > 0).map(|(i, k)| (Variable::State(i), *k)).collect(),
        })
        .collect();
    Statement {
        title: "case".into(),
        states,
        starts: Starts::One,
        disturbances: Vec::new(),
        uncertain: Vec::new(),
        drives: vec![],
        outputs: vec![],
        exponentials: Vec::new(),
        phases: vec![Phase { rates, uncertain: vec![] }],
        zone: Zone {
            name: "zone".into(),
            reference: None,
            inside: Formula::Atom(Atom { polynomial: Expression { terms }, relation }),
            from: q("0"),
            until: None,
        },
        claim: Claim::Never { margin: q("0") },
    }
}

fn word(s: &Statement) -> String {
    match certify(s, &Options::default()).unwrap() {
        Outcome::Clear { margin, .. } => format!("clear {:?}", margin.map(|m| m.certified.to_string())),
        Outcome::Enters { proof } => format!("enters {:?}", proof.statement().claim),
        Outcome::Unsettled { reason, .. } => format!("unsettled {reason:?}"),
        Outcome::Inseparable { .. } | Outcome::Eventually { .. } => "about the cone".into(),
    }
}

#[test]
fn step_response_overshoot_is_told_from_both_sides() {
    // s^2+6s+25, step: sup y = 1 + exp(-3 pi/4) = 1.0947802248421...
    let a: &[&[&str]] = &[&["0", "1"], &["-25", "-6"]];
    for (limit, verdict) in [
        ("-1095/1000", "clear"),
        ("-10947802259/10000000000", "clear"),
        ("-10947802237/10000000000", "enters"),
        ("-1", "enters"),
    ] {
        let s = statement(a, &["0", "25"], &["0", "0"], &[("1", &[1, 0]), (limit, &[])], Relation::NonNegative);
        assert!(word(&s).starts_with(verdict));
    }
}

#[test]
fn touches_at_the_start_are_exact() {
    let decay: &[&[&str]] = &[&["-1"]];
    let p: &[(&str, &[u32])] = &[("1", &[1]), ("-1", &[])];
    assert!(word(&statement(decay, &["0"], &["1"], p, Relation::Positive)).starts_with("clear"));
    assert!(word(&statement(decay, &["0"], &["1"], p, Relation::NonNegative)).starts_with("enters"));
    let growth: &[&[&str]] = &[&["1"]];
    assert!(word(&statement(growth, &["0"], &["1"], p, Relation::Positive)).starts_with("enters"));
}

#[test]
fn rotations_are_settled() {
    let a: &[&[&str]] = &[&["0", "1"], &["-1", "0"]];
    let p: &[(&str, &[u32])] = &[("1", &[1, 0]), ("-2", &[])];
    assert!(word(&statement(a, &["0", "0"], &["1", "0"], p, Relation::NonNegative)).starts_with("clear"));
    let p: &[(&str, &[u32])] = &[("1", &[2, 0]), ("1", &[0, 2]), ("-1", &[])];
    assert!(word(&statement(a, &["0", "0"], &["1", "0"], p, Relation::Positive)).starts_with("clear"));
    assert!(word(&statement(a, &["0", "0"], &["1", "0"], p, Relation::Zero)).starts_with("enters"));
    let a: &[&[&str]] = &[&["0", "1", "0", "0"], &["-1", "0", "0", "0"], &["0", "0", "0", "1"], &["0", "0", "-2", "0"]];
    let p: &[(&str, &[u32])] = &[("1", &[1, 0, 0, 0]), ("1", &[0, 0, 1, 0]), ("-201/100", &[])];
    assert!(word(&statement(a, &["0"; 4], &["1", "0", "1", "0"], p, Relation::NonNegative)).starts_with("clear"));
    let p: &[(&str, &[u32])] = &[("1", &[1, 0, 1, 0]), ("-101/100", &[])];
    assert!(word(&statement(a, &["0"; 4], &["1", "0", "1", "0"], p, Relation::NonNegative)).starts_with("clear"));
    let p: &[(&str, &[u32])] = &[("1", &[1, 0, 0, 0]), ("1", &[0, 0, 1, 0]), ("-199/100", &[])];
    assert!(word(&statement(a, &["0"; 4], &["1/2", "0", "3/2", "0"], p, Relation::NonNegative)).starts_with("enters"));
}

#[test]
fn polynomial_times_exponential_touches_are_exact() {
    // x = (t-2)^2/2 exp(-t): companion of (z+1)^3.
    let a: &[&[&str]] = &[&["0", "1", "0"], &["0", "0", "1"], &["-1", "-3", "-3"]];
    // x(0) = 2, x' = -2 - 2 = -4, x'' = 2 + 4 + 1 = 7
    let p: &[(&str, &[u32])] = &[("1", &[1, 0, 0])];
    assert!(word(&statement(a, &["0"; 3], &["2", "-4", "7"], p, Relation::Negative)).starts_with("clear"));
    assert!(word(&statement(a, &["0"; 3], &["2", "-4", "7"], p, Relation::NonPositive)).starts_with("enters"));
}

/// Clohessy-Wiltshire motion with mean motion 1/1000 (textbook equations, from memory), keep-out sphere of radius r.
fn relative_motion(x0: &[&str], r2: &str) -> Statement {
    let a: &[&[&str]] = &[
        &["0", "0", "0", "1", "0", "0"],
        &["0", "0", "0", "0", "1", "0"],
        &["0", "0", "0", "0", "0", "1"],
        &["3/1000000", "0", "0", "0", "1/500", "0"],
        &["0", "0", "0", "-1/500", "0", "0"],
        &["0", "0", "-1/1000000", "0", "0", "0"],
    ];
    let p: &[(&str, &[u32])] = &[("1", &[2]), ("1", &[0, 2]), ("1", &[0, 0, 2]), (r2, &[])];
    statement(a, &["0"; 6], x0, p, Relation::NonPositive)
}

#[test]
fn relative_orbits_are_settled() {
    // Closed: y'(0) = -2 n x(0).
    assert!(word(&relative_motion(&["100", "0", "30", "0", "-1/5", "0"], "-2500")).starts_with("clear"));
    assert!(word(&relative_motion(&["100", "0", "30", "0", "-1/5", "0"], "-12000")).starts_with("enters"));
    // Drifting away.
    assert!(word(&relative_motion(&["100", "50", "30", "0", "-1/10", "1/100"], "-2500")).starts_with("clear"));
    // Drifting through.
    assert!(word(&relative_motion(&["5", "-2000", "0", "0", "-3/100", "0"], "-8000")).starts_with("enters"));
}

#[test]
fn touches_at_transcendental_times_are_settled_where_the_trace_is_a_square() {
    let a: &[&[&str]] = &[&["0", "1"], &["-1", "0"]];
    let p: &[(&str, &[u32])] = &[("1", &[1, 0]), ("-1", &[])];
    assert!(word(&statement(a, &["0", "0"], &["0", "1"], p, Relation::NonNegative)).starts_with("enters"));
    let a: &[&[&str]] = &[&["0", "1", "0", "0"], &["-1", "0", "0", "0"], &["0", "0", "0", "1"], &["0", "0", "-2", "0"]];
    let p: &[(&str, &[u32])] = &[("1", &[1, 0, 0, 0]), ("1", &[0, 0, 1, 0]), ("-2", &[])];
    assert!(
        word(&statement(a, &["0"; 4], &["3/5", "4/5", "1", "0"], p, Relation::NonNegative))
            .starts_with("about the cone")
    );
    let p: &[(&str, &[u32])] = &[("1", &[1, 0, 0, 0]), ("1", &[0, 0, 1, 0]), ("-199/100", &[])];
    assert!(word(&statement(a, &["0"; 4], &["3/5", "4/5", "1", "0"], p, Relation::NonNegative)).starts_with("enters"));
}

#[test]
fn near_touches_are_told_from_touches() {
    // exp(-t) - exp(-2t) is at most 1/4, at t = ln 2.
    let a: &[&[&str]] = &[&["-1", "0"], &["0", "-2"]];
    let gap = "1000000000000000000000000000000";
    for (limit, verdict) in [
        ("-1/4".to_string(), "enters"),
        (format!("-250000000000000000000000000001/{gap}"), "clear"),
        (format!("-249999999999999999999999999999/{gap}"), "enters"),
    ] {
        let p: &[(&str, &[u32])] = &[("1", &[1, 0]), ("-1", &[0, 1]), (&limit, &[])];
        let found = word(&statement(a, &["0", "0"], &["1", "1"], p, Relation::NonNegative));
        assert!(found.starts_with(verdict), "{limit}: {found}");
    }
}

#[test]
fn coupled_oscillators_released_from_rest_do_not_pass_their_start() {
    // x'' = -2 x + y, y'' = x - 3 y from (1, 0): two waves with positive amplitudes that add up to 1, of frequencies whose squares
    // are the roots of z^2 - 5 z + 5.
    let a: &[&[&str]] = &[&["0", "1", "0", "0"], &["-2", "0", "1", "0"], &["0", "0", "0", "1"], &["1", "0", "-3", "0"]];
    let system = |limit, relation| {
        let p: &[(&str, &[u32])] = &[("1", &[1, 0, 0, 0]), (limit, &[])];
        statement(a, &["0"; 4], &["1", "0", "0", "0"], p, relation)
    };
    assert!(word(&system("-1", Relation::Positive)).starts_with("clear"));
    assert!(word(&system("1", Relation::Negative)).starts_with("clear"));
    assert!(word(&system("-1", Relation::NonNegative)).starts_with("enters"));
    let mut later = system("-1", Relation::NonNegative);
    later.zone.from = q("1");
    assert_eq!(word(&later), "about the cone");
    later.zone.inside = system("-999/1000", Relation::NonNegative).zone.inside;
    assert!(word(&later).starts_with("enters"));
}
