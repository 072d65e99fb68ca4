//! The admissible starts: one, a box of ranges, or a set of the section [start].

use super::scope::Names;
use super::table::{Item, Refusals};
use keepout_checker::statement::{Starts, State};
use num_bigint::BigInt;
use num_integer::Integer;
use num_rational::BigRational;
use num_traits::{One, Signed, Zero};
use toml::de::DeTable;

/// The most states of a model whose starts are an ellipsoid.
pub(super) const MAX_ELLIPSOID: usize = 200;

const SETS: [&str; 3] = ["ellipsoid", "points", "zonotope"];

type Vector = Vec<BigRational>;

/// A start, as centre and radius: a number, or a range.
pub(super) fn start(item: Item, names: &Names, refusals: &Refusals) -> Option<(BigRational, BigRational)> {
    if item.get_ref().as_array().is_none() {
        return refusals.number(item, names).map(|value| (value, BigRational::zero()));
    }
    let (from, to) = refusals.range(item, names)?;
    let range = keepout_checker::statement::Range { from, to };
    Some((range.centre(), range.radius()))
}

/// The starts between these radii about the states' own.
pub(super) fn of_radii(radii: Vector) -> Starts {
    if radii.iter().all(Zero::is_zero) { Starts::One } else { Starts::Box(radii) }
}

/// The number of states that a section [start] is for: 0 if it does not say.
pub(super) fn dimension(item: Item) -> usize {
    let of = |key: &str| {
        let set = item.get_ref().as_table()?.get(key)?.get_ref();
        let list = match set.as_table() {
            Some(table) => table.get("centre")?.get_ref().as_array()?,
            None => set.as_array()?.iter().next()?.get_ref().as_array()?,
        };
        Some(list.len())
    };
    SETS.into_iter().find_map(of).unwrap_or(0)
}

/// Refuses a start that is given beside a section [start].
pub(super) fn refuse_second(item: Item, refusals: &Refusals) {
    let help = "leave it out: the set says where all states start; or remove the section [start]";
    refusals.refuse(item.span(), "there is a `start`, and also a section [start]", help);
}

/// Reads the section [start]: the states get the centre for their start.
pub(super) fn set(item: Item, states: &mut [State], names: &Names, refusals: &Refusals) -> Option<Starts> {
    let table = refusals.table(item, "a section [start]")?;
    refusals.only(table, &SETS, "[start]");
    let given: Vec<&str> = SETS.into_iter().filter(|key| table.contains_key(*key)).collect();
    let [key] = given.as_slice() else {
        let message = format!("[start] has one of {}, found {}", SETS.join(", "), given.len());
        refusals.refuse(refusals.header(item), message, "give one set, for instance points = [[0, 0], [1, 0]]");
        return None;
    };
    let reader = Reader { count: states.len(), names, refusals };
    let (centre, starts) = match (*key, table.get(*key)?) {
        ("ellipsoid", item) => reader.ellipsoid(item),
        ("points", item) => reader.points(item),
        (_, item) => reader.zonotope(item),
    }?;
    states.iter_mut().zip(centre).for_each(|(state, value)| state.start = value);
    Some(starts)
}

struct Reader<'r> {
    /// The number of states.
    count: usize,
    names: &'r Names,
    refusals: &'r Refusals<'r>,
}

