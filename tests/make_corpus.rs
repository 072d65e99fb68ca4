//! Writes the corpus anew: certificates that must be verified, and for each obligation certificates that violate only it.
//!
//! Run with `cargo run -p keepout-tests --bin make_corpus`. Each case is checked against its expected answer before it is written;
//! the corpus that is committed changes only where search or format do.

use keepout_checker::certificate::{Angle, Cell, Certificate, Cone, Evidence, Meeting, Node, Pivot, RealPart, Sign};
use keepout_checker::number::Dyadic;
use keepout_checker::statement::{Affine, Claim, Exponential, Formula, Relation, Statement, Term, Variable};
use keepout_synthesis::{Options, Outcome, certify, certify_eventually};
use keepout_tests::case::{answer, corpus};
use keepout_tests::system::{System, atom, rational};
use std::fs;

mod many_cases;
mod region_cases;

fn main() {
    let bases = bases();
    for folder in ["accept", "reject"] {
        let _ = fs::remove_dir_all(corpus().join(folder));
    }
    for (rule, name, certificate) in &bases {
        write("accept", rule, name, "verified", certificate);
    }
    let base = |name: &str| {
        bases
            .iter()
            .find(|(rule, n, _)| *n == name || format!("{n}@{rule}") == name)
            .map(|(_, _, c)| c.clone())
            .expect("a base case")
    };
    reject_traces(&base);
    reject_equalities(&base);
    reject_covers(&base);
    reject_cones(&base);
    reject_entries(&base);
    reject_inseparable(&base);
    reject_exponentials(&base);
    region_cases::write_all();
    many_cases::write_all();
}

fn write(folder: &str, rule: &str, name: &str, expected: &str, certificate: &Certificate) {
    let found = answer(certificate);
    if found != expected {
        eprintln!("{folder}/{rule}/{name}: expected {expected}, found {found}");
        return;
    }
    let path = corpus().join(folder).join(rule);
    fs::create_dir_all(&path).expect("a folder");
    fs::write(path.join(format!("{name}.case")), format!("{expected}\n{}", certificate.to_json().print()))
        .expect("a file");
}

fn reject(rule: &str, name: &str, expected: &str, mut certificate: Certificate, spoil: impl FnOnce(&mut Certificate)) {
    spoil(&mut certificate);
    write("reject", rule, name, expected, &certificate);
}

fn proved(statement: &Statement) -> Certificate {
    let options = Options { margin: false, ..Options::default() };
    certificate(certify(statement, &options).expect("an outcome"))
}

fn proved_eventually(statement: &Statement) -> Certificate {
    certificate(certify_eventually(statement, &Options::default()).expect("an outcome"))
}

fn certificate(outcome: Outcome) -> Certificate {
    match outcome {
        Outcome::Clear { proof, .. }
        | Outcome::Enters { proof }
        | Outcome::Inseparable { proof }
        | Outcome::Eventually { proof } => proof.certificate().clone(),
        Outcome::Unsettled { reason, .. } => panic!("not settled: {reason:?}"),
    }
}

