//! The corpus of the rule `region`: sets of starts, and for each obligation sets that violate only it.

use super::{reject, write};
use keepout_checker::certificate::{Certificate, Evidence, Node, RootRef, Sum};
use keepout_checker::region::{Rate, Reason, Region, RegionProof, Step};
use keepout_checker::statement::{Atom, Claim, Expression, Formula, Relation, Statement, Term, Variable};
use keepout_synthesis::{Options, certify_region};
use keepout_tests::system::{System, atom, rational};
use std::cmp::Ordering;

fn found(statement: &Statement) -> Certificate {
    let found = certify_region(statement, &Options::default()).expect("an accepted certificate");
    found.expect("a set").certificate().clone()
}

fn region(c: &mut Certificate) -> &mut Region {
    match &mut c.statement.claim {
        Claim::Region(region) => region,
        _ => panic!("no set"),
    }
}

fn proof(c: &mut Certificate) -> &mut RegionProof {
    match &mut c.evidence {
        Evidence::Region(proof) => proof,
        _ => panic!("no set"),
    }
}

fn zone(c: &mut Certificate) -> &mut Vec<Term> {
    let Formula::Atom(Atom { polynomial: Expression { terms }, .. }) = &mut c.statement.zone.inside else {
        panic!("no single comparison")
    };
    terms
}

fn above(limit: &'static str) -> Formula {
    atom(&[("1", &[1]), (limit, &[])], Relation::NonNegative)
}

/// The sets that are accepted.
fn bases() -> Vec<(&'static str, Certificate)> {
    let rotation = System::new("0 1; -1 0", "0 0", "1 0");
    let offset = System::new("0 1; -1 0", "0 3", "1 0");
    let two = System::new("0 1 0 0; -1 0 0 0; 0 0 0 1; 0 0 -2 0", "0 0 0 0", "1 0 1 0");
    let octave = System::new("0 1 0 0; -1 0 0 0; 0 0 0 1; 0 0 -4 0", "0 0 0 0", "1 0 1 0");
    let servo = System::new("0 1; -25 -6", "0 25", "0 0");
    let lag = System::new("-1 1; 0 -1", "0 0", "0 1");
    let overdamped = System::new("0 1; -1 -4", "0 0", "1 0");
    let cubic = System::new("0 1 0; 0 0 1; -1 -1 0", "0 0 0", "1 0 0");
    let drift = System::new("0 1 0 0; 0 0 0 0; 0 0 0 1; 0 0 -2 0", "0 0 0 0", "0 1 1 0");
    let tanks = System::new("-1 0; 0 -2", "1 1", "0 0");
    let modes = System::new("-1 2 0 0; -2 -1 0 0; 0 0 -2 3; 0 0 -3 -2", "0 0 0 0", "1 0 1 0");
    let x: &[u32] = &[1];
    vec![
        (
            "damped_modes",
            found(&modes.statement(atom(&[("1", x), ("1", &[0, 0, 1]), ("-5/2", &[])], Relation::NonNegative))),
        ),
        ("circle", found(&rotation.statement(above("-11/10")))),
        (
            "circle_exactly",
            found(&rotation.statement(atom(&[("1", &[2]), ("1", &[0, 2]), ("-1", &[])], Relation::NonZero))),
        ),
        ("offset", found(&offset.statement(above("-51/10")))),
        ("torus", found(&two.statement(atom(&[("1", x), ("1", &[0, 0, 1]), ("-21/10", &[])], Relation::Positive)))),
        ("octave", found(&octave.statement(atom(&[("2", &[2]), ("-1", &[]), ("-1", &[0, 0, 1])], Relation::NonZero)))),
        ("servo", found(&servo.statement(above("-11/10")))),
        ("jordan_block", found(&lag.statement(above("-37/100")))),
        ("irrational_rates", found(&overdamped.statement(above("-11/10")))),
        (
            "growing",
            found(&cubic.statement(atom(
                &[("1", &[2]), ("1", &[0, 2]), ("1", &[0, 0, 2]), ("-1/10", &[])],
                Relation::NonPositive,
            ))),
        ),
        ("drift", found(&drift.statement(atom(&[("1", x), ("3", &[0, 0, 1]), ("1", &[])], Relation::NonPositive)))),
        ("constant", found(&tanks.statement(above("-2")))),
    ]
}

