//! Hands the arguments to `cli`; computes nothing.

fn main() {}
