//! Made patterns: noise, missing orders, junk, distortion, absent zero order, rows of few spots, chance.