/// The certificates that are accepted, by rule and name.
fn bases() -> Vec<(&'static str, &'static str, Certificate)> {
    let decay = System::new("-1", "0", "1");
    let servo = System::new("0 1; -25 -6", "0 25", "0 0");
    let rotation = System::new("0 1; -1 0", "0 0", "1 0");
    let two = System::new("0 1 0 0; -1 0 0 0; 0 0 0 1; 0 0 -2 0", "0 0 0 0", "1 0 1 0");
    let ratio = System::new("0 1 0 0; -4 0 0 0; 0 0 0 1; 0 0 -9 0", "0 0 0 0", "1 0 1 0");
    let cubic = System::new("0 1 0; 0 0 1; -1 -3 -3", "0 0 0", "2 -4 7");
    // (t^2 - 2) exp(-t)
    let irrational = System::new("0 1 0; 0 0 1; -1 -3 -3", "0 0 0", "-2 2 0");
    let ramp = System::new("0 1; 0 0", "0 0", "0 1");
    let lag = System::new("-1 1; 0 -1", "0 0", "0 1");
    let nearby = System::new("0 1 0 0; -2 -2 0 0; 0 0 0 1; 0 0 -5 -2", "0 0 0 0", "1 0 1 0");
    // cos(t + a) + cos(sqrt(2) t + b) with amplitudes 1, and the same with a decaying term.
    let tones = System::new("0 1 0 0; -1 0 0 0; 0 0 0 1; 0 0 -2 0", "0 0 0 0", "3/5 4/5 1/3 4/3");
    // Frequencies that are roots of an irreducible polynomial: z^4 + 4 z^2 + 2.
    let coupled = System::new("0 1 0 0; 0 0 1 0; 0 0 0 1; -2 0 -4 0", "0 0 0 0", "1 0 -1 0");
    let fading = System::new("0 1 0; -1 0 0; 0 0 -1", "0 0 0", "0 1 1");
    let x: &[u32] = &[1];
    let y: &[u32] = &[0, 1];
    let z: &[u32] = &[0, 0, 1];
    let until = |statement: Statement, from: &str, until: &str| {
        let mut statement = statement;
        statement.zone.from = rational(from);
        statement.zone.until = Some(rational(until));
        statement
    };
    let above = |limit: &'static str| atom(&[("1", &[1]), (limit, &[])], Relation::NonNegative);
    let all = |parts: Vec<Formula>| Formula::And(parts);
    vec![
        ("cover", "window", proved(&until(servo.statement(above("-11/10")), "0", "2"))),
        ("cover", "one_instant", proved(&until(servo.statement(above("-11/10")), "1", "1"))),
        ("cover", "start_touched", proved(&decay.statement(atom(&[("1", x), ("-1", &[])], Relation::Positive)))),
        ("cover", "rational_time_touched", proved(&cubic.statement(atom(&[("1", x)], Relation::Negative)))),
        (
            "cover",
            "irrational_time_touched",
            proved(
                &irrational
                    .statement(all(vec![atom(&[("1", x)], Relation::Zero), atom(&[("1", y)], Relation::NonPositive)])),
            ),
        ),
        (
            "cover",
            "identity",
            proved(&rotation.statement(atom(&[("1", &[2]), ("1", &[0, 2]), ("-1", &[])], Relation::Positive))),
        ),
        ("trace", "step_response", proved(&servo.statement(above("-1095/1000")))),
        ("trace", "defective", proved(&lag.statement(above("-37/100")))),
        ("trace", "growing", proved(&ramp.statement(atom(&[("1", x), ("1", &[])], Relation::Negative)))),
        ("cone", "limit", proved(&decay.statement(above("-2")))),
        ("cone", "circle", proved(&rotation.statement(above("-3/2")))),
        (
            "cone",
            "torus",
            proved(&two.statement(atom(&[("1", x), ("1", z), ("-201/100", &[])], Relation::NonNegative))),
        ),
        (
            "cone",
            "several_atoms",
            proved(&two.statement(all(vec![
                atom(&[("1", x), ("-9/10", &[])], Relation::NonNegative),
                atom(&[("1", y), ("-9/10", &[])], Relation::NonNegative),
            ]))),
        ),
        ("cone", "decaying_lead", proved(&lag.statement(atom(&[("1", x), ("1", y)], Relation::NonPositive)))),
        (
            "cone",
            "common_damping",
            proved(&nearby.statement(all(vec![
                atom(&[("1", &[2]), ("1", &[0, 2]), ("-40", &[0, 0, 2])], Relation::Positive),
                atom(&[("1", &[0, 0, 2]), ("1", &[0, 0, 0, 2]), ("-40", &[2])], Relation::Positive),
            ]))),
        ),
        (
            "equality",
            "product_of_rotations",
            proved(
                &two.statement(atom(&[("1", &[1, 0, 1]), ("1", &[0, 0, 2]), ("-201/100", &[])], Relation::NonNegative)),
            ),
        ),
        (
            "equality",
            "commensurate",
            proved(&ratio.statement(atom(&[("1", x), ("1", z), ("16/10", &[])], Relation::NonPositive))),
        ),
        (
            "equality",
            "double_frequency",
            proved(&rotation.statement(atom(&[("1", &[2]), ("1", y), ("-3/2", &[])], Relation::NonNegative))),
        ),
        ("entry", "start", proved(&decay.statement(above("-1")))),
        (
            "entry",
            "after_start",
            proved(&System::new("1", "0", "1").statement(atom(&[("1", x), ("-1", &[])], Relation::Positive))),
        ),
        ("entry", "instant", proved(&servo.statement(above("-109/100")))),
        ("entry", "crossing", proved(&servo.statement(atom(&[("1", x), ("-1/2", &[])], Relation::Zero)))),
        ("entry", "rational_time", proved(&cubic.statement(atom(&[("1", x)], Relation::NonPositive)))),
        (
            "cover",
            "square_for_all_time",
            proved(&rotation.statement(atom(&[("1", x), ("-1", &[])], Relation::Positive))),
        ),
        (
            "cone",
            "squares_of_waves",
            proved(&tones.statement(atom(&[("1", x), ("1", z), ("-2", &[])], Relation::Positive))),
        ),
        (
            "cone",
            "touching_lead_and_decay",
            proved(&fading.statement(atom(&[("-1", x), ("1", &[]), ("1", z)], Relation::NonPositive))),
        ),
        (
            "cone",
            "common_zero",
            proved(&rotation.statement(all(vec![
                atom(&[("1", x)], Relation::Positive),
                atom(&[("2", x), ("1", &[1, 1])], Relation::Negative),
            ]))),
        ),
        (
            "cone",
            "eventually",
            proved_eventually(&fading.statement(atom(&[("1", x), ("1", z), ("-101/100", &[])], Relation::NonNegative))),
        ),
        ("exponential", "cooling", proved(&with_exponential(&decay, "-3"))),
        ("exponential", "entered", proved(&with_exponential(&decay, "-2"))),
        (
            "inseparable",
            "two_tones",
            proved(&tones.statement(atom(&[("1", x), ("1", z), ("-2", &[])], Relation::NonNegative))),
        ),
        (
            "inseparable",
            "coupled_tones",
            proved_eventually(&coupled.statement(atom(&[("1", x), ("-1/10", &[])], Relation::NonNegative))),
        ),
        (
            "entry",
            "transcendental_time",
            proved(&rotation.statement(atom(&[("1", y), ("-1", &[])], Relation::NonNegative))),
        ),
        (
            "entry",
            "irrational_time",
            proved(
                &irrational
                    .statement(all(vec![atom(&[("1", x)], Relation::Zero), atom(&[("1", y)], Relation::NonNegative)])),
            ),
        ),
    ]
}

