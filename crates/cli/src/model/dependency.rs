//! The order in which definitions that use each other are evaluated, and the cycles that prevent it.

/// What a depth-first search finds.
#[derive(Debug, PartialEq, Eq)]
pub(super) struct Order {
    /// All definitions; each comes after those that it uses, cycles aside.
    pub(super) sequence: Vec<usize>,
    /// Definitions that use each other in a ring, each ring once.
    pub(super) cycles: Vec<Vec<usize>>,
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Mark {
    New,
    Open,
    Done,
}

/// The order for definitions where `uses[i]` are the positions that definition i uses. Linear; no recursion.
pub(super) fn order(uses: &[Vec<usize>]) -> Order {
    let mut found = Order { sequence: Vec::new(), cycles: Vec::new() };
    let mut marks = vec![Mark::New; uses.len()];
    for start in 0..uses.len() {
        if marks[start] != Mark::New {
            continue;
        }
        marks[start] = Mark::Open;
        let mut path = vec![(start, 0)];
        while let Some((at, next)) = path.last_mut() {
            let Some(&used) = uses[*at].get(*next) else {
                marks[*at] = Mark::Done;
                found.sequence.push(*at);
                path.pop();
                continue;
            };
            *next += 1;
            match marks[used] {
                Mark::New => {
                    marks[used] = Mark::Open;
                    path.push((used, 0));
                }
                Mark::Open => {
                    let ring = path.iter().map(|(i, _)| *i).skip_while(|i| *i != used).collect();
                    found.cycles.push(ring);
                }
                Mark::Done => {}
            }
        }
    }
    found
}
