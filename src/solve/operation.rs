//! Operation.