/// x' = -x from 1 and a zone with exp(x) + x^2, which falls from e + 1 to 1: above 4 (limit -3), or below 2.
fn with_exponential(system: &System, limit: &'static str) -> Statement {
    let mut statement = system.statement(atom(&[("1", &[2]), (limit, &[])], Relation::NonPositive));
    let argument = Affine { terms: vec![(rational("1"), Variable::State(0))], offset: rational("0") };
    statement.exponentials = vec![Exponential { name: "e".into(), argument }];
    if let Formula::Atom(atom) = &mut statement.zone.inside {
        let powers = vec![(Variable::Exponential(0), 1)];
        atom.polynomial.terms.push(Term { coefficient: rational("1"), powers });
        if limit == "-3" {
            // Never above e + 1.
            atom.relation = Relation::NonNegative;
            atom.polynomial.terms[1].coefficient = rational("-4");
        }
    }
    statement
}

fn cells(c: &mut Certificate) -> &mut Vec<Cell> {
    match &mut c.evidence {
        Evidence::Never { cells, .. } => cells,
        Evidence::Enters { before, .. } => before,
        Evidence::Inseparable(_) | Evidence::Region(_) | Evidence::Many(_) | Evidence::Witness(_) => panic!("no cells"),
    }
}

fn cone(c: &mut Certificate) -> &mut Cone {
    match &mut c.evidence {
        Evidence::Never { cone: Some(cone), .. } => cone,
        _ => panic!("no cone"),
    }
}

fn entry(c: &mut Certificate) -> (&mut keepout_checker::number::Rational, &mut Cell) {
    match &mut c.evidence {
        Evidence::Enters { from, cell, .. } => (from, cell),
        _ => panic!("no entry"),
    }
}

fn meeting(c: &mut Certificate) -> &mut Meeting {
    match &mut c.evidence {
        Evidence::Inseparable(meeting) => meeting,
        _ => panic!("no meeting"),
    }
}

fn first_leaf(cone: &mut Cone) -> &mut Vec<(usize, Sign)> {
    let leaf = cone.nodes.iter_mut().find_map(|n| if let Node::Leaf(signs, _) = n { Some(signs) } else { None });
    leaf.expect("a leaf")
}

