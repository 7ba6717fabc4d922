//! In: a fit. Out: one budget line per source, exact shares of each result's variance.
