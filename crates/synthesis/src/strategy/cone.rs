//! Cones: leading terms, their angles, and a bisection of the torus on which the zone is false.

use crate::enclosure::{Enclosure, approx_value};
use crate::problem::Problem;
use crate::strategy::entry::{needed, needed_in_cases};
use crate::strategy::equality::{OpenSum, value};
use crate::strategy::pivot::simplest_between;
use crate::strategy::proposal::{Proposals, approx_box};
use keepout_checker::certificate::{Angle, Cone, FarField, Lead, Node, RealPart, RootRef, Sign, Sum};
use keepout_checker::lead::{AngleBox, LeadForm, halves, whole_torus};
use keepout_checker::number::{Dyadic, Interval, Rational};
use keepout_checker::range::{Growth, Range, sign_of_products};
use keepout_core::ToRational;
use keepout_core::lattice::approx_integer_relations;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{ToPrimitive, Zero};
use std::cmp::Ordering;
use std::collections::{BTreeMap, BTreeSet};

/// The leading roots of functions with their equalities and angles: all of a far field but its start.
#[derive(Clone, Debug)]
pub(crate) struct Plan {
    pub(crate) base: Vec<usize>,
    pub(crate) angles: Vec<Angle>,
    pub(crate) leads: Vec<Option<Lead>>,
    pub(crate) sums: Vec<Sum>,
    /// Whether equal real parts were suspected and not proved for some trace.
    pub(crate) unproved: bool,
}

/// A sum of roots and its position.
type Step = (Vec<(i64, RootRef)>, usize);

/// Boxes that are looked at in floating point for one unit of effort.
const PROPOSALS: usize = 16;

/// The widest ratio of frequencies and the greatest multiple that relations are looked for with.
const MAX_RATIO: i64 = 48;
const MAX_MULTIPLE: i64 = 6;

impl Plan {
    /// Plans the cones of a problem, for all functions but those of which only even powers matter; families may be added to the
    /// problem, and the enclosure is renewed with them.
    pub(crate) fn new(problem: &mut Problem, enclosure: &mut Enclosure) -> Option<Self> {
        let is_odd = |f: &usize| {
            problem.identities.iter().flat_map(|i| i.summands.iter().flatten()).any(|(g, k)| g == f && k % 2 == 1)
        };
        let functions = (0..problem.factors.len()).filter(|f| *f < problem.traces() || is_odd(f)).collect::<Vec<_>>();
        Self::for_functions(&functions, problem, enclosure)
    }

    /// Plans the far field of all functions.
    pub(crate) fn of_all(problem: &mut Problem, enclosure: &mut Enclosure) -> Option<Self> {
        let all: Vec<usize> = (0..problem.factors.len()).collect();
        Self::for_functions(&all, problem, enclosure)
    }

    /// Plans the angles of these roots alone.
    pub(crate) fn for_roots(roots: &[usize], problem: &mut Problem, enclosure: &mut Enclosure) -> Option<Self> {
        // `find_angles` looks at the roots of leads.
        let lead = Lead { function: 0, roots: roots.to_vec(), real_part: RealPart::Single };
        let leads = vec![Some(lead)];
        let mut plan = Self { base: Vec::new(), angles: Vec::new(), leads, sums: Vec::new(), unproved: false };
        plan.find_angles(problem, enclosure)?;
        Some(plan)
    }

    fn for_functions(functions: &[usize], problem: &mut Problem, enclosure: &mut Enclosure) -> Option<Self> {
        let mut plan =
            Self { base: Vec::new(), angles: Vec::new(), leads: Vec::new(), sums: Vec::new(), unproved: false };
        for index in 0..problem.factors.len() {
            let lead = if functions.contains(&index) { plan.lead(index, problem, enclosure)? } else { None };
            plan.leads.push(lead);
        }
        plan.find_angles(problem, enclosure)?;
        Some(plan)
    }