/// The factors of the first summand of the first identity.
fn product(c: &mut Certificate) -> &mut Vec<(usize, u32)> {
    &mut c.identities[0].summands[0]
}

fn reject_traces(base: &impl Fn(&str) -> Certificate) {
    let rule = "trace";
    let separated = "inconclusive trace RootsAreSeparated";
    reject(rule, "centre_far_off", separated, base("circle"), |c| {
        c.families.iter_mut().flat_map(|f| &mut f.centres).for_each(|centre| centre.0 = Dyadic::new(99.into(), 3));
    });
    reject(rule, "same_root_in_two_families", separated, base("step_response"), |c| {
        let copy = c.families[0].clone();
        c.families.push(copy);
    });
    reject(rule, "double_root_in_one_family", separated, base("defective"), |c| {
        let family = &mut c.families[0];
        family.polynomial = family.polynomial.mul(&family.polynomial.clone());
        let centre = family.centres[0].clone();
        family.centres.push(centre);
    });
    let annihilates = "refuted trace FactorsAnnihilateTrace";
    reject(rule, "factor_missing", annihilates, base("step_response"), |c| {
        c.traces[0].pop();
    });
    reject(rule, "multiplicity_too_small", annihilates, base("defective"), |c| {
        c.traces[0].iter_mut().for_each(|f| f.multiplicity = 1);
    });
    reject(rule, "factor_twice", annihilates, base("step_response"), |c| {
        let copy = c.traces[0][0];
        c.traces[0].push(copy);
    });
    reject(rule, "no_factor_at_all", annihilates, base("limit"), |c| c.traces[0].clear());
    reject(rule, "start_changed", annihilates, base("identity"), |c| c.statement.states[0].start = rational("2"));
    reject(rule, "a_trace_too_many", "refuted trace EvidenceFitsClaim", base("one_instant"), |c| c.traces.push(vec![]));
    reject(rule, "margin_on_a_conjunction", "refuted trace EvidenceFitsClaim", base("several_atoms"), |c| {
        c.statement.claim = Claim::Never { margin: rational("1/100") };
    });
    reject(rule, "derivative_missing", "refuted trace ClosedFormIsEnclosed", base("rational_time_touched"), |c| {
        c.auxiliaries[0].derivatives.pop();
    });
    let identity = "refuted trace IdentityHolds";
    for factor in [0, 1] {
        let name = ["first_factor_changed", "second_factor_changed"][factor];
        reject(rule, name, identity, base("rational_time_touched"), |c| {
            let position = product(c)[factor].0 - c.traces.len();
            c.auxiliaries[position].derivatives[0] += rational("1/1000000000000");
        });
    }
    reject(rule, "power_changed", identity, base("rational_time_touched"), |c| product(c)[0].1 += 1);
    reject(rule, "summand_missing", identity, base("squares_of_waves"), |c| drop(c.identities[0].summands.pop()));
    reject(rule, "summand_twice", identity, base("squares_of_waves"), |c| {
        let copy = product(c).clone();
        c.identities[0].summands.push(copy);
    });
    reject(rule, "square_of_another_wave", identity, base("squares_of_waves"), |c| {
        let position = product(c).iter().find(|(_, power)| *power == 2).expect("a square").0 - c.traces.len();
        c.auxiliaries[position].derivatives[1] += rational("1/1000000000000");
    });
    reject(rule, "identity_of_another_function", identity, base("touching_lead_and_decay"), |c| {
        let last = c.identities.last_mut().expect("an identity");
        last.target = last.summands[0][0].0;
    });
}

fn reject_equalities(base: &impl Fn(&str) -> Certificate) {
    let rule = "equality";
    let roots = "refuted equality SumsAreRoots";
    reject(rule, "multiplier_changed", roots, base("double_frequency"), |c| c.sums[0].parts[0].0 += 1);
    reject(rule, "factor_multiplicity_changed", roots, base("product_of_rotations"), |c| {
        c.sums[0].factors[0].multiplicity += 1
    });
    reject(rule, "factor_missing", roots, base("product_of_rotations"), |c| {
        c.sums[0].factors.pop();
    });
    reject(rule, "another_root_named", "refuted equality SumIsIdentified", base("double_frequency"), |c| {
        c.sums[0].root.conjugate = !c.sums[0].root.conjugate;
    });
    reject(rule, "line_moved", "refuted equality RootIsOnLine", base("torus"), |c| {
        for lead in &mut cone(c).far.leads {
            lead.real_part = RealPart::Line(rational("1/1000000"));
        }
    });
}

