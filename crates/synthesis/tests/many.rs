//! Many trajectories: worst cases known in closed form, from both sides.

use keepout_checker::statement::*;
use keepout_synthesis::{Options, Outcome, certify, peak};
use num_traits::ToPrimitive;

fn q(text: &str) -> Rational {
    let (p, q) = text.split_once('/').unwrap_or((text, "1"));
    let decimals = p.split_once('.').map_or(0, |(_, f)| f.len());
    let digits: num_bigint::BigInt = p.replace('.', "").parse().unwrap();
    let denominator: num_bigint::BigInt = q.parse().unwrap();
    Rational::new(digits, denominator * num_bigint::BigInt::from(10).pow(u32::try_from(decimals).unwrap()))
}

/// A sum of variables with factors, and a constant.
fn sum(row: &[&str], constant: &str) -> Expression {
    let entries = row.iter().enumerate().filter(|(_, h)| **h != "0");
    let mut terms: Vec<Term> =
        entries.map(|(i, h)| Term { coefficient: q(h), powers: vec![(Variable::State(i), 1)] }).collect();
    if constant != "0" {
        terms.push(Term { coefficient: q(constant), powers: Vec::new() });
    }
    Expression { terms }
}

/// row x + constant >= 0.
fn half_space(row: &[&str], constant: &str) -> Formula {
    Formula::Atom(Atom { polynomial: sum(row, constant), relation: Relation::NonNegative })
}

/// x' = A x + c + (one column for each disturbance in [-1, 1]) from x0.
fn statement(a: &[&[&str]], c: &[&str], columns: &[&[&str]], x0: &[&str], inside: Formula) -> Statement {
    let states = x0.iter().enumerate().map(|(i, s)| State { name: format!("x{i}"), unit: None, start: q(s) }).collect();
    let rate = |i: usize| {
        let own = a[i].iter().enumerate().map(|(j, v)| (*v, Variable::State(j)));
        let noise = columns.iter().enumerate().map(|(k, column)| (column[i], Variable::Disturbance(k)));
        let terms = own.chain(noise).filter(|(v, _)| *v != "0").map(|(v, x)| (q(v), x)).collect();
        Affine { terms, offset: q(c[i]) }
    };
    let disturbance =
        |k: usize| Disturbance { name: format!("d{k}"), unit: None, range: Range { from: q("-1"), to: q("1") } };
    Statement {
        title: "case".into(),
        states,
        starts: Starts::One,
        disturbances: (0..columns.len()).map(disturbance).collect(),
        uncertain: Vec::new(),
        drives: Vec::new(),
        outputs: Vec::new(),
        exponentials: Vec::new(),
        phases: vec![Phase { rates: (0..x0.len()).map(rate).collect(), uncertain: Vec::new() }],
        zone: Zone { name: "zone".into(), reference: None, inside, from: q("0"), until: None },
        claim: Claim::Never { margin: q("0") },
    }
}

/// y^(n) + ... + a_0 y = b d with |d| <= 1, at rest at first.
fn filter(coefficients: &[&str], gain: &str) -> Statement {
    let n = coefficients.len();
    let negative: Vec<String> =
        coefficients.iter().map(|c| if *c == "0" { "0".into() } else { format!("-{c}") }).collect();
    let mut rows: Vec<Vec<&str>> = (1..n).map(|i| (0..n).map(|j| if i == j { "1" } else { "0" }).collect()).collect();
    rows.push(negative.iter().map(String::as_str).collect());
    let rows: Vec<&[&str]> = rows.iter().map(Vec::as_slice).collect();
    let mut column = vec!["0"; n];
    column[n - 1] = gain;
    let mut output = vec!["0"; n];
    output[0] = "1";
    statement(&rows, &vec!["0"; n], &[&column], &vec!["0"; n], half_space(&output, "0"))
}

fn word(s: &Statement) -> String {
    match certify(s, &Options::default()).unwrap() {
        Outcome::Clear { .. } => "clear".into(),
        Outcome::Enters { .. } => "enters".into(),
        Outcome::Unsettled { reason, tried } => format!("unsettled {reason:?} {tried}"),
        Outcome::Inseparable { .. } | Outcome::Eventually { .. } => "about the cone".into(),
    }
}

