//! One file for each kind of evidence, named as the checker's rule.

pub(crate) mod amplitude;
pub(crate) mod cone;
pub(crate) mod cover;
pub(crate) mod entry;
pub(crate) mod equality;
pub(crate) mod factor;
pub(crate) mod identity;
pub(crate) mod inseparable;
pub(crate) mod late;
pub(crate) mod linear;
pub(crate) mod periodic;
pub(crate) mod pivot;
pub(crate) mod proposal;
pub(crate) mod region;
pub(crate) mod root;
pub(crate) mod square;
pub(crate) mod taylor;
pub(crate) mod wave;