fn reject_covers(base: &impl Fn(&str) -> Certificate) {
    let rule = "cover";
    let refuted = "refuted cover ZoneIsRefutedOnCell";
    reject(rule, "sign_of_the_constant_missing", refuted, base("square_for_all_time"), |c| {
        cells(c).iter_mut().for_each(|cell| cell.signs.clear());
    });
    reject(rule, "square_in_a_closed_zone", refuted, base("square_for_all_time"), |c| {
        if let Formula::Atom(atom) = &mut c.statement.zone.inside {
            atom.relation = Relation::NonNegative;
        }
        cells(c).iter_mut().for_each(|cell| cell.pivot = Pivot::None);
    });
    reject(rule, "no_end_and_no_cone", "refuted cover EvidenceFitsClaim", base("start_touched"), |c| {
        if let Evidence::Never { cone, .. } = &mut c.evidence {
            *cone = None;
        }
    });
    let covers = "refuted cover CellsCoverWindow";
    reject(rule, "last_cell_missing", covers, base("window"), |c| drop(cells(c).pop()));
    reject(rule, "no_cell", covers, base("window"), |c| cells(c).clear());
    reject(rule, "cells_go_back", covers, base("window"), |c| cells(c)[0].to = rational("-1"));
    reject(rule, "window_longer", covers, base("one_instant"), |c| c.statement.zone.until = Some(rational("3")));
    reject(rule, "gap_before_the_cone", covers, base("step_response"), |c| drop(cells(c).pop()));
    reject(rule, "sign_flipped", "refuted cover SignOnCell", base("window"), |c| {
        let sign = &mut cells(c)[0].signs[0].1;
        *sign = sign.reverse();
    });
    reject(rule, "strict_sign_said_to_be_zero", "refuted cover SignOnCell", base("window"), |c| {
        cells(c)[0].signs[0].1 = std::cmp::Ordering::Equal
    });
    reject(rule, "too_few_terms", "inconclusive cover SignOnCell", base("window"), |c| cells(c)[0].order = 1);
    reject(rule, "too_few_bits", "inconclusive trace ClosedFormIsEnclosed", base("window"), |c| c.bits = 2);
    reject(rule, "one_cell_too_long", "inconclusive cover SignOnCell", base("window"), |c| {
        let last = cells(c).pop().expect("a cell");
        *cells(c) = vec![last];
    });
    reject(rule, "does_not_vanish_to_that_order", "refuted cover VanishesAtStart", base("start_touched"), |c| {
        if let Pivot::Start(listed) = &mut cells(c)[0].pivot {
            listed[0].1 += 1;
        }
    });
    reject(rule, "start_pivot_elsewhere", "refuted cover VanishesAtStart", base("start_touched"), |c| {
        c.statement.zone.from = rational("1/1000")
    });
    reject(rule, "sign_after_start_flipped", "refuted cover SignOnCell", base("start_touched"), |c| {
        if let Pivot::Start(listed) = &mut cells(c)[0].pivot {
            listed[0].2 = listed[0].2.reverse();
        }
    });
    reject(rule, "closed_zone_touched_at_the_start", "refuted cover ZoneIsRefutedOnCell", base("start_touched"), |c| {
        if let Formula::Atom(atom) = &mut c.statement.zone.inside {
            atom.relation = Relation::NonNegative;
        }
    });
    reject(
        rule,
        "closed_zone_touched_later",
        "refuted cover ZoneIsRefutedOnCell",
        base("rational_time_touched"),
        |c| {
            if let Formula::Atom(atom) = &mut c.statement.zone.inside {
                atom.relation = Relation::NonPositive;
            }
        },
    );
    reject(rule, "signs_do_not_refute", "refuted cover ZoneIsRefutedOnCell", base("window"), |c| {
        cells(c)[0].signs.clear()
    });
    reject(rule, "no_cone_and_no_end", "refuted cover EvidenceFitsClaim", base("step_response"), |c| {
        if let Evidence::Never { cone, .. } = &mut c.evidence {
            *cone = None;
        }
    });
    reject(rule, "evidence_of_another_kind", "refuted cover EvidenceFitsClaim", base("step_response"), |c| {
        c.statement.claim = Claim::Enters { from: rational("0"), to: rational("1"), first: false };
    });
}

