//! Synthesis.
