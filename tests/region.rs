//! Sets of starts: found, proved, and read back, for bounded, decaying and growing motions.

use keepout_checker::statement::{Claim, Formula, Relation, Statement};
use keepout_synthesis::{Options, Proof, RegionFailure, certify_region};
use keepout_tests::system::{System, atom};

fn found(statement: &Statement) -> Result<Proof, RegionFailure> {
    let found = certify_region(statement, &Options::default()).expect("the checker accepts what the search finds");
    if let Ok(proof) = &found {
        println!("{}", proof.statement().words());
    }
    found
}

fn region(statement: &Statement) -> keepout_checker::region::Region {
    let proof = found(statement).expect("a set");
    let Claim::Region(region) = &proof.statement().claim else { panic!("a claim about a set") };
    (**region).clone()
}

fn above(powers: &'static [u32], limit: &'static str) -> Formula {
    atom(&[("1", powers), (limit, &[])], Relation::NonNegative)
}

#[test]
fn rotation_needs_no_growth() {
    let rotation = System::new("0 1; -1 0", "0 0", "1 0");
    let region = region(&rotation.statement(above(&[1], "-11/10")));
    assert!(region.rates.is_empty() && region.base.len() == 1 && region.power.is_none());
}

#[test]
fn rotation_about_an_offset_keeps_the_constant() {
    let rotation = System::new("0 1; -1 0", "0 3", "1 0");
    region(&rotation.statement(above(&[1], "-51/10")));
    assert_eq!(found(&rotation.statement(above(&[1], "-49/10"))).err(), Some(RegionFailure::Meets));
}

#[test]
fn invariant_of_the_rotation_is_seen_exactly() {
    let rotation = System::new("0 1; -1 0", "0 0", "1 0");
    let differs = atom(&[("1", &[2]), ("1", &[0, 2]), ("-1", &[])], Relation::NonZero);
    region(&rotation.statement(differs));
}

#[test]
fn integrator_with_rotation_runs_away() {
    let drift = System::new("0 1 0 0; 0 0 0 0; 0 0 0 1; 0 0 -2 0", "0 0 0 0", "0 1 1 0");
    // x0 = t, x2 = cos(sqrt 2 t)
    let region = region(&drift.statement(atom(&[("1", &[1]), ("3", &[0, 0, 1]), ("1", &[])], Relation::NonPositive)));
    assert!(region.power.is_none());
}

#[test]
fn decay_with_a_jordan_block_bounds_time_by_a_power() {
    let lag = System::new("-1 1; 0 -1", "0 0", "0 1");
    let region = region(&lag.statement(above(&[1], "-37/100")));
    assert!(region.power.is_some());
}

#[test]
fn irrational_rates_get_bands() {
    // roots -2 +- sqrt 3
    let slow = System::new("0 1; -1 -4", "0 0", "1 0");
    let region = region(&slow.statement(above(&[1], "-11/10")));
    assert_eq!(region.rates.len(), 1);
    assert!(region.rates[0].lo < region.rates[0].hi);
}

#[test]
fn servo_settles_at_its_command() {
    let servo = System::new("0 1; -25 -6", "0 25", "0 0");
    region(&servo.statement(above(&[1], "-11/10")));
}

#[test]
fn irrational_damping_is_one_rate() {
    // z^3 + z + 1: one real root, a pair with the opposite half as real part; growing.
    let cubic = System::new("0 1 0; 0 0 1; -1 -1 0", "0 0 0", "1 0 0");
    // |x|^2 grows: not in a small ball.
    let small = atom(&[("1", &[2]), ("1", &[0, 2]), ("1", &[0, 0, 2]), ("-1/10", &[])], Relation::NonPositive);
    let region = region(&cubic.statement(small));
    assert_eq!(region.rates.len(), 1);
}

#[test]
fn saddle_leaves_along_its_unstable_direction() {
    let boom = System::new("0 1; 4 -3/10", "0 0", "1/50 -7/200");
    region(&boom.statement(atom(&[("1", &[1])], Relation::NonPositive)));
    region(&boom.statement(Formula::And(vec![
        atom(&[("1", &[0, 1]), ("-2", &[1])], Relation::Positive),
        atom(&[("1", &[1]), ("-1/20", &[])], Relation::Positive),
    ])));
}

#[test]
fn two_frequencies_fill_a_torus() {
    let two = System::new("0 1 0 0; -1 0 0 0; 0 0 0 1; 0 0 -2 0", "0 0 0 0", "1 0 1 0");
    let region =
        region(&two.statement(atom(&[("1", &[1]), ("1", &[0, 0, 1]), ("-21/10", &[])], Relation::NonNegative)));
    assert_eq!(region.base.len(), 2);
}

#[test]
fn commensurate_frequencies_share_an_angle() {
    let ratio = System::new("0 1 0 0; -4 0 0 0; 0 0 0 1; 0 0 -9 0", "0 0 0 0", "1 0 1 0");
    let region =
        region(&ratio.statement(atom(&[("1", &[1]), ("1", &[0, 0, 1]), ("17/10", &[])], Relation::NonPositive)));
    assert_eq!(region.base.len(), 1);
}

#[test]
fn the_words_say_what_every_start_means() {
    let rotation = System::new("0 1; -1 0", "0 0", "1 0");
    let words = found(&rotation.statement(above(&[1], "-11/10"))).expect("a set").statement().words();
    for line in [
        "This statement speaks of all solutions of the equations below that start in a set",
        "A solution is in the zone at an instant t if and only if at t:",
        "  Every start in the set S below is safe for ever: whatever point of S the states are at, the solution that starts there is",
        "    r_1 is the only root of (1) z^0 + (1) z^2",
        "    mu_1 = r_1, e_1 = exp(i ((1) phi_1));",
        "    phi_1 is any real number (it stands for Im(r_1) t);",
    ] {
        assert!(words.contains(line), "{line}\n{words}");
    }
}

#[test]
fn what_touches_has_no_set() {
    // cos t <= 1 is exact for the trajectory; the search proves sets by strict signs.
    let rotation = System::new("0 1; -1 0", "0 0", "1 0");
    let touched = atom(&[("1", &[1]), ("-1", &[])], Relation::Positive);
    assert_eq!(found(&rotation.statement(touched)).err(), Some(RegionFailure::Meets));
}

#[test]
fn decay_to_the_border_has_a_set_that_never_gets_there() {
    // x = 1 - exp(-t) < 1.
    let rise = System::new("-1", "1", "0");
    let proof = found(&rise.statement(above(&[1], "-1"))).expect("a set");
    assert!(matches!(proof.statement().claim, Claim::Region(_)));
}

#[test]
fn frequencies_of_modes_with_different_damping_are_related() {
    // Roots -1 +- 2i and -2 +- 3i: no sum of multiples of one is the other.
    let modes = System::new("-1 2 0 0; -2 -1 0 0; 0 0 -2 3; 0 0 -3 -2", "0 0 0 0", "1 0 1 0");
    let region =
        region(&modes.statement(atom(&[("1", &[1]), ("1", &[0, 0, 1]), ("-5/2", &[])], Relation::NonNegative)));
    assert_eq!(region.base.len(), 1);
    let mut turns: Vec<i64> = region.exponents.iter().map(|e| e.turns[0]).collect();
    turns.sort_unstable();
    assert_eq!(turns, [2, 3]);
}
