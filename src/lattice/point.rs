//! What indexing is given: points and what is known beforehand.

/// One candidate spot as a plain point of the plane.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Point {
    /// Place, dimensionless; direction cosines along the sample, where the lattice is regular up to the roughness of the geometry.
    pub at: [f64; 2],
    /// Standard uncertainty of `at` per axis, same unit, without what is common to all points.
    pub u: f64,
    /// Relative brightness, > 0, any unit. Only ratios count.
    pub weight: f64,
    /// What else is known about this point being the zero order, as log odds in nats (0: nothing; a clipped spot in the expected place: a few).
    pub zero_log_odds: f64,
}

impl Point {
    /// A point of which only place, uncertainty and brightness are known.
    #[must_use]
    pub fn new(at: [f64; 2], u: f64, weight: f64) -> Self {
        Self { at, u, weight, zero_log_odds: 0.0 }
    }
}

/// Which pattern is looked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Expected {
    /// Whatever the evidence favours.
    #[default]
    Auto,
    /// One row of orders (line grating).
    Line,
    /// A plane net of orders.
    Plane,
}

/// Where the zero order is expected.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ZeroHint {
    /// Place in the plane of the points.
    pub at: [f64; 2],
    /// Standard uncertainty of that place, same unit.
    pub u: f64,
}

/// What is known before indexing, and how strict to be.
#[derive(Debug, Clone, PartialEq)]
pub struct IndexOptions {
    /// Line, plane or either.
    pub expected: Expected,
    /// Place where the zero order should be, if known.
    pub zero_hint: Option<ZeroHint>,
    /// How rough the geometry is: relative change of the local scale per unit of direction cosine (1/cosine).
    /// 0.1 covers a tilt wrong by a degree or two and a throw wrong by a few per cent; 0.15 a throw wrong by 15 % and tilts by 4 degrees
    /// (tested). Much larger values leave wide patterns with few spots (steps above 0.3) undecided.
    /// Affine errors (scale, shear) cost nothing and are not meant here.
    pub bend: f64,
    /// Least standard deviation of a point about its node, as a share of the typical distance between neighbouring points.
    /// It belongs to the picture and not to the lattice tried, or a denser lattice would look more precise.
    pub node_slack: f64,
    /// Log evidence over chance (nats) below which no lattice is reported. Of 14 000 sets of 3 to 25 points strewn evenly or in a
    /// cluster, none passed at 6; of 7000 sets strewn along a straight row, 3 did (see the chance test).
    pub least_evidence: f64,
    /// Number of brightest points from which lattices are guessed; bounds the pair work.
    pub seed_points: usize,
}

impl Default for IndexOptions {
    fn default() -> Self {
        Self { expected: Expected::Auto, zero_hint: None, bend: 0.1, node_slack: 0.01, least_evidence: 7.0, seed_points: 120 }
    }
}