/// The peak of the zone's polynomial is enclosed, this narrowly.
fn peaks(s: &Statement, expected: f64, width: f64) {
    for upward in [true, false] {
        let mut s = s.clone();
        if let (Formula::Atom(atom), false) = (&mut s.zone.inside, upward) {
            atom.polynomial.terms.iter_mut().for_each(|t| t.coefficient = -t.coefficient.clone());
        }
        let expected = if upward { expected } else { -expected };
        let found = peak(&s, upward, &Options::default()).unwrap();
        let upper = found.upper.as_ref().map(|(x, _)| x.to_f64().unwrap());
        let lower = found.lower.as_ref().map(|(x, _)| x.to_f64().unwrap());
        let (Some(lower), Some(upper)) = (lower, upper) else { panic!("{lower:?} {upper:?} {:?}", found.reason) };
        let room = 1e-9 * expected.abs();
        assert!(lower <= expected + room && expected - room <= upper, "{lower} {expected} {upper}");
        assert!(upper - lower <= width * expected.abs(), "{lower} {upper}");
    }
}

#[test]
fn worst_case_of_second_order_is_a_hyperbolic_cotangent() {
    for z in ["0.3", "0.5", "0.6", "0.8"] {
        let damping = (q(z) * q("2")).to_string();
        let zeta: f64 = z.parse().unwrap();
        let angle = std::f64::consts::PI * zeta / (2.0 * (1.0 - zeta * zeta).sqrt());
        peaks(&filter(&["1", &damping], "1"), 1.0 / angle.tanh(), 1e-6);
    }
}

#[test]
fn worst_cases_of_filters() {
    peaks(&filter(&["1", "2", "2"], "1"), 1.198_042_518, 1e-6);
    let bessel: [(&[&str], &str, f64); 5] = [
        (&["3", "3"], "3", 1.008_704_562),
        (&["15", "15", "6"], "15", 1.016_191_296),
        (&["105", "105", "45", "10"], "105", 1.019_253_369),
        (&["945", "945", "420", "105", "15"], "945", 1.019_082_66),
        (&["10395", "10395", "4725", "1260", "210", "21"], "10395", 1.017_037_095),
    ];
    for (coefficients, gain, expected) in bessel {
        peaks(&filter(coefficients, gain), expected, 1e-6);
    }
}

#[test]
fn peaks_of_single_trajectories() {
    // s^2 + 6 s + 25, step: 1 + exp(-3 pi / 4).
    let s = statement(&[&["0", "1"], &["-25", "-6"]], &["0", "25"], &[], &["0", "0"], half_space(&["1", "0"], "0"));
    peaks(&s, 1.0 + (-0.75 * std::f64::consts::PI).exp(), 1e-6);
    // t exp(-t), also of a constant and of a limit that is only approached.
    let s = statement(&[&["-1", "1"], &["0", "-1"]], &["0", "0"], &[], &["0", "1"], half_space(&["1", "0"], "0"));
    peaks(&s, (-1.0_f64).exp(), 1e-6);
    let s = statement(&[&["-1"]], &["1"], &[], &["0"], half_space(&["1"], "0"));
    peaks(&s, 1.0, 1e-6);
    // A wave without damping.
    let s = statement(&[&["0", "1"], &["-1", "0"]], &["0", "0"], &[], &["3", "4"], half_space(&["1", "0"], "0"));
    peaks(&s, 5.0, 1e-6);
}

/// x' = -x, y' = -2 y.
fn two_decays(starts: Starts, x0: &[&str], inside: Formula) -> Statement {
    let mut s = statement(&[&["-1", "0"], &["0", "-2"]], &["0", "0"], &[], x0, inside);
    s.starts = starts;
    s
}

