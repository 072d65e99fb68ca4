//! Whether a witness is one of the admissible trajectories.

use crate::many::Witness;
use crate::statement::{Range, Rational, Starts, Statement};
use crate::substitution::substituted;
use num_traits::{One, Signed, Zero};

/// The plain statement of the witness's values and start. `None`: these are not admissible.
pub(crate) fn chosen(witness: &Witness, statement: &Statement) -> Option<Statement> {
    let inside = |(value, range): (&Rational, &Range)| range.from <= *value && *value <= range.to;
    let ranges: Vec<&Range> = statement.uncertain.iter().map(|u| &u.range).collect();
    let fits = ranges.len() == witness.uncertain.len() && witness.start.len() == statement.states.len();
    if !fits || !starts_there(witness, statement) || !signals_are_admissible(witness, statement) {
        return None;
    }
    if !witness.uncertain.iter().zip(ranges).all(inside) {
        return None;
    }
    let mut single = statement.clone();
    single.starts = Starts::One;
    single.states.iter_mut().zip(&witness.start).for_each(|(state, start)| state.start.clone_from(start));
    let points: Vec<Range> = witness.uncertain.iter().map(|p| Range { from: p.clone(), to: p.clone() }).collect();
    // Without deviation there is no group.
    Some(substituted(&single, &points)?.0)
}

/// Whether the start is admissible.
fn starts_there(witness: &Witness, statement: &Statement) -> bool {
    let centre = statement.states.iter().map(|s| &s.start);
    let offset: Vec<Rational> = witness.start.iter().zip(centre).map(|(x, c)| x - c).collect();
    let one = Rational::one();
    let combined = |vectors: &[Vec<Rational>]| -> Vec<Rational> {
        let entry = |i: usize| vectors.iter().zip(&witness.weights).filter_map(|(v, w)| Some(v.get(i)? * w)).sum();
        (0..offset.len()).map(entry).collect()
    };
    match &statement.starts {
        Starts::One => offset.iter().all(Zero::is_zero),
        Starts::Box(radii) => offset.iter().zip(radii).all(|(x, r)| x.abs() <= *r),
        Starts::Zonotope(generators) => {
            let bounded = witness.weights.iter().all(|w| w.abs() <= one);
            witness.weights.len() == generators.len() && bounded && combined(generators) == offset
        }
        Starts::Hull(points) => {
            // x = (1 - sum of weights) c + sum of weights p_i.
            let total: Rational = witness.weights.iter().sum();
            let convex = witness.weights.iter().all(|w| !w.is_negative()) && total <= one;
            let centres = statement.states.iter().map(|s| &s.start * &total);
            let moved: Vec<Rational> = combined(points).into_iter().zip(centres).map(|(x, c)| x - c).collect();
            witness.weights.len() == points.len() && convex && moved == offset
        }
        Starts::Ellipsoid(shape) => {
            // Lemma: with x - c = Q v and v' Q v <= 1, h (x - c) = h Q v <= sqrt(h Q h') sqrt(v' Q v) for each h.
            let form: Rational = witness.weights.iter().zip(&offset).map(|(v, x)| v * x).sum();
            witness.weights.len() == shape.len() && combined(shape) == offset && form <= one
        }
    }
}

/// Whether each disturbance has values in its range, on stretches that lead from 0 to the instant.
fn signals_are_admissible(witness: &Witness, statement: &Statement) -> bool {
    let one = |(signal, range): (&Vec<(Rational, Rational)>, &Range)| {
        let mut reached = Rational::zero();
        let increasing = signal.iter().all(|(until, level)| {
            let fits = reached <= *until && range.from <= *level && *level <= range.to;
            reached.clone_from(until);
            fits
        });
        increasing && reached == witness.at
    };
    let ranges = statement.disturbances.iter().map(|d| &d.range);
    witness.signals.len() == statement.disturbances.len() && witness.signals.iter().zip(ranges).all(one)
}