fn reject_cones(base: &impl Fn(&str) -> Certificate) {
    let rule = "cone";
    reject(rule, "starts_at_zero", "refuted cone FarFieldStartsLate", base("limit"), |c| {
        cone(c).far.from = rational("0");
        cells(c).clear();
    });
    reject(rule, "starts_too_early", "inconclusive cone SignOnLeaf", base("step_response"), |c| {
        let keep = cells(c)[0].clone();
        cone(c).far.from = keep.to.clone();
        *cells(c) = vec![keep];
    });
    reject(rule, "lower_term_still_rising", "inconclusive cone LowerTermDecreases", base("defective"), |c| {
        let keep = Cell { to: rational("1/100"), ..cells(c)[0].clone() };
        cone(c).far.from = keep.to.clone();
        *cells(c) = vec![keep];
    });
    reject(rule, "leading_root_left_out", "inconclusive cone LowerRealPartIsLess", base("torus"), |c| {
        cone(c).far.leads.iter_mut().for_each(|lead| {
            lead.roots.pop();
        });
    });
    reject(rule, "no_reason_for_equal_rates", "refuted cone RealPartsAreEqual", base("torus"), |c| {
        cone(c).far.leads.iter_mut().for_each(|lead| lead.real_part = RealPart::Single);
    });
    reject(rule, "root_without_an_angle_leads", "refuted cone AngleIsCombination", base("step_response"), |c| {
        let lead = &mut cone(c).far.leads[0];
        lead.roots[0] = 1 - lead.roots[0];
    });
    let combination = "refuted cone AngleIsCombination";
    reject(rule, "turns_changed", combination, base("torus"), |c| cone(c).far.angles[0].turns[0] += 1);
    reject(rule, "turns_of_a_sum_changed", combination, base("double_frequency"), |c| {
        let angle: &mut Angle = cone(c).far.angles.iter_mut().find(|a| a.sum.is_some()).expect("a sum");
        angle.turns[0] -= 1;
    });
    reject(rule, "angle_missing", combination, base("torus"), |c| drop(cone(c).far.angles.pop()));
    reject(rule, "base_swapped", combination, base("torus"), |c| cone(c).far.base.swap(0, 1));
    reject(rule, "sign_flipped", "refuted cone SignOnLeaf", base("torus"), |c| {
        let sign = &mut first_leaf(cone(c))[0].1;
        *sign = sign.reverse();
    });
    reject(rule, "torus_not_split", "inconclusive cone SignOnLeaf", base("torus"), |c| {
        let leaf = Node::Leaf(first_leaf(cone(c)).clone(), None);
        cone(c).nodes = vec![leaf];
    });
    reject(rule, "signs_do_not_refute", "refuted cone ZoneIsRefutedOnLeaf", base("torus"), |c| {
        first_leaf(cone(c)).clear()
    });
    reject(rule, "last_leaf_missing", "refuted cone LeavesCoverTorus", base("torus"), |c| drop(cone(c).nodes.pop()));
    reject(rule, "a_leaf_too_many", "refuted cone LeavesCoverTorus", base("torus"), |c| {
        let leaf = Node::Leaf(first_leaf(cone(c)).clone(), None);
        cone(c).nodes.push(leaf);
    });
    reject(rule, "sign_without_a_lead", "refuted cone SignOnLeaf", base("circle"), |c| {
        cone(c).far.leads.clear();
    });
    reject(
        rule,
        "sign_of_the_rest_missing",
        "refuted cone ZoneIsRefutedOnLeaf",
        base("touching_lead_and_decay"),
        |c| {
            cone(c).nodes.iter_mut().for_each(|n| {
                if let Node::Leaf(signs, _) = n {
                    signs.truncate(1)
                }
            });
        },
    );
    reject(rule, "pivot_missing", "refuted cone ZoneIsRefutedOnLeaf", base("common_zero"), |c| {
        cone(c).nodes.iter_mut().for_each(|n| {
            if let Node::Leaf(_, pivot) = n {
                *pivot = None
            }
        });
    });
    let fits = "refuted cover EvidenceFitsClaim";
    reject(rule, "cone_later_than_claimed", fits, base("eventually"), |c| {
        let from = cone(c).far.from.clone() * rational("9/10");
        c.statement.claim = Claim::Eventually { from };
    });
    reject(rule, "eventually_in_a_window_that_ends", fits, base("eventually"), |c| {
        c.statement.zone.until = Some(rational("1000"));
    });
    reject(rule, "claim_before_the_window", fits, base("eventually"), |c| c.statement.zone.from = rational("1000"));
    reject(rule, "cells_for_a_cone", fits, base("eventually"), |c| {
        cells(c).push(Cell { to: rational("1"), order: 2, signs: Vec::new(), pivot: Pivot::None });
    });
    reject(rule, "cone_too_early", "inconclusive cone SignOnLeaf", base("eventually"), |c| {
        cone(c).far.from *= rational("1/2");
    });
    reject(rule, "zone_nearer", "inconclusive cover SignOnCell", base("torus"), |c| {
        if let Formula::Atom(atom) = &mut c.statement.zone.inside {
            atom.polynomial.terms[2].coefficient = rational("-2");
        }
    });
}