#[test]
fn sets_of_starts() {
    let list = |rows: &[&[&str]]| rows.iter().map(|r| r.iter().map(|x| q(x)).collect()).collect::<Vec<Vec<Rational>>>();
    let difference = || half_space(&["1", "-1"], "0");
    // Box around (1, 1) with radii (1/2, 1/4): at t the greatest of x - y is 3/2 exp(-t) - 3/4 exp(-2 t): 3/4 at 0.
    let s = two_decays(Starts::Box(vec![q("0.5"), q("0.25")]), &["1", "1"], difference());
    peaks(&s, 0.75, 1e-6);
    // Around (1, 3/2) with radii (1/2, 1/4): 3/2 u - 5/4 u^2, greatest at u = 3/5: 9/20.
    let s = two_decays(Starts::Box(vec![q("0.5"), q("0.25")]), &["1", "1.5"], difference());
    peaks(&s, 0.45, 1e-6);
    // The same with generators.
    let s = two_decays(Starts::Zonotope(list(&[&["0.5", "0"], &["0", "0.25"]])), &["1", "1.5"], difference());
    peaks(&s, 0.45, 1e-6);
    // Hull of (1, 1), (2, 2), (1, 4): the greatest of u - u^2, 2 u - 2 u^2, u - 4 u^2: 1/2 at u = 1/2.
    let s = two_decays(Starts::Hull(list(&[&["2", "2"], &["1", "4"]])), &["1", "1"], difference());
    peaks(&s, 0.5, 1e-6);
    // Ellipsoid with axes 3/5 and 4/5 around 0: sqrt(9/25 u^2 + 16/25 u^4): 1 at 0.
    let s = two_decays(Starts::Ellipsoid(list(&[&["0.36", "0"], &["0", "0.64"]])), &["0", "0"], difference());
    peaks(&s, 1.0, 1e-6);
    // Around (0, 2): -2 u^2 + sqrt(9/25 u^2 + 16/25 u^4).
    let s = two_decays(Starts::Ellipsoid(list(&[&["0.36", "0"], &["0", "0.64"]])), &["0", "2"], difference());
    let value = |u: f64| -2.0 * u * u + (0.36 * u * u + 0.64 * u.powi(4)).sqrt();
    let best = (0..=1_000_000).map(|k| value(f64::from(k) / 1e6)).fold(f64::NEG_INFINITY, f64::max);
    peaks(&s, best, 1e-6);
}

#[test]
fn zones_near_the_worst_case_are_told_from_both_sides() {
    // coth(3 pi / 8) = 1.209408207...
    for (limit, verdict) in [("-1.2095", "clear"), ("-1.2094083", "clear"), ("-1.2094081", "enters"), ("-1", "enters")]
    {
        let mut s = filter(&["1", "1.2"], "1");
        s.zone.inside = half_space(&["1", "0"], limit);
        assert_eq!(word(&s), verdict, "{limit}");
    }
}

/// y'' = 25 (1 - y) - c y', c in [6, 7]: the greatest overshoot is that of c = 6, 1 + exp(-3 pi / 4) = 1.0948.
fn uncertain_damping(limit: &str) -> Statement {
    let inside = half_space(&["1", "0"], limit);
    let mut s = statement(&[&["0", "1"], &["-25", "0"]], &["0", "25"], &[], &["0", "0"], inside);
    let range = Range { from: q("6"), to: q("7") };
    s.uncertain.push(Uncertain { name: "c".into(), unit: None, range, varying: false });
    let of = Some(Variable::State(1));
    s.phases[0].uncertain.push(UncertainTerm { state: 1, factor: q("-1"), powers: vec![(0, 1)], of });
    s
}

#[test]
fn overshoot_with_uncertain_damping() {
    for (limit, verdict) in [("-1.10", "clear"), ("-1.095", "clear"), ("-1.0945", "enters"), ("-1.09", "enters")] {
        assert_eq!(word(&uncertain_damping(limit)), verdict, "{limit}");
    }
}

fn both(first: Formula, second: Formula) -> Formula {
    Formula::And(vec![first, second])
}

#[test]
fn conjunctions_that_no_half_space_decides() {
    // x' = -x + d, y' = -y - d: each comes near to 1, and x + y = 0.
    let pair = |a: &str, b: &str| {
        let inside = both(half_space(&["1", "0"], a), half_space(&["0", "1"], b));
        statement(&[&["-1", "0"], &["0", "-1"]], &["0", "0"], &[&["1", "-1"]], &["0", "0"], inside)
    };
    assert_eq!(word(&pair("-0.1", "-0.1")), "clear");
    assert_eq!(word(&pair("-0.000001", "0")), "clear");
    // x >= -0.5 and y >= 0.4 late: by a signal between its bounds.
    let mut s = pair("0.5", "-0.4");
    s.zone.from = q("20");
    assert_eq!(word(&s), "enters");
    s.zone.until = Some(q("21"));
    assert_eq!(word(&s), "enters");
    let mut s = pair("0.39", "-0.4");
    s.zone.from = q("20");
    assert_eq!(word(&s), "clear");
}

