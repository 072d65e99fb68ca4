//! Late entries: instants at which the phases come into a part of the torus where the zone is true.
//!
//! On a box of the torus where the zone is true for all t >= t0, the trajectory is in the zone as soon as all phases omega_k t are in
//! the box. Along the instants at which the first phase is at the box's centre, the second moves by a fixed angle, so the first hit
//! is found by the Euclidean algorithm, not by stepping through time. The floating-point numbers here propose; the instant is then
//! judged by enclosures.

use crate::enclosure::{Enclosure, approx_value};
use crate::problem::Problem;
use crate::strategy::cone::{Plan, approx_frequency, widest};
use crate::strategy::proposal::{ApproxBox, Proposals, approx_box};
use keepout_checker::lead::{AngleBox, halves, whole_torus};
use keepout_checker::number::Rational;
use num_bigint::BigInt;
use std::collections::VecDeque;
use std::f64::consts::TAU;

/// Boxes that are looked at.
const MAX_BOXES: u32 = 20_000;

/// Boxes of this radius are small.
const SMALL: f64 = 0.02;

/// Candidates that are returned.
const MAX_CANDIDATES: usize = 4;

/// Boxes in the zone that are tried.
const MAX_TARGETS: usize = 256;

/// Hits of the first two phases that are tried for one box.
const MAX_HITS: u32 = 20_000;

/// Stretches of time after `from` in which the zone is probably entered, the earliest first.
pub(crate) fn candidates(
    plan: &Plan,
    from: &Rational,
    problem: &Problem,
    enclosure: &Enclosure,
) -> Vec<(Rational, Rational)> {
    let frequencies: Vec<f64> = plan.base.iter().map(|root| approx_frequency(*root, enclosure)).collect();
    if frequencies.len() < 2 {
        return Vec::new();
    }
    let start = approx_value(from);
    let mut hits: Vec<(f64, ApproxBox)> = targets(plan, from, MAX_TARGETS, problem, enclosure)
        .into_iter()
        .map(|angles| approx_box(&angles))
        .filter_map(|target| first_visit(&target, &frequencies, start).map(|time| (time, target)))
        .collect();
    hits.sort_by(|a, b| a.0.total_cmp(&b.0));
    let stretch = |(time, target): &(f64, ApproxBox)| {
        let reach = target.iter().zip(&frequencies).map(|((_, radius), w)| radius / w).fold(f64::MAX, f64::min);
        let (low, high) = (rational((time - reach).max(start))?.max(from.clone()), rational(time + reach)?);
        (low < high).then_some((low, high))
    };
    hits.iter().take(MAX_CANDIDATES).filter_map(stretch).collect()
}

/// Boxes on which the zone is true for all t >= t0, or where a trace vanishes that makes it true where it does; at most so many.
pub(crate) fn targets(
    plan: &Plan,
    t0: &Rational,
    count: usize,
    problem: &Problem,
    enclosure: &Enclosure,
) -> Vec<AngleBox> {
    let leading = plan.leading(t0, problem, enclosure);
    let proposals = Proposals::new(plan, &leading.forms, problem, enclosure);
    let mut found = Vec::new();
    let mut open: VecDeque<AngleBox> = VecDeque::from([whole_torus(plan.base.len())]);
    for _ in 0..MAX_BOXES {
        let Some(angles) = open.pop_front() else { break };
        if found.len() == count {
            break;
        }
        match proposals.truth(&approx_box(&angles), problem) {
            Some(true) if leading.truth(&angles) == Some(true) => found.push(angles),
            Some(true) => {}
            Some(false) => {}
            None if is_small(&angles) && proposals.is_true_at_zero(&approx_box(&angles), problem) => found.push(angles),
            None => open
                .extend(widest(&angles).and_then(|axis| halves(&angles, axis)).into_iter().flat_map(|(l, u)| [l, u])),
        }
    }
    found
}

fn is_small(angles: &AngleBox) -> bool {
    angles.iter().all(|(_, radius)| approx_value(radius) < SMALL)
}

/// The first instant from `start` on at which all phases are in the box, the first one at its centre.
fn first_visit(target: &[(f64, f64)], frequencies: &[f64], start: f64) -> Option<f64> {
    let (period, ratio) = (TAU / frequencies[0], frequencies[1] / frequencies[0]);
    let offset = (start / period - target[0].0 / TAU).ceil();
    let time = |turn: f64| (target[0].0 / TAU + offset + turn) * period;
    let inside = |t: f64| {
        target.iter().zip(frequencies).skip(1).all(|((centre, radius), w)| {
            let turns = (w * t - centre) / TAU;
            (turns - turns.round()).abs() * TAU <= *radius
        })
    };
    let mut turn = 0.0;
    for _ in 0..MAX_HITS {
        let phase = (frequencies[1] * time(turn) - target[1].0 + target[1].1) / TAU;
        turn += first_hit(ratio.rem_euclid(1.0), phase.rem_euclid(1.0), (target[1].1 / (TAU / 2.0)).min(1.0))? as f64;
        if inside(time(turn)) {
            return Some(time(turn));
        }
        turn += 1.0;
    }
    None
}

/// The least m >= 0 with (step m + start) mod 1 in [0, width].
fn first_hit(step: f64, start: f64, width: f64) -> Option<i128> {
    const ONE: f64 = (1_u64 << 50) as f64;
    let (modulus, step, start, width) =
        (1_i128 << 50, (step * ONE) as i128, (start * ONE) as i128, (width * ONE) as i128);
    if start <= width {
        return Some(0);
    }
    // step m mod 1 is to be in [1 - start, 1 - start + width].
    least_multiple(step, modulus, modulus - start, (modulus - start + width).min(modulus - 1))
}

/// The least m >= 0 with low <= (step m) mod modulus <= high, for 0 <= low <= high < modulus, by the Euclidean algorithm.
fn least_multiple(step: i128, modulus: i128, low: i128, high: i128) -> Option<i128> {
    if low == 0 {
        return Some(0);
    }
    if step == 0 {
        return None;
    }
    let first = (low + step - 1) / step;
    if first * step <= high {
        return Some(first);
    }
    // step m - modulus k in [low, high]: modulus k mod step in [-high, -low] mod step.
    let turns = least_multiple(modulus % step, step, (-high).rem_euclid(step), (-low).rem_euclid(step))?;
    Some((low + modulus * turns + step - 1) / step)
}

fn rational(x: f64) -> Option<Rational> {
    const SCALE: f64 = (1_u64 << 40) as f64;
    x.is_finite().then(|| Rational::new(BigInt::from((x * SCALE) as i128), BigInt::from(1_u64 << 40)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_least_multiple_is_that_of_a_search() {
        for modulus in [7_i128, 30, 101] {
            for step in 0..modulus {
                for low in 0..modulus {
                    for high in low..modulus {
                        let plain = (0..modulus).find(|m| (low..=high).contains(&(step * m % modulus)));
                        assert_eq!(least_multiple(step, modulus, low, high), plain, "{step} {modulus} {low} {high}");
                    }
                }
            }
        }
    }
}