    /// The leading roots of one function.
    fn lead(&mut self, index: usize, problem: &mut Problem, enclosure: &mut Enclosure) -> Option<Option<Lead>> {
        let terms = &enclosure.forms[index].terms;
        let Some(top) = terms.iter().map(|t| t.exponent.re.lo().clone()).max() else { return Some(None) };
        let roots: Vec<usize> = terms.iter().filter(|t| *t.exponent.re.hi() >= top).map(|t| t.root).collect();
        if roots.len() == 1 {
            return Some(Some(Lead { function: index, roots, real_part: RealPart::Single }));
        }
        if let Some(line) = common_line(&roots, problem, enclosure) {
            return Some(Some(Lead { function: index, roots, real_part: RealPart::Line(line) }));
        }
        let mut doubled = Vec::new();
        for root in &roots {
            let pair = [false, true].map(|conjugate| (1, RootRef { index: *root, conjugate }));
            let Some(sum) = self.sum(&pair, problem, enclosure)? else {
                self.unproved = true;
                return Some(None);
            };
            doubled.push(sum);
        }
        if doubled.windows(2).all(|w| self.sums[w[0]].root.index == self.sums[w[1]].root.index) {
            return Some(Some(Lead { function: index, roots, real_part: RealPart::Doubled(doubled) }));
        }
        self.unproved = true;
        Some(None)
    }

    /// Adds a sum; `Some(None)`: it could not be shown. `None`: the enclosure could not be renewed.
    pub(crate) fn sum(
        &mut self,
        parts: &[(i64, RootRef)],
        problem: &mut Problem,
        enclosure: &mut Enclosure,
    ) -> Option<Option<usize>> {
        if let Some(known) = self.sums.iter().position(|s| s.parts == parts) {
            return Some(Some(known));
        }
        let Some(open) = OpenSum::new(parts, problem, enclosure) else { return Some(None) };
        enclosure.renew(problem)?;
        Some(open.close(enclosure).map(|sum| {
            self.sums.push(sum);
            self.sums.len() - 1
        }))
    }

    /// Angles of all leading roots that are not real, in increasing order of frequency.
    fn find_angles(&mut self, problem: &mut Problem, enclosure: &mut Enclosure) -> Option<()> {
        let listed = self.leads.iter().flatten().flat_map(|l| l.roots.iter().copied());
        let mut roots: Vec<usize> = listed.filter(|r| !enclosure.table.roots()[*r].is_real).collect();
        roots.sort_by(|a, b| frequency(*a, enclosure).lo().cmp(frequency(*b, enclosure).lo()));
        roots.dedup();
        self.common_base(&roots, problem, enclosure)?;
        let mut turns: BTreeMap<usize, Vec<(usize, i64)>> = BTreeMap::new();
        if let Some(base) = self.base.first() {
            turns.insert(*base, vec![(0, 1)]);
        }
        let mut shown: Vec<(usize, Option<usize>)> = self.base.iter().map(|b| (*b, None)).collect();
        for root in roots {
            if turns.contains_key(&root) {
                continue;
            }
            let known: Vec<usize> = turns.keys().copied().collect();
            let mut found = None;
            for parts in relations(root, &known, enclosure) {
                if let Some(sum) = self.sum(&parts, problem, enclosure)?.filter(|s| self.sums[*s].root.index == root) {
                    found = Some((parts, sum));
                    break;
                }
            }
            let steps = match found {
                Some(step) => Some(vec![step]),
                None => self.long_relation(root, problem, enclosure)?,
            };
            for (parts, sum) in steps.iter().flatten() {
                let named = self.sums[*sum].root;
                if turns.contains_key(&named.index) {
                    continue;
                }
                turns.insert(named.index, combined(parts, named.conjugate, &turns));
                shown.push((named.index, Some(*sum)));
            }
            if steps.is_none() {
                self.base.push(root);
                turns.insert(root, vec![(self.base.len() - 1, 1)]);
                shown.push((root, None));
            }
        }
        let dimension = self.base.len();
        for (root, sum) in shown {
            let mut row = vec![0; dimension];
            for (axis, n) in &turns[&root] {
                row[*axis] += n;
            }
            self.angles.push(Angle { root, turns: row, sum });
        }
        Some(())
    }

