//! Photos made from known truth, seeded; for demos, tests and benches.
