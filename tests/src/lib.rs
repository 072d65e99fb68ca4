//! What the tests share: small statements from matrices, and the corpus of certificates.

pub mod case;
pub mod reference;
pub mod system;