/// Writes all cases.
pub(crate) fn write_all() {
    let bases = bases();
    for (name, certificate) in &bases {
        write("accept", "region", name, "verified", certificate);
    }
    let base = |name: &str| bases.iter().find(|(n, _)| *n == name).expect("a base case").1.clone();
    reject_names(&base);
    reject_exponents(&base);
    reject_bounds(&base);
    reject_zones(&base);
    reject_leaves(&base);
}

fn reject_names(base: &impl Fn(&str) -> Certificate) {
    let rule = "region";
    reject(rule, "another_polynomial", "refuted region RootIsNamed", base("servo"), |c| {
        let root = region(c).roots.last_mut().unwrap();
        root.polynomial[0] += rational("1");
    });
    reject(rule, "rectangle_elsewhere", "inconclusive region RootIsNamed", base("servo"), |c| {
        region(c).roots.last_mut().unwrap().re = (rational("-2"), rational("-1"));
    });
    reject(rule, "two_roots_in_the_rectangle", "inconclusive region RootIsNamed", base("irrational_rates"), |c| {
        region(c).roots[0].re = (rational("-4"), rational("0"));
    });
    reject(rule, "conjugates_in_the_rectangle", "inconclusive region RootIsNamed", base("circle"), |c| {
        region(c).roots[0].im = (rational("-2"), rational("2"));
    });
    reject(rule, "root_said_to_be_real", "refuted region RootIsNamed", base("circle"), |c| {
        region(c).roots[0].im = (rational("0"), rational("0"));
    });
    reject(rule, "root_without_its_position", "refuted region RootIsNamed", base("circle"), |c| {
        proof(c).roots.pop();
    });
}

fn reject_exponents(base: &impl Fn(&str) -> Certificate) {
    let rule = "region";
    reject(rule, "growth_changed", "refuted region RateIsCombination", base("servo"), |c| {
        region(c).exponents.last_mut().unwrap().growth[0] -= rational("1");
    });
    reject(rule, "row_and_growth_changed", "refuted region RateIsCombination", base("growing"), |c| {
        // The double of the real part of the pair is the opposite of the real root.
        let pair = region(c).exponents.iter_mut().find(|e| !e.turns.iter().all(|n| *n == 0)).unwrap();
        pair.growth[1] = rational("-1");
        let root = pair.root;
        let index = proof(c).roots[root];
        let step = proof(c).growths.iter_mut().find(|s| s.root == index).unwrap();
        step.row[1] = rational("-1");
    });
    reject(rule, "base_rate_of_another_root", "refuted region RateIsCombination", base("irrational_rates"), |c| {
        region(c).rates[0].root = 1 - region(c).rates[0].root;
    });
    reject(rule, "line_moved", "refuted equality RootIsOnLine", base("servo"), |c| {
        for step in &mut proof(c).growths {
            if let Reason::Line(line) = &mut step.reason {
                *line -= rational("1");
            }
        }
    });
    reject(rule, "turns_changed", "refuted region AngleIsCombination", base("octave"), |c| {
        region(c).exponents[0].turns[0] += 1;
    });
    reject(rule, "angle_missing", "refuted region AngleIsCombination", base("octave"), |c| {
        proof(c).angles.pop();
    });
    reject(rule, "sum_missing", "refuted region AngleIsCombination", base("octave"), |c| {
        c.sums.clear();
        for step in &mut proof(c).angles {
            step.reason = Reason::Base;
        }
    });
    reject(rule, "exponent_left_out", "refuted region ExponentsAreListed", base("servo"), |c| {
        region(c).exponents.pop();
    });
    reject(rule, "exponent_twice", "refuted region ExponentsAreListed", base("servo"), |c| {
        let again = region(c).exponents[0].clone();
        region(c).exponents.push(again);
    });
    reject(rule, "scale_zero", "refuted region ExponentsAreListed", base("circle"), |c| {
        region(c).scale = rational("0");
    });
    // 2 (-1) - (-2) = 0: with u for exp(-t) and y^(-2) for exp(-2t), the constant would be y^2 u^2, which holds along the
    // trajectory. But the equations' offset is matched by the constant 1 alone.
    reject(rule, "constant_made_to_grow", "refuted region ExponentsAreListed", base("constant"), make_constant_grow);
}

