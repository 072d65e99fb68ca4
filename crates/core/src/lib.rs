//! Exact structure.
