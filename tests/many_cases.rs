//! Corpus cases of the rules `worst_case` and `witness`.

use crate::{certificate, reject, write};
use keepout_checker::certificate::{Certificate, Evidence};
use keepout_checker::many::{Division, Piece, Witness};
use keepout_checker::statement::{
    Disturbance, Formula, Range, Relation, Starts, Statement, Uncertain, UncertainTerm, Variable,
};
use keepout_synthesis::{Options, certify};
use keepout_tests::system::{System, atom, rational};

fn range(from: &str, to: &str) -> Range {
    Range { from: rational(from), to: rational(to) }
}

/// A positioning stage: a step of 1, a gust on its force, starts in a box.
fn stage(limit: &'static str) -> Statement {
    let system = System::new("0 1; -25 -6", "0 25", "0 0");
    let mut statement = system.statement(atom(&[("1", &[1]), (limit, &[])], Relation::NonNegative));
    statement.starts = Starts::Box(vec![rational("1/10"), rational("0")]);
    statement.disturbances = vec![Disturbance { name: "gust".into(), unit: None, range: range("-1/10", "1/10") }];
    statement.phases[0].rates[1].terms.push((rational("25"), Variable::Disturbance(0)));
    statement
}

/// The same without gust, its damping uncertain.
fn damped(limit: &'static str, varying: bool) -> Statement {
    let system = System::new("0 1; -25 0", "0 25", "0 0");
    let mut statement = system.statement(atom(&[("1", &[1]), (limit, &[])], Relation::NonNegative));
    statement.uncertain = vec![Uncertain { name: "d".into(), unit: None, range: range("6", "7"), varying }];
    let term = UncertainTerm { state: 1, factor: rational("-1"), powers: vec![(0, 1)], of: Some(Variable::State(1)) };
    statement.phases[0].uncertain.push(term);
    statement
}

/// An oscillator without damping, its starts an ellipse or a triangle.
fn oscillator(starts: Starts, limit: &'static str) -> Statement {
    let system = System::new("0 1; -1 0", "0 0", "0 0");
    let mut statement = system.statement(atom(&[("1", &[1]), (limit, &[])], Relation::Positive));
    statement.starts = starts;
    statement
}

fn proved(statement: &Statement) -> Certificate {
    let options = Options { margin: false, ..Options::default() };
    certificate(certify(statement, &options).expect("an outcome"))
}

fn pieces(c: &mut Certificate) -> &mut Vec<Division> {
    match &mut c.evidence {
        Evidence::Many(divisions) => divisions,
        _ => panic!("another kind of evidence"),
    }
}

fn piece(c: &mut Certificate) -> &mut Piece {
    let found = pieces(c).iter_mut().find_map(|d| if let Division::Piece(piece) = d { Some(piece) } else { None });
    found.expect("a piece")
}

fn witness(c: &mut Certificate) -> &mut Witness {
    match &mut c.evidence {
        Evidence::Witness(witness) => witness,
        _ => panic!("another kind of evidence"),
    }
}

pub(crate) fn write_all() {
    let shape = vec![vec![rational("1"), rational("1/2")], vec![rational("1/2"), rational("1/2")]];
    let triangle = vec![vec![rational("1"), rational("0")], vec![rational("0"), rational("1")]];
    let gust = proved(&stage("-13/10"));
    let damping = proved(&damped("-11/10", false));
    let ellipse = proved(&oscillator(Starts::Ellipsoid(shape), "-3/2"));
    let hull = proved(&oscillator(Starts::Hull(triangle), "-3/2"));
    let hit = proved(&stage("-6/5"));
    for (rule, name, case) in [
        ("worst_case", "gust", &gust),
        ("worst_case", "damping", &damping),
        ("worst_case", "ellipse", &ellipse),
        ("worst_case", "triangle", &hull),
        ("witness", "gust", &hit),
    ] {
        write("accept", rule, name, "verified", case);
    }
    reject_worst_cases(&gust, &damping, &ellipse, &hull);
    reject_witnesses(&hit);
}