#[test]
fn conjunctions_of_position_and_speed() {
    // y >= a and y' >= a in s^2 + 1.2 s + 1: the greatest a is the least L1 norm of means of the two responses.
    // 0.70362689382903..., at 0.43782080 and 0.56217920 (golden section on closed forms of the integrals between zeros, mpmath).
    for (a, verdict) in [("-0.71", "clear"), ("-0.7036270", "clear"), ("-0.7036268", "enters"), ("-0.6", "enters")] {
        let mut s = filter(&["1", "1.2"], "1");
        s.zone.inside = both(half_space(&["1", "0"], a), half_space(&["0", "1"], a));
        assert_eq!(word(&s), verdict, "{a}");
    }
}

#[test]
fn growth_and_windows() {
    let grows = |until: Option<&str>| {
        let mut s = statement(&[&["1"]], &["0"], &[&["1"]], &["0"], half_space(&["1"], "0"));
        s.zone.until = until.map(q);
        s
    };
    peaks(&grows(Some("1")), 1.0_f64.exp() - 1.0, 1e-6);
    let endless = peak(&grows(None), true, &Options::default()).unwrap();
    assert!(endless.upper.is_none() && endless.reason.is_some());
    for limit in ["-10", "-1000"] {
        let mut s = grows(None);
        s.zone.inside = half_space(&["1"], limit);
        assert_eq!(word(&s), "enters");
    }
    // A resonance: at most about 2 t / pi.
    let mut s = filter(&["1", "0"], "1");
    s.zone.inside = half_space(&["1", "0"], "-50");
    assert_eq!(word(&s), "enters");
    s.zone.until = Some(q("78"));
    assert_eq!(word(&s), "clear");
    // Nothing moves.
    let s = statement(&[&["-1"]], &["0"], &[&["1"]], &["0"], half_space(&["0"], "0"));
    let found = peak(&s, true, &Options::default()).unwrap();
    assert!(
        found.upper.is_some_and(|(x, _)| x <= q("0.000001")) && found.lower.is_some_and(|(x, _)| x >= q("-0.000001"))
    );
}

#[test]
fn waves_that_last() {
    // x'' = -x, y'' = -2 y from boxes around (1, 0) and (1, 0): the two angles are free.
    let a: &[&[&str]] = &[&["0", "1", "0", "0"], &["-1", "0", "0", "0"], &["0", "0", "0", "1"], &["0", "0", "-2", "0"]];
    let mut s = statement(a, &["0"; 4], &[], &["1", "0", "1", "0"], half_space(&["1", "0", "1", "0"], "0"));
    s.starts = Starts::Box(vec![q("0.1"), q("0"), q("0.2"), q("0")]);
    peaks(&s, 2.3, 1e-6);
}

#[test]
fn conjunctions_over_sets_of_starts() {
    let list = |rows: &[&[&str]]| rows.iter().map(|r| r.iter().map(|x| q(x)).collect()).collect::<Vec<Vec<Rational>>>();
    let corner = |a: &str| both(half_space(&["1", "0"], a), half_space(&["0", "1"], a));
    // A triangle: x and y are both 1/2 at best, in the middle of its side.
    let triangle = || Starts::Hull(list(&[&["1", "0"], &["0", "1"]]));
    // A disc: 1 / sqrt(2).
    let disc = || Starts::Ellipsoid(list(&[&["1", "0"], &["0", "1"]]));
    // A rhombus: 1/2 again.
    let rhombus = || Starts::Zonotope(list(&[&["0.5", "0.5"], &["0.5", "-0.5"]]));
    let cases: [(Starts, &str, &str); 6] = [
        (triangle(), "-0.501", "clear"),
        (triangle(), "-0.499", "enters"),
        (disc(), "-0.7072", "clear"),
        (disc(), "-0.7071", "enters"),
        (rhombus(), "-0.501", "clear"),
        (rhombus(), "-0.499", "enters"),
    ];
    for (starts, a, verdict) in cases {
        let s = two_decays(starts, &["0", "0"], corner(a));
        assert_eq!(word(&s), verdict, "{a}");
    }
    // One of two corners, each out of reach.
    let other = both(half_space(&["-1", "0"], "-0.501"), half_space(&["0", "-1"], "-0.501"));
    let s = two_decays(rhombus(), &["0", "0"], Formula::Or(vec![corner("-0.501"), other]));
    assert_eq!(word(&s), "clear");
}
