//! The commands of the program `keepout`.