impl Reader<'_> {
    fn vector(&self, item: Item) -> Option<Vector> {
        let list = self.refusals.list_of(item, "a list with one number for each state")?;
        if list.len() != self.count {
            let message = format!("expected {} numbers, one for each state, found {}", self.count, list.len());
            self.refusals.refuse(item.span(), message, "give them in the order of the states in the file");
            return None;
        }
        let numbers: Vec<Option<BigRational>> = list.iter().map(|n| self.refusals.number(n, self.names)).collect();
        numbers.into_iter().collect()
    }

    /// At least one vector.
    fn vectors(&self, item: Item, what: &str) -> Option<Vec<Vector>> {
        let list = self.refusals.list_of(item, what)?;
        if list.is_empty() || list.len() > super::MAX_ENTRIES {
            let message = format!("expected 1 to {} vectors, found {}", super::MAX_ENTRIES, list.len());
            self.refusals.refuse(item.span(), message, "give each as a list with one number for each state");
            return None;
        }
        let vectors: Vec<Option<Vector>> = list.iter().map(|v| self.vector(v)).collect();
        vectors.into_iter().collect()
    }

    fn points(&self, item: Item) -> Option<(Vector, Starts)> {
        let mut points = self.vectors(item, "a list of points")?;
        let first = points.remove(0);
        Some((first, if points.is_empty() { Starts::One } else { Starts::Hull(points) }))
    }

    /// The vectors and the centre of a set such as {centre = [...], KEY = [[...], ...]}.
    fn centred(&self, item: Item, what: &str, key: &str) -> Option<(Vector, Vec<Vector>)> {
        let example = format!("write {what} = {{centre = [...], {key} = [[...], ...]}}");
        let Some(table) = item.get_ref().as_table() else {
            self.refusals.refuse(item.span(), format!("{what} has a centre and a list `{key}`"), example);
            return None;
        };
        self.refusals.only(table, &["centre", key], what);
        let needed = |key: &str| {
            let found = table.get(key);
            if found.is_none() {
                let place = self.refusals.header(item);
                self.refusals.refuse(place, format!("this {what} has no `{key}`"), example.clone());
            }
            found
        };
        let (centre, vectors) = (needed("centre"), needed(key));
        let centre = self.vector(centre?);
        let vectors = self.vectors(vectors?, "a list of vectors");
        Some((centre?, vectors?))
    }

    fn zonotope(&self, item: Item) -> Option<(Vector, Starts)> {
        let (centre, generators) = self.centred(item, "zonotope", "generators")?;
        Some((centre, Starts::Zonotope(generators)))
    }

    fn ellipsoid(&self, item: Item) -> Option<(Vector, Starts)> {
        let (centre, shape) = self.centred(item, "ellipsoid", "shape")?;
        let place =
            item.get_ref().as_table().and_then(|t: &DeTable| t.get("shape")).map_or(item.span(), toml::Spanned::span);
        let refuse = |message: String, help: &str| self.refusals.refuse(place.clone(), message, help);
        let n = self.count;
        if shape.len() != n {
            refuse(format!("expected {n} rows, one for each state, found {}", shape.len()), "give a symmetric matrix");
            return None;
        }
        if n > MAX_ELLIPSOID {
            let help = "give ranges of the starts, or a zonotope";
            refuse(format!("an ellipsoid is for at most {MAX_ELLIPSOID} states, found {n}"), help);
            return None;
        }
        let unequal = (0..n).flat_map(|i| (0..i).map(move |j| (i, j))).find(|&(i, j)| shape[i][j] != shape[j][i]);
        if let Some((i, j)) = unequal {
            let (row, column) = (i + 1, j + 1);
            let message = format!(
                "the shape is not symmetric: {} in row {row}, column {column}; {} in row {column}, column {row}",
                shape[i][j], shape[j][i]
            );
            refuse(message, "make the two equal");
            return None;
        }
        if !is_semidefinite(&shape) {
            let help =
                "the shape is Q in (x - c)' Q^-1 (x - c) <= 1, such as the squares of the semi-axes on the diagonal";
            refuse("the shape is not positive semidefinite".into(), help);
            return None;
        }
        Some((centre, Starts::Ellipsoid(shape)))
    }
}

/// Whether a symmetric matrix is positive semidefinite: elimination along the diagonal meets no negative pivot, and below a
/// pivot 0 nothing but zeros. Without fractions: what is left is the Schur complement times the last pivot, which is > 0, and
/// the division is exact.
fn is_semidefinite(matrix: &[Vector]) -> bool {
    let common = matrix.iter().flatten().fold(BigInt::one(), |d, x| d.lcm(x.denom()));
    let mut m: Vec<Vec<BigInt>> =
        matrix.iter().map(|row| row.iter().map(|x| x.numer() * (&common / x.denom())).collect()).collect();
    let mut last = BigInt::one();
    for k in 0..m.len() {
        let pivot = m[k][k].clone();
        if pivot.is_negative() || (pivot.is_zero() && m[k][k..].iter().any(|x| !x.is_zero())) {
            return false;
        }
        if pivot.is_zero() {
            continue;
        }
        let row = m[k].clone();
        for i in k + 1..m.len() {
            for j in i..m.len() {
                let value = (&pivot * &m[i][j] - &row[i] * &row[j]) / &last;
                m[i][j] = value.clone();
                m[j][i] = value;
            }
        }
        last = pivot;
    }
    true
}