fn reject_entries(base: &impl Fn(&str) -> Certificate) {
    let rule = "entry";
    reject(rule, "root_of_another_square", "refuted trace IdentityHolds", base("transcendental_time"), |c| {
        let position = product(c).iter().find(|(_, power)| *power == 2).expect("a square").0 - c.traces.len();
        c.auxiliaries[position].derivatives[0] = rational("2");
    });
    reject(
        rule,
        "open_zone_touched_by_a_square",
        "refuted entry ZoneIsProvedAtInstant",
        base("transcendental_time"),
        |c| {
            if let Formula::Atom(atom) = &mut c.statement.zone.inside {
                atom.relation = Relation::Positive;
            }
            cells(c).clear();
            if let Claim::Enters { first, .. } = &mut c.statement.claim {
                *first = false;
            }
        },
    );
    let in_window = "refuted entry InstantIsInWindow";
    reject(rule, "outside_the_bracket", in_window, base("instant@entry"), |c| {
        c.statement.claim = Claim::Enters { from: rational("0"), to: rational("1/10"), first: false };
        cells(c).clear();
    });
    reject(rule, "after_the_window", in_window, base("instant@entry"), |c| {
        c.statement.zone.until = Some(rational("1/2"))
    });
    reject(rule, "before_the_window", in_window, base("instant@entry"), |c| c.statement.zone.from = rational("1"));
    reject(rule, "cell_goes_back", in_window, base("crossing"), |c| {
        let (from, cell) = entry(c);
        std::mem::swap(from, &mut cell.to);
        let (from, to) = (cell.to.clone(), from.clone());
        c.statement.claim = Claim::Enters { from, to, first: false };
        cells(c).clear();
    });
    reject(rule, "sign_flipped", "refuted entry SignOnCell", base("instant@entry"), |c| {
        let sign = &mut entry(c).1.signs[0].1;
        *sign = sign.reverse();
    });
    reject(rule, "sign_at_zero_flipped", "refuted entry SignOnCell", base("start"), |c| {
        entry(c).1.signs[0].1 = std::cmp::Ordering::Less
    });
    reject(rule, "pivot_keeps_its_sign", "refuted entry PivotChangesSign", base("crossing"), |c| {
        let (from, cell) = entry(c);
        cell.to = from.clone();
    });
    reject(rule, "signs_do_not_prove", "refuted entry ZoneIsProvedAtInstant", base("instant@entry"), |c| {
        entry(c).1.signs.clear()
    });
    reject(
        rule,
        "touch_without_its_identity",
        "refuted entry ZoneIsProvedAtInstant",
        base("transcendental_time"),
        |c| {
            c.identities.clear();
            cells(c).clear();
            if let Claim::Enters { first, .. } = &mut c.statement.claim {
                *first = false;
            }
        },
    );
    reject(rule, "open_zone_touched_only", "refuted entry ZoneIsProvedAtInstant", base("rational_time"), |c| {
        if let Formula::Atom(atom) = &mut c.statement.zone.inside {
            atom.relation = Relation::Negative;
        }
        cells(c).clear();
        if let Claim::Enters { first, .. } = &mut c.statement.claim {
            *first = false;
        }
    });
    reject(rule, "first_without_a_cover", "refuted cover CellsCoverWindow", base("instant@entry"), |c| {
        cells(c).clear()
    });
    reject(rule, "cover_that_nobody_asked_for", "refuted cover EvidenceFitsClaim", base("instant@entry"), |c| {
        if let Claim::Enters { first, .. } = &mut c.statement.claim {
            *first = false;
        }
    });
}

