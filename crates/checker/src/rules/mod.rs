//! One file for each proof rule: what it shows, why, and its checks in the order of its theorem page.

pub(crate) mod cell;
pub(crate) mod cone;
pub(crate) mod cover;
pub(crate) mod entry;
pub(crate) mod equality;
pub(crate) mod inseparable;
pub(crate) mod region;
pub(crate) mod witness;
pub(crate) mod worst_case;