fn make_constant_grow(c: &mut Certificate) {
    let value = |c: &Certificate, family: usize| -c.families[family].polynomial.coefficients()[0].clone();
    let find = |c: &Certificate, x: &str| {
        let family = (0..c.families.len()).find(|f| value(c, *f) == rational(x)).unwrap();
        let before: usize = c.families[..family].iter().map(|f| f.centres.len()).sum();
        (family, before)
    };
    let ((zero, zero_root), (_, one_root), (_, two_root)) = (find(c, "0"), find(c, "-1"), find(c, "-2"));
    let plain = |index| RootRef { index, conjugate: false };
    let factors = vec![keepout_checker::certificate::Factor { family: zero, multiplicity: 1 }];
    c.sums.push(Sum { root: plain(zero_root), parts: vec![(2, plain(one_root)), (-1, plain(two_root))], factors });
    let sum = c.sums.len() - 1;
    let proof_roots = proof(c).roots.clone();
    let named = |root: usize| proof_roots.iter().position(|r| *r == root).unwrap();
    let row = |a: &str, b: &str| vec![rational(a), rational(b)];
    let scale = region(c).scale.clone();
    let over = |x: &str| (rational(x) / &scale).to_string();
    let rows = [
        (one_root, row("0", "1"), Reason::Base),
        (two_root, row(&over("-2"), "0"), Reason::Line(rational("-2"))),
        (zero_root, row(&over("2"), "2"), Reason::Sum(sum)),
    ];
    let lo = rational("-1") / &scale;
    region(c).rates = vec![Rate { root: named(one_root), lo: lo.clone(), hi: lo }];
    for (root, row, _) in &rows {
        let position = named(*root);
        region(c).exponents.iter_mut().find(|e| e.root == position).unwrap().growth = row.clone();
    }
    proof(c).growths = rows.into_iter().map(|(root, row, reason)| Step { root, row, reason }).collect();
}

fn reject_bounds(base: &impl Fn(&str) -> Certificate) {
    let rule = "region";
    reject(rule, "band_beside_the_rate", "inconclusive region RateIsInBand", base("irrational_rates"), |c| {
        let rate = &mut region(c).rates[0];
        rate.lo = rate.hi.clone();
    });
    reject(rule, "starts_too_late", "inconclusive region SetContainsTrajectory", base("servo"), |c| {
        region(c).start *= rational("2");
    });
    reject(rule, "starts_before_its_logarithm", "inconclusive region SetContainsTrajectory", base("servo"), |c| {
        region(c).start *= rational("1/2");
    });
    reject(rule, "starts_at_zero", "refuted region SetContainsTrajectory", base("circle"), |c| {
        region(c).from = rational("0");
    });
    reject(rule, "power_too_small", "inconclusive region PowerBoundsTime", base("jordan_block"), |c| {
        region(c).power = Some(rational("1/100"));
    });
    reject(rule, "power_negative", "refuted region PowerBoundsTime", base("jordan_block"), |c| {
        region(c).power = Some(rational("-1"));
    });
    reject(rule, "power_missing", "inconclusive region LeadDominates", base("jordan_block"), |c| {
        region(c).power = None;
    });
    reject(rule, "band_too_wide", "inconclusive region LeadDominates", base("irrational_rates"), |c| {
        region(c).rates[0].hi = rational("2");
    });
    reject(rule, "lower_growth_said_to_lead", "inconclusive region LeadDominates", base("servo"), |c| {
        let growth = region(c).exponents.iter().find(|e| e.growth[0] != rational("0")).unwrap().growth.clone();
        proof(c).leads[0].growth = growth;
    });
}