    /// Sums, one after the other, that show a root as an integer combination of three or more base roots: proposed by lattice
    /// reduction. `Some(None)`: there is none.
    fn long_relation(
        &mut self,
        root: usize,
        problem: &mut Problem,
        enclosure: &mut Enclosure,
    ) -> Option<Option<Vec<Step>>> {
        if self.base.len() < 3 {
            return Some(None);
        }
        let scale = Rational::from_integer(BigInt::from(1) << (enclosure.bits - enclosure.bits / 4));
        let scaled = |root: &usize| Some((frequency(*root, enclosure).lo().to_rational()? * &scale).to_integer());
        let Some(numbers) = std::iter::once(&root).chain(&self.base).map(scaled).collect::<Option<Vec<_>>>() else {
            return Some(None);
        };
        let proposal = approx_integer_relations(&numbers, MAX_MULTIPLE as u32).into_iter().find_map(|relation| {
            let own = relation.first()?.to_i64().filter(|n| n.abs() == 1)?;
            relation[1..].iter().map(|n| n.to_i64().map(|n| -n * own)).collect::<Option<Vec<i64>>>()
        });
        let Some(multiples) = proposal else { return Some(None) };
        let mut terms = self.base.clone().into_iter().zip(multiples).filter(|(_, n)| *n != 0);
        let Some((first, times)) = terms.next() else { return Some(None) };
        let mut so_far = (times, RootRef { index: first, conjugate: false });
        let mut steps = Vec::new();
        for (base, n) in terms {
            let parts = vec![so_far, (n, RootRef { index: base, conjugate: false })];
            let Some(sum) = self.sum(&parts, problem, enclosure)? else { return Some(None) };
            so_far = (1, self.sums[sum].root);
            steps.push((parts, sum));
        }
        Some((so_far.1.index == root).then_some(steps))
    }

    /// A base root of which all commensurate frequencies are integer multiples, if the least of them is not one itself.
    fn common_base(&mut self, roots: &[usize], problem: &mut Problem, enclosure: &mut Enclosure) -> Option<()> {
        let Some(first) = roots.first() else { return Some(()) };
        let divisor =
            roots.iter().filter_map(|r| ratio(*r, *first, enclosure)).fold(BigInt::from(1), |l, q| l.lcm(q.denom()));
        let times = divisor.to_i64().filter(|n| *n > 1 && *n <= MAX_RATIO);
        let Some(times) = times else { return Some(()) };
        let family = enclosure.table.roots()[*first].family;
        if mean(problem, family) != Rational::zero() {
            return Some(());
        }
        let scaled = problem.families[family].dilate_up(&BigInt::from(times)).primitive_part();
        let Some(position) = problem.family(&scaled) else { return Some(()) };
        enclosure.renew(problem)?;
        let part = Interval::integer(times);
        let wanted = frequency(*first, enclosure);
        let bits = enclosure.bits;
        let base = enclosure
            .table
            .roots()
            .iter()
            .position(|r| r.family == position && !r.value.im.mul(&part, bits).is_disjoint(&wanted));
        self.base.extend(base);
        Some(())
    }

    /// The cone from t0, if the zone is false on all leaves of a bisection. `obstacle`: a box that would not do for another start.
    pub(crate) fn cone(
        &self,
        t0: &Rational,
        obstacle: &mut Option<AngleBox>,
        problem: &Problem,
        enclosure: &Enclosure,
        effort: &mut u64,
    ) -> Option<Cone> {
        let leading = self.leading(t0, problem, enclosure);
        let proposals = Proposals::new(self, &leading.forms, problem, enclosure);
        let torus = Torus { dimension: self.base.len(), leading: &leading, proposals, problem, enclosure };
        if let Some(angles) = obstacle.as_ref().filter(|angles| angles.len() == self.base.len()) {
            torus.node(angles, true)?;
        }
        // First whether it will do, by floating point where that decides; then for certain.
        torus.bisected(false, obstacle, effort)?;
        let nodes = torus.bisected(true, obstacle, effort)?;
        let mut far = self.far_field(t0, &leading);
        let leaves = nodes.iter().filter_map(|n| if let Node::Leaf(signs, _) = n { Some(signs) } else { None });
        let mut used: BTreeSet<usize> = leaves.flatten().map(|(function, _)| *function).collect();
        for function in used.clone() {
            used.extend(problem.products_of(function).iter().flat_map(|(c, a)| [*c, *a]));
        }
        far.leads.retain(|lead| used.contains(&lead.function));
        Some(Cone { far, nodes })
    }

