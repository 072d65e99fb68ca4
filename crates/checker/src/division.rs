//! The pieces of a division, read from its nodes in preorder.

use crate::error::{Checked, Duty, Obligation, Rule};
use crate::many::{Division, Piece, Ranges};
use crate::statement::Statement;
use crate::substitution::whole;

/// Checks each piece, and that the pieces are all that is admissible.
///
/// Why they are: a cut replaces a box of ranges by two whose union it is, and in the end no box is open. A quantity that varies with
/// time has values in one piece at one time and in another at another: it is not cut.
pub(crate) fn check_pieces(
    divisions: &[Division],
    statement: &Statement,
    mut check: impl FnMut(&Piece, &Ranges) -> Checked,
) -> Checked {
    let mut open: Vec<Ranges> = vec![whole(statement)];
    for (position, node) in divisions.iter().enumerate() {
        let covers = Duty::new(Rule::WorstCase, Obligation::PiecesCover, position);
        let mut ranges = open.pop().ok_or_else(|| covers.refuted())?;
        match node {
            Division::Cut(axis, at) => {
                covers.ensure(statement.uncertain.get(*axis).is_none_or(|u| !u.varying))?;
                let mut upper = ranges.clone();
                let (Some(below), Some(above)) = (ranges.get_mut(*axis), upper.get_mut(*axis)) else {
                    return Err(covers.refuted());
                };
                covers.ensure(below.from <= *at && *at <= below.to)?;
                below.to.clone_from(at);
                above.from.clone_from(at);
                open.push(upper);
                open.push(ranges);
            }
            Division::Piece(piece) => check(piece, &ranges)?,
        }
    }
    Duty::new(Rule::WorstCase, Obligation::PiecesCover, divisions.len()).ensure(open.is_empty())
}