fn reject_zones(base: &impl Fn(&str) -> Certificate) {
    let rule = "region";
    reject(rule, "window_ends", "refuted cover EvidenceFitsClaim", base("circle"), |c| {
        c.statement.zone.until = Some(rational("10"));
    });
    reject(rule, "evidence_of_another_kind", "refuted cover EvidenceFitsClaim", base("circle"), |c| {
        c.evidence = Evidence::Never { cells: Vec::new(), cone: None };
    });
    reject(rule, "said_to_be_never_entered", "refuted trace EvidenceFitsClaim", base("circle"), |c| {
        c.statement.claim = Claim::Never { margin: rational("0") };
    });
    // x0 - t - 11/10 is never >= 0 along the trajectory, but no set of states knows the time.
    reject(rule, "zone_names_the_time", "refuted region ZoneIsOfStates", base("circle"), |c| {
        zone(c).push(Term { coefficient: rational("-1"), powers: vec![(Variable::Time, 1)] });
        let is_zero = |f: &keepout_checker::certificate::RootFamily| f.polynomial.coefficients()[0] == rational("0");
        let constant = c.families.iter().position(is_zero).unwrap();
        c.traces[0].iter_mut().find(|f| f.family == constant).unwrap().multiplicity = 2;
    });
    reject(rule, "a_trace_of_a_state_missing", "refuted trace EvidenceFitsClaim", base("circle"), |c| {
        c.traces.pop();
    });
}

fn reject_leaves(base: &impl Fn(&str) -> Certificate) {
    let rule = "region";
    reject(rule, "last_leaf_missing", "refuted region LeavesCoverTorus", base("circle"), |c| {
        proof(c).nodes.pop();
    });
    reject(rule, "a_leaf_too_many", "refuted region LeavesCoverTorus", base("circle"), |c| {
        let leaf = proof(c).nodes.last().unwrap().clone();
        proof(c).nodes.push(leaf);
    });
    reject(rule, "split_along_no_axis", "refuted region LeavesCoverTorus", base("circle"), |c| {
        proof(c).nodes.insert(0, Node::Split(5));
    });
    reject(rule, "sign_flipped", "refuted region SignOnLeaf", base("circle"), |c| {
        for node in &mut proof(c).nodes {
            if let Node::Leaf(signs, _) = node {
                signs.iter_mut().for_each(|(_, sign)| *sign = sign.reverse());
            }
        }
    });
    reject(rule, "sign_without_a_lead", "refuted region SignOnLeaf", base("circle"), |c| {
        proof(c).leads.clear();
    });
    reject(rule, "torus_not_split", "inconclusive region SignOnLeaf", base("torus"), |c| {
        let leaf = proof(c).nodes.last().unwrap().clone();
        proof(c).nodes = vec![leaf];
    });
    reject(rule, "signs_do_not_refute", "refuted region ZoneIsRefutedOnLeaf", base("circle"), |c| {
        for node in &mut proof(c).nodes {
            if let Node::Leaf(signs, _) = node {
                signs.clear();
            }
        }
    });
    reject(rule, "pivot_on_a_leaf", "refuted region ZoneIsRefutedOnLeaf", base("circle"), |c| {
        for node in &mut proof(c).nodes {
            if let Node::Leaf(_, pivot) = node {
                *pivot = Some(0);
            }
        }
    });
    reject(rule, "zone_nearer", "refuted region SignOnLeaf", base("circle"), |c| {
        zone(c)[1].coefficient = rational("-9/10");
    });
    // 2 cos^2 t - 1 - cos 2t is 0 along the trajectory; on the torus of two free angles it is not.
    reject(rule, "relation_missed", "refuted region SignOnLeaf", base("octave"), |c| {
        let region = region(c);
        let second = 1 - region.exponents.iter().position(|e| e.turns == [1]).unwrap();
        let base = region.exponents[second].root;
        region.base.push(base);
        for (i, exponent) in region.exponents.iter_mut().enumerate() {
            exponent.turns = if i == second { vec![0, 1] } else { vec![1, 0] };
        }
        let (first, base) = (region.exponents[1 - second].root, base);
        let index = [proof(c).roots[first], proof(c).roots[base]];
        let row = |a: &str, b: &str| vec![rational(a), rational(b)];
        proof(c).angles = vec![
            Step { root: index[0], row: row("1", "0"), reason: Reason::Base },
            Step { root: index[1], row: row("0", "1"), reason: Reason::Base },
        ];
        proof(c).nodes = vec![Node::Leaf(vec![(0, Ordering::Equal)], None)];
    });
}
