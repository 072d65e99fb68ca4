//! Pivots: functions whose sign is taken case by case, where traces vanish.

use crate::enclosure::Enclosure;
use crate::problem::Problem;
use crate::strategy::entry::needed_in_cases;
use crate::strategy::taylor::{derivatives, taylor};
use keepout_checker::certificate::{Auxiliary, Cell, Factor, Identity, Pivot, Sign};
use keepout_checker::number::Rational;
use keepout_core::{IntegerPolynomial, factorize};
use num_traits::{One, Zero};
use std::cmp::Ordering;

/// What happens right after t = 0.
pub(crate) enum AtStart {
    /// No trace vanishes there, or no help comes from it.
    Ordinary,
    /// The zone is false on the cell [0, cell.to].
    Clear(Cell),
    /// The zone is true at each instant after 0 of the cell.
    Entered(Cell),
}

/// What a pivot shows on a cell.
pub(crate) enum Touch {
    /// Nothing.
    None,
    /// The zone is false on the cell.
    Clear(Cell),
    /// The zone is true where the pivot vanishes, which it does.
    Entered(Cell),
}

/// A cell after t = 0 in which the zone is entered is made this short: 2^-34, times the first length tried.
const START_HALVINGS: u32 = 80;

/// Looks at the stretch right after t = 0, where traces may vanish. The zone is false at t = 0.
pub(crate) fn at_start(to: &Rational, problem: &Problem, enclosure: &mut Enclosure) -> AtStart {
    let vanishing: Vec<(usize, usize)> = (0..problem.traces())
        .filter(|i| !enclosure.forms[*i].terms.is_empty())
        .filter_map(|i| problem.sequences[i].values().iter().position(|y| !y.is_zero()).map(|k| (i, k)))
        .filter(|(_, k)| *k > 0)
        .collect();
    if vanishing.is_empty() {
        return AtStart::Ordinary;
    }
    let mut to = to.clone();
    let mut shortened = 0;
    for _ in 0..START_HALVINGS {
        let zero = Rational::zero();
        let order = enclosure.order(&zero, &to) + vanishing.iter().map(|(_, k)| *k as u32).max().unwrap_or(0) + 2;
        let mut signs = all_signs(&zero, &to, order, problem, enclosure);
        let mut listed = Vec::new();
        for (i, k) in &vanishing {
            let sign = enclosure.quotient_at_start(*i, *k, &to, order).and_then(|v| v.certain_sign());
            signs[*i] = sign;
            listed.extend(sign.map(|s| (*i, *k as u32, s)));
        }
        let truth = problem.truth(&signs);
        let plain = signs.iter().enumerate().filter(|(i, _)| vanishing.iter().all(|(v, _)| v != i));
        let plain = plain.filter_map(|(i, s)| s.map(|s| (i, s))).collect();
        let cell = Cell { to: to.clone(), order, signs: plain, pivot: Pivot::Start(listed) };
        match truth {
            Some(false) => return AtStart::Clear(cell),
            Some(true) if shortened >= 34 => return AtStart::Entered(cell),
            Some(true) => shortened += 1,
            None => {}
        }
        to /= Rational::from_integer(2.into());
    }
    AtStart::Ordinary
}

fn all_signs(
    a: &Rational,
    b: &Rational,
    order: u32,
    problem: &Problem,
    enclosure: &mut Enclosure,
) -> Vec<Option<Sign>> {
    (0..problem.factors.len()).map(|i| enclosure.sign(problem, i, a, b, order)).collect()
}

/// Decides a cell [a, b] by the sign of a function that changes it there, or may touch zero there.
pub(crate) fn touch(a: &Rational, b: &Rational, problem: &mut Problem, enclosure: &mut Enclosure) -> Option<Touch> {
    divide_at(a, b, problem);
    enclosure.renew(problem)?;
    let order = enclosure.order(a, b);
    let signs = all_signs(a, b, order, problem, enclosure);
    for pivot in 0..signs.len() {
        if signs[pivot].is_some() {
            continue;
        }
        let truths = problem.truths(&signs, pivot);
        let cell = |signs| Cell { to: b.clone(), order, signs, pivot: Pivot::Function(pivot) };
        if truths == [Some(false); 3] {
            return Some(Touch::Clear(cell(needed_in_cases(problem, signs, pivot))));
        }
        let ends = [a, b].map(|t| enclosure.sign(problem, pivot, t, t, order));
        let opposite = [Some(Ordering::Less), Some(Ordering::Greater)];
        if truths[1] == Some(true) && (ends == opposite || ends == [opposite[1], opposite[0]]) {
            let known = signs.iter().enumerate().filter_map(|(i, s)| s.map(|s| (i, s))).collect();
            return Some(Touch::Entered(cell(known)));
        }
    }
    Some(Touch::None)
}