    /// The far field from t0 on of the functions that have a leading part there.
    pub(crate) fn far_field(&self, t0: &Rational, leading: &Leading) -> FarField {
        let leads = self
            .leads
            .iter()
            .zip(&leading.forms)
            .filter(|(_, form)| form.is_some())
            .filter_map(|(lead, _)| lead.clone());
        FarField { from: t0.clone(), base: self.base.clone(), angles: self.angles.clone(), leads: leads.collect() }
    }

    /// The leading parts from t0 on.
    pub(crate) fn leading<'a>(&self, t0: &Rational, problem: &'a Problem, enclosure: &Enclosure) -> Leading<'a> {
        let (roots, bits) = (enclosure.table.roots(), enclosure.bits);
        let (mut forms, mut growths) = (Vec::new(), Vec::new());
        for (index, lead) in self.leads.iter().enumerate() {
            let form = lead.as_ref().and_then(|lead| {
                let rho_lo = lead.roots.iter().map(|r| roots[*r].value.re.lo().clone()).max()?;
                let leading: Vec<(usize, Vec<i64>)> = lead.roots.iter().map(|r| (*r, self.turns(*r))).collect();
                LeadForm::new(&enclosure.forms[index], &leading, &rho_lo, t0, index, bits).ok()
            });
            let growth = lead
                .as_ref()
                .filter(|_| problem.is_part(index))
                .and_then(|lead| Growth::new(form.clone()?, lead, &enclosure.forms[index], &enclosure.table, t0, bits));
            forms.push(form);
            growths.push(growth);
        }
        Leading { forms, growths, problem, bits }
    }

    pub(crate) fn turns(&self, root: usize) -> Vec<i64> {
        let known = self.angles.iter().find(|a| a.root == root);
        known.map_or_else(|| vec![0; self.base.len()], |a| a.turns.clone())
    }
}

/// A torus that is to be cut into boxes on which the zone is false.
struct Torus<'a> {
    dimension: usize,
    leading: &'a Leading<'a>,
    proposals: Proposals,
    problem: &'a Problem,
    enclosure: &'a Enclosure,
}

impl Torus<'_> {
    /// The bisection; `None` where a box is found that will not do, which is the obstacle.
    fn bisected(&self, for_certain: bool, obstacle: &mut Option<AngleBox>, effort: &mut u64) -> Option<Vec<Node>> {
        let mut nodes = Vec::new();
        let mut open = vec![(whole_torus(self.dimension), 0_u64)];
        while let Some((angles, depth)) = open.pop() {
            let limits = self.enclosure.limits();
            if *effort == 0 || depth >= limits.depth || nodes.len() as u64 >= limits.nodes {
                return None;
            }
            // Proposals are cheap: so many of them count as one.
            *effort -= u64::from(for_certain || nodes.len() % PROPOSALS == 0);
            let Some(node) = self.node(&angles, for_certain) else {
                *obstacle = Some(angles);
                return None;
            };
            if let Node::Split(axis) = node {
                let (lower, upper) = halves(&angles, axis)?;
                open.push((upper, depth + 1));
                open.push((lower, depth + 1));
            }
            nodes.push(node);
        }
        Some(nodes)
    }

    fn node(&self, angles: &AngleBox, for_certain: bool) -> Option<Node> {
        let problem = self.problem;
        let centre: AngleBox = angles.iter().map(|(c, _)| (c.clone(), Rational::zero())).collect();
        let probable = self.proposals.truth(&approx_box(angles), problem);
        if probable == Some(false) && !for_certain {
            return Some(Node::Leaf(Vec::new(), None));
        }
        if probable.is_none() && self.proposals.truth(&approx_box(&centre), problem) == Some(false) {
            return widest(angles).map(Node::Split);
        }
        let signs = self.leading.signs(angles);
        match problem.truth(&signs) {
            Some(false) => Some(Node::Leaf(needed(problem, signs, false), None)),
            Some(true) => None,
            // Halving brings nothing where the centre alone is not decided.
            None if self.leading.truth(&centre) == Some(false) => widest(angles).map(Node::Split),
            None => {
                let pivot = (0..signs.len())
                    .filter(|f| self.leading.forms[*f].is_some() && signs[*f].is_none())
                    .find(|f| problem.truths(&signs, *f) == [Some(false); 3])?;
                Some(Node::Leaf(needed_in_cases(problem, signs, pivot), Some(pivot)))
            }
        }
    }
}