fn reject_worst_cases(gust: &Certificate, damping: &Certificate, ellipse: &Certificate, hull: &Certificate) {
    let rule = "worst_case";
    let zone = "inconclusive worst_case ZoneIsRefutedOnCell";
    let (gust, damping) = (|| gust.clone(), || damping.clone());
    reject(rule, "no_piece", "refuted worst_case PiecesCover", gust(), |c| pieces(c).clear());
    reject(rule, "last_piece_missing", "refuted worst_case PiecesCover", damping(), |c| drop(pieces(c).pop()));
    reject(rule, "a_varying_quantity_is_cut", "refuted worst_case PiecesCover", damping(), |c| {
        c.statement.uncertain[0].varying = true;
    });
    reject(rule, "state_in_no_part", "refuted worst_case FunctionalIsAffine", gust(), |c| {
        piece(c).splits[0][0].states.clear();
    });
    reject(rule, "factor_of_the_row_missing", "refuted worst_case FactorsAnnihilateResponse", gust(), |c| {
        piece(c).splits[0][0].factors.pop();
    });
    reject(rule, "factor_of_the_course_missing", "refuted worst_case FactorsAnnihilateResponse", gust(), |c| {
        piece(c).splits[0][0].central.pop();
    });
    reject(rule, "bound_too_small", "inconclusive worst_case FormIsBounded", damping(), |c| {
        piece(c).bounds[0] = rational("1");
    });
    reject(rule, "negative_bound", "refuted worst_case EvidenceFitsClaim", damping(), |c| {
        piece(c).bounds[0] = rational("-1");
    });
    reject(rule, "wider_gust", zone, gust(), |c| c.statement.disturbances[0].range.to = rational("1"));
    reject(rule, "wider_starts", zone, gust(), |c| {
        c.statement.starts = Starts::Box(vec![rational("4/5"), rational("0")])
    });
    reject(rule, "start_in_the_zone", zone, gust(), |c| {
        c.statement.starts = Starts::Box(vec![rational("13/10"), rational("0")]);
    });
    reject(rule, "last_cell_missing", "refuted worst_case CellsCoverWindow", gust(), |c| drop(piece(c).cells.pop()));
    reject(rule, "no_tail", "refuted worst_case CellsCoverWindow", gust(), |c| piece(c).tail = None);
    reject(rule, "constant_not_leading", "inconclusive cone LowerRealPartIsLess", gust(), |c| {
        piece(c).tail.as_mut().expect("a tail").leads[0].roots.clear();
    });
    reject(rule, "no_leaf", "refuted worst_case LeavesCoverTorus", gust(), |c| {
        piece(c).tail.as_mut().expect("a tail").leads[0].nodes.clear();
    });
    reject(rule, "larger_ellipse", "inconclusive worst_case ZoneIsRefutedOnCell", ellipse.clone(), |c| {
        if let Starts::Ellipsoid(shape) = &mut c.statement.starts {
            shape[0][0] = rational("4");
        }
    });
    reject(rule, "no_ellipse", "refuted worst_case EvidenceFitsClaim", ellipse.clone(), |c| {
        if let Starts::Ellipsoid(shape) = &mut c.statement.starts {
            shape[0][0] = rational("1/10");
        }
    });
    reject(rule, "farther_corner", "inconclusive worst_case ZoneIsRefutedOnCell", hull.clone(), |c| {
        if let Starts::Hull(points) = &mut c.statement.starts {
            points[0][0] = rational("2");
        }
    });
}

fn reject_witnesses(hit: &Certificate) {
    let rule = "witness";
    let admissible = "refuted witness WitnessIsAdmissible";
    let hit = || hit.clone();
    reject(rule, "start_outside", admissible, hit(), |c| witness(c).start[0] = rational("1/5"));
    reject(rule, "gust_too_strong", admissible, hit(), |c| witness(c).signals[0][0].1 = rational("1/5"));
    reject(rule, "signal_too_short", admissible, hit(), |c| drop(witness(c).signals[0].pop()));
    reject(rule, "one_signal_missing", admissible, hit(), |c| witness(c).signals.clear());
    reject(rule, "first_said", "refuted worst_case EvidenceFitsClaim", hit(), |c| {
        if let keepout_checker::statement::Claim::Enters { first, .. } = &mut c.statement.claim {
            *first = true;
        }
    });
    reject(rule, "another_instant", "refuted witness InstantIsInWindow", hit(), |c| {
        c.statement.zone.until = Some(rational("1/10"));
    });
    reject(rule, "zone_out_of_reach", "inconclusive witness ZoneIsProvedAtInstant", hit(), |c| {
        if let Formula::Atom(atom) = &mut c.statement.zone.inside {
            atom.polynomial.terms[1].coefficient = rational("-13/10");
        }
    });
    reject(rule, "factor_missing", "refuted worst_case FactorsAnnihilateResponse", hit(), |c| {
        witness(c).splits[0][0].factors.pop();
    });
}