/// Adds identities for traces that are multiples of a polynomial in t with a root in [a, b].
pub(crate) fn divide_at(a: &Rational, b: &Rational, problem: &mut Problem) -> Option<()> {
    for w in candidates(a, b, problem).into_iter().filter(|w| !w[0].is_zero()) {
        for target in 0..problem.traces() {
            let Some((power, cofactor)) = divided(target, &w, problem) else { continue };
            let family = problem.family(&IntegerPolynomial::variable())?;
            let factors = vec![Factor { family, multiplicity: u32::try_from(w.len()).ok()? }];
            let pivot = problem.add_auxiliary(Auxiliary { factors, derivatives: derivatives(&w) })?;
            let cofactor = problem.add_auxiliary(cofactor)?;
            let identity = Identity { target, summands: vec![vec![(pivot, power), (cofactor, 1)]] };
            if !problem.identities.contains(&identity) {
                problem.identities.push(identity);
            }
        }
    }
    Some(())
}

/// Polynomials in t that may vanish in [a, b] together with traces: t - q for the simplest rational q, and the factors of P for
/// each trace P(t) exp(r t).
fn candidates(a: &Rational, b: &Rational, problem: &Problem) -> Vec<Vec<Rational>> {
    let simplest = simplest_between(a, b);
    let mut list = vec![vec![-simplest, Rational::one()]];
    for (sequence, factors) in problem.sequences.iter().zip(&problem.factors).take(problem.traces()) {
        let [factor] = factors.as_slice() else { continue };
        let family = problem.families[factor.family].to_monic();
        if family.degree() != 1 || factor.multiplicity < 2 {
            continue;
        }
        let rate = -family.coefficients()[0].clone();
        let p = without_exponential(&sequence.derivatives(factor.multiplicity as usize), &rate);
        for part in factorize(&IntegerPolynomial::from_rationals(&p)).factors {
            let w = part.polynomial.to_monic().coefficients().to_vec();
            let ends = [a, b].map(|t| part.polynomial.value_rational(t));
            if &ends[0] * &ends[1] <= Rational::zero() && !list.contains(&w) {
                list.push(w);
            }
        }
    }
    list
}

/// The coefficients of P from the list of derivatives at 0 of P(t) exp(rate t).
fn without_exponential(list: &[Rational], rate: &Rational) -> Vec<Rational> {
    let p = taylor(list);
    let powers = std::iter::successors(Some(Rational::one()), |power| Some(-(power * rate)));
    let inverse = taylor(&powers.take(p.len()).collect::<Vec<_>>());
    (0..p.len()).map(|k| (0..=k).map(|j| &p[j] * &inverse[k - j]).sum()).collect()
}

/// The trace as w^power times a cofactor, power >= 1 as great as possible, if w divides it.
///
/// g = w h iff h has the annihilator with each multiplicity lowered by deg w, and the derivatives that the Leibniz rule gives.
fn divided(index: usize, w: &[Rational], problem: &Problem) -> Option<(u32, Auxiliary)> {
    let degree = u32::try_from(w.len() - 1).ok()?;
    let mut factors = problem.factors[index].clone();
    let mut power = 0;
    let mut derivatives = problem.sequences[index].derivatives(problem.degree(&factors));
    while !factors.is_empty() && factors.iter().all(|f| f.multiplicity > degree) {
        let lower: Vec<Factor> =
            factors.iter().map(|f| Factor { multiplicity: f.multiplicity - degree, ..*f }).collect();
        let quotient = series_quotient(&derivatives, w);
        let size = problem.degree(&lower);
        let m = lower.iter().fold(keepout_checker::polynomial::Polynomial::one(), |m, f| {
            m.mul(&problem.families[f.family].to_monic().power(f.multiplicity))
        });
        let sequence = keepout_checker::sequence::Sequence::from_rationals(&quotient);
        if !sequence.is_annihilated(&m, quotient.len() - size) {
            break;
        }
        (factors, derivatives, power) = (lower, quotient[..size].to_vec(), power + 1);
    }
    (power > 0).then_some((power, Auxiliary { factors, derivatives }))
}

/// The derivatives at 0 of g / w from the list of those of g; w(0) is not 0.
fn series_quotient(list: &[Rational], w: &[Rational]) -> Vec<Rational> {
    let mut quotient: Vec<Rational> = Vec::new();
    for (k, c) in taylor(list).iter().enumerate() {
        let known: Rational = (1..w.len().min(k + 1)).map(|j| &w[j] * &quotient[k - j]).sum();
        quotient.push((c - known) / &w[0]);
    }
    derivatives(&quotient)
}

/// The rational with the least denominator in [a, b], 0 < a < b. Source: Stern-Brocot tree.
pub(crate) fn simplest_between(a: &Rational, b: &Rational) -> Rational {
    let whole = a.ceil();
    if whole <= *b {
        return whole;
    }
    let floor = a.floor();
    let rest = simplest_between(&(b - &floor).recip(), &(a - &floor).recip());
    floor + rest.recip()
}