/// The leading part of each function from one start on, where it can be enclosed.
pub(crate) struct Leading<'a> {
    pub(crate) forms: Vec<Option<LeadForm>>,
    growths: Vec<Option<Growth>>,
    problem: &'a Problem,
    bits: u32,
}

impl Leading<'_> {
    /// The sign of a function on a box of the torus.
    pub(crate) fn sign(&self, function: usize, angles: &AngleBox) -> Option<Sign> {
        if self.problem.is_zero(function) {
            return Some(Ordering::Equal);
        }
        let products = self.problem.products_of(function);
        if products.is_empty() {
            return self.forms[function].as_ref()?.enclose(angles)?.certain_sign();
        }
        let range = |f: usize| {
            if self.problem.is_zero(f) { Some(Range::zero()) } else { self.growths[f].as_ref()?.range(angles) }
        };
        sign_of_products(products.iter().map(|(c, a)| Some((range(*c)?, range(*a)?))), self.bits)
    }

    /// The signs on a box: of the formula's functions, and where these do not decide, of the auxiliary ones too.
    pub(crate) fn signs(&self, angles: &AngleBox) -> Vec<Option<Sign>> {
        let mut signs = vec![None; self.forms.len()];
        for function in (0..self.problem.atoms()).chain(self.problem.traces()..self.forms.len()) {
            if function >= self.problem.traces() && self.problem.truth(&signs).is_some() {
                break;
            }
            signs[function] = self.sign(function, angles);
        }
        signs
    }

    /// The zone's truth on a box.
    pub(crate) fn truth(&self, angles: &AngleBox) -> Option<bool> {
        self.problem.truth(&self.signs(angles))
    }
}

/// The axis along which a box is longest.
pub(crate) fn widest(angles: &AngleBox) -> Option<usize> {
    (0..angles.len()).rev().max_by(|i, j| angles[*i].1.cmp(&angles[*j].1))
}

fn frequency(root: usize, enclosure: &Enclosure) -> Interval {
    enclosure.table.roots()[root].value.im.clone()
}

/// The mean of the roots of a family: the only candidate for a line of symmetry.
fn mean(problem: &Problem, family: usize) -> Rational {
    let monic = problem.families[family].to_monic();
    let degree = monic.degree();
    let second = monic.coefficients().get(degree.wrapping_sub(1)).cloned().unwrap_or_else(Rational::zero);
    -second / Rational::from_integer(degree.into())
}

/// The vertical line on which all of the roots lie.
pub(crate) fn common_line(roots: &[usize], problem: &Problem, enclosure: &Enclosure) -> Option<Rational> {
    let family = |root: usize| enclosure.table.roots()[root].family;
    let line = mean(problem, family(*roots.first()?));
    let on_line = |root: &usize| {
        mean(problem, family(*root)) == line && enclosure.table.is_on_line(*root, &line, enclosure.bits) == Some(true)
    };
    roots.iter().all(on_line).then_some(line)
}