fn reject_inseparable(base: &impl Fn(&str) -> Certificate) {
    let rule = "inseparable";
    let faces = "refuted inseparable FacesHaveOppositeSigns";
    reject(rule, "box_moved", faces, base("two_tones"), |c| {
        let (centre, radius) = &mut meeting(c).angles[0];
        *centre += &*radius * rational("9/10");
        *radius *= rational("1/1000");
    });
    reject(rule, "axes_swapped", "inconclusive inseparable FacesHaveOppositeSigns", base("two_tones"), |c| {
        let zeros = &mut meeting(c).zeros;
        (zeros[0].1, zeros[1].1) = (zeros[1].1, zeros[0].1);
    });
    reject(rule, "one_axis_for_two", faces, base("two_tones"), |c| {
        let zeros = &mut meeting(c).zeros;
        zeros[1] = zeros[0];
    });
    reject(rule, "an_axis_too_few", "refuted inseparable FrequenciesAreIndependent", base("two_tones"), |c| {
        meeting(c).angles.pop();
    });
    let proved = "refuted inseparable ZoneIsProvedOnTorus";
    reject(rule, "zero_missing", proved, base("two_tones"), |c| meeting(c).zeros.truncate(1));
    reject(rule, "open_zone", proved, base("two_tones"), |c| {
        if let Formula::Atom(atom) = &mut c.statement.zone.inside {
            atom.relation = Relation::Positive;
        }
    });
    reject(rule, "identity_missing", proved, base("two_tones"), |c| c.identities.clear());
    reject(rule, "sign_flipped", "refuted inseparable SignOnLeaf", base("coupled_tones"), |c| {
        let sign = &mut meeting(c).signs[0].1;
        *sign = sign.reverse();
    });
    reject(rule, "window_ends", "refuted cover EvidenceFitsClaim", base("two_tones"), |c| {
        c.statement.zone.until = Some(rational("1000"));
    });
    reject(rule, "said_to_be_entered", "refuted cover EvidenceFitsClaim", base("two_tones"), |c| {
        c.statement.claim = Claim::Enters { from: rational("0"), to: rational("1000"), first: false };
    });
    reject(rule, "starts_at_zero", "refuted inseparable FarFieldStartsLate", base("two_tones"), |c| {
        meeting(c).far.from = rational("0");
    });
}

fn reject_exponentials(base: &impl Fn(&str) -> Certificate) {
    let rule = "exponential";
    reject(rule, "a_list_too_many", "refuted trace EvidenceFitsClaim", base("cooling"), |c| {
        c.traces.push(Vec::new());
    });
    reject(rule, "factors_for_a_sum_with_exponentials", "refuted trace EvidenceFitsClaim", base("cooling"), |c| {
        let factors = c.traces[c.traces.len() - 1].clone();
        c.traces[0] = factors;
    });
    reject(rule, "another_argument", "refuted trace FactorsAnnihilateTrace", base("cooling"), |c| {
        c.statement.exponentials[0].argument.offset = rational("1/10");
    });
    reject(rule, "sign_flipped", "refuted cover SignOnCell", base("cooling"), |c| {
        let sign = &mut cells(c)[0].signs[0].1;
        *sign = sign.reverse();
    });
    reject(rule, "lead_of_the_argument_missing", "inconclusive cone SignOnLeaf", base("cooling"), |c| {
        let argument = c.traces.len() - 1;
        cone(c).far.leads.retain(|lead| lead.function != argument);
    });
    reject(rule, "nearer_zone", "inconclusive cover SignOnCell", base("cooling"), |c| {
        if let Formula::Atom(atom) = &mut c.statement.zone.inside {
            atom.polynomial.terms[1].coefficient = rational("-371829/100000");
        }
    });
    reject(rule, "zone_is_not_entered_there", "refuted entry SignOnCell", base("entered@exponential"), |c| {
        if let Formula::Atom(atom) = &mut c.statement.zone.inside {
            atom.polynomial.terms[1].coefficient = rational("-19/10");
        }
        cells(c).clear();
        if let Claim::Enters { first, .. } = &mut c.statement.claim {
            *first = false;
        }
    });
}
