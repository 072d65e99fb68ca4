//! Points of the trajectory cone that stay in the zone for all large times.

use crate::enclosure::Enclosure;
use crate::problem::Problem;
use crate::strategy::cone::{Plan, widest};
use crate::strategy::late;
use crate::strategy::proposal::{Proposals, approx_box};
use keepout_checker::certificate::{Meeting, Sign};
use keepout_checker::lead::{AngleBox, LeadForm, halves, whole_torus};
use keepout_checker::number::Rational;
use num_traits::Zero;
use std::cmp::Ordering;

/// Boxes that are looked at in search of common zeros.
const MAX_BOXES: u32 = 4_000;

/// Boxes of common zeros are made this small: 44/7 times this power of two, so that signs of other functions show.
const DEPTH: u32 = 12;

/// A box of the torus in which the zone is true for all t >= t0, at a common zero of functions whose squares add up to a
/// trace, or of a trace itself; `plain`: also where no function vanishes.
pub(crate) fn meeting(
    plan: &Plan,
    t0: &Rational,
    plain: bool,
    problem: &Problem,
    enclosure: &Enclosure,
    effort: &mut u64,
) -> Option<Meeting> {
    let leading = plan.leading(t0, problem, enclosure);
    let proposals = Proposals::new(plan, &leading.forms, problem, enclosure);
    let functions = 0..leading.forms.len();
    let dimension = plan.base.len();
    let evidence = |zeros: Vec<(usize, usize)>, angles: AngleBox| {
        let others = functions.clone().filter(|i| !problem.is_part(*i) && zeros.iter().all(|(f, _)| f != i));
        let signs: Vec<(usize, Sign)> = others.filter_map(|i| Some((i, leading.sign(i, &angles)?))).collect();
        Meeting { far: plan.far_field(t0, &leading), angles, zeros, signs }
    };
    if plain
        && let Some(angles) = late::targets(plan, t0, 1, problem, enclosure).pop()
        && leading.truth(&angles) == Some(true)
    {
        return Some(evidence(Vec::new(), angles));
    }
    sets_of_zeros(problem, dimension).into_iter().find_map(|zeros| {
        let truth = |angles: &AngleBox| {
            let sign = |i: usize| if zeros.contains(&i) { Some(Ordering::Equal) } else { leading.sign(i, angles) };
            problem.truth(&functions.clone().map(sign).collect::<Vec<_>>())
        };
        let may_vanish = |angles: &AngleBox| {
            let angles = approx_box(angles);
            zeros.iter().all(|f| proposals.sign(*f, &angles).is_none())
        };
        let (angles, axes) = common_zero(&zeros, &leading.forms, dimension, &may_vanish, &truth, effort)?;
        Some(evidence(zeros.into_iter().zip(axes).collect(), angles))
    })
}

/// Functions that are to vanish together: the squares in an identity, of all identities at once and of each; one trace.
fn sets_of_zeros(problem: &Problem, dimension: usize) -> Vec<Vec<usize>> {
    let squares = |i: &keepout_checker::certificate::Identity| -> Vec<usize> {
        i.summands.iter().flatten().filter(|(_, power)| power % 2 == 0).map(|(f, _)| *f).collect()
    };
    let mut sets: Vec<Vec<usize>> = problem.identities.iter().map(squares).collect();
    sets.push(sets.concat());
    sets.extend((0..problem.atoms()).map(|trace| vec![trace]));
    for set in &mut sets {
        set.sort_unstable();
        set.dedup();
    }
    sets.retain(|set| !set.is_empty() && set.len() <= dimension);
    sets.sort();
    sets.dedup();
    sets
}

/// A small box on whose faces the functions have opposite signs, each across an axis of its own, and where the zone is true.
fn common_zero(
    zeros: &[usize],
    forms: &[Option<LeadForm>],
    dimension: usize,
    may_vanish: &dyn Fn(&AngleBox) -> bool,
    truth: &dyn Fn(&AngleBox) -> Option<bool>,
    effort: &mut u64,
) -> Option<(AngleBox, Vec<usize>)> {
    let functions: Vec<&LeadForm> = zeros.iter().map(|f| forms[*f].as_ref()).collect::<Option<_>>()?;
    let mut open = vec![(whole_torus(dimension), 0)];
    for _ in 0..MAX_BOXES {
        let (angles, depth) = open.pop()?;
        *effort = effort.checked_sub(1)?;
        if !may_vanish(&angles) {
            continue;
        }
        let here = truth(&angles);
        if here == Some(false) {
            continue;
        }
        if here == Some(true)
            && let Some(axes) = own_axes(&functions, &angles)
        {
            return Some((angles, axes));
        }
        if depth == DEPTH * u32::try_from(dimension).ok()? {
            // Zeros on the border of boxes: the box is widened.
            let wide: AngleBox =
                angles.iter().map(|(c, r)| (c.clone(), r * Rational::new(5.into(), 2.into()))).collect();
            if truth(&wide) == Some(true)
                && let Some(axes) = own_axes(&functions, &wide)
            {
                return Some((wide, axes));
            }
            continue;
        }
        let (lower, upper) = halves(&angles, widest(&angles)?)?;
        open.push((upper, depth + 1));
        open.push((lower, depth + 1));
    }
    None
}

/// An axis for each function across which it has opposite signs on the faces of the box.
fn own_axes(functions: &[&LeadForm], angles: &AngleBox) -> Option<Vec<usize>> {
    let changes = |f: &LeadForm, axis: usize| {
        let (centre, radius) = &angles[axis];
        let ends = [centre - radius, centre + radius].map(|end| {
            let mut face = angles.clone();
            face[axis] = (end, Rational::zero());
            f.enclose(&face).and_then(|v| v.certain_sign())
        });
        matches!(
            ends,
            [Some(Ordering::Less), Some(Ordering::Greater)] | [Some(Ordering::Greater), Some(Ordering::Less)]
        )
    };
    let mut axes: Vec<usize> = Vec::new();
    for f in functions {
        axes.push((0..angles.len()).find(|axis| !axes.contains(axis) && changes(f, *axis))?);
    }
    Some(axes)
}