/// The ratio of two frequencies if a fraction with small terms fits.
fn ratio(a: usize, b: usize, enclosure: &Enclosure) -> Option<Rational> {
    let bits = enclosure.bits;
    let quotient = frequency(a, enclosure).mul(&frequency(b, enclosure).recip(bits)?, bits);
    let (lo, hi) = (quotient.lo().to_rational()?, quotient.hi().to_rational()?);
    let simplest = simplest_between(&lo, &hi);
    let small = |n: &BigInt| *n <= BigInt::from(MAX_RATIO);
    (small(simplest.numer()) && small(simplest.denom())).then_some(simplest)
}

/// Sums of one or two small multiples of known roots that meet the enclosure of a root.
fn relations(root: usize, known: &[usize], enclosure: &Enclosure) -> Vec<Vec<(i64, RootRef)>> {
    let wanted = &enclosure.table.roots()[root].value;
    let fits = |parts: &[(i64, RootRef)]| {
        value(parts, enclosure).is_some_and(|v| !v.re.is_disjoint(&wanted.re) && !v.im.is_disjoint(&wanted.im))
    };
    let plain = |index: usize| RootRef { index, conjugate: false };
    let mut found = Vec::new();
    for a in known {
        if let Some(n) = ratio(root, *a, enclosure).filter(Rational::is_integer).and_then(|q| q.to_integer().to_i64()) {
            found.extend(Some(vec![(n, plain(*a))]).filter(|p| fits(p)));
        }
    }
    for (i, a) in known.iter().enumerate() {
        for b in known.iter().skip(i + 1) {
            for n in -MAX_MULTIPLE..=MAX_MULTIPLE {
                for m in -MAX_MULTIPLE..=MAX_MULTIPLE {
                    if n != 0
                        && m != 0
                        && (approx_frequency(*a, enclosure) * n as f64 + approx_frequency(*b, enclosure) * m as f64
                            - approx_frequency(root, enclosure))
                        .abs()
                            < 1e-6 * approx_frequency(root, enclosure)
                    {
                        found.extend(Some(vec![(n, plain(*a)), (m, plain(*b))]).filter(|p| fits(p)));
                    }
                }
            }
        }
    }
    found
}

pub(crate) fn approx_frequency(root: usize, enclosure: &Enclosure) -> f64 {
    approx_dyadic(frequency(root, enclosure).lo())
}

/// A dyadic as a double, for choices that need no trust.
pub(crate) fn approx_dyadic(x: &Dyadic) -> f64 {
    x.to_rational().map_or(0.0, |q| approx_value(&q))
}

fn combined(
    parts: &[(i64, RootRef)],
    conjugate: bool,
    turns: &BTreeMap<usize, Vec<(usize, i64)>>,
) -> Vec<(usize, i64)> {
    let mut total = Vec::new();
    for (times, part) in parts {
        let sign = if part.conjugate != conjugate { -1 } else { 1 };
        total.extend(turns.get(&part.index).into_iter().flatten().map(|(axis, n)| (*axis, n * times * sign)));
    }
    total
}

/// Used by the search for a first cone start: an instant not below 1 / |mu| for the fastest exponent; 1 where all are 0.
pub(crate) fn first_start(enclosure: &Enclosure) -> Rational {
    let bits = enclosure.bits;
    let exponents =
        enclosure.forms.iter().flat_map(|f| &f.terms).filter(|t| t.exponent.abs_hi(bits).sign() != Ordering::Equal);
    let top = exponents.map(|t| t.exponent.abs_hi(bits).top()).max().unwrap_or(0);
    // A root that is 0 exactly may have a disc of a tiny radius.
    let top = if top < -i64::from(bits) / 2 { 0 } else { top.clamp(-200, 200) };
    let power = |k: i64| Rational::from_integer(BigInt::from(1) << k.unsigned_abs());
    if top >= 0 { power(top).recip() } else { power(top) }
}
