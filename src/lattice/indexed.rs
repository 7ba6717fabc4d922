//! What indexing gives back.

/// Line or plane.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Shape {
    /// All orders are (h, 0) along one vector.
    Line,
    /// Orders (h, k) along two vectors.
    Plane,
}

/// Points with their orders.
#[derive(Debug, Clone, PartialEq)]
pub struct Indexed {
    /// Line or plane.
    pub shape: Shape,
    /// Place of the zero order, seen or predicted.
    pub zero: [f64; 2],
    /// The point that is the zero order; none where it is hidden or out of the frame.
    pub zero_seen: Option<usize>,
    /// Step per order at the zero order: g1, g2 (Lagrange-Gauss reduced). For a line the second is zero.
    pub g: [[f64; 2]; 2],
    /// Order (h, k) of each point given; none where it was rejected.
    pub order: Vec<Option<(i32, i32)>>,
    /// Points without order, each with its reason, by rising number.
    pub rejected: Vec<(usize, Reason)>,
    /// What speaks for this lattice.
    pub evidence: Evidence,
    /// What a reader must know about the numbering.
    pub warnings: Vec<Warning>,
}

/// Why a point carries no order.
#[derive(Debug, Clone, PartialEq)]
#[non_exhaustive]
pub enum Reason {
    /// Place, uncertainty or weight is not a usable number.
    NotANumber,
    /// It lies between the nodes; offset from the nearest one in orders along g1 and g2.
    OffLattice {
        /// Fractional orders, -0.5..0.5.
        offset: [f64; 2],
    },
    /// It lies off the row of a line pattern; distance in units of |g1|.
    OffLine {
        /// Distance from the row over |g1|.
        distance: f64,
    },
    /// Another point claims the same node and fits better.
    Duplicate {
        /// The point that holds the node.
        of: usize,
    },
    /// One of a set of faint copies, all displaced by the same offset from their parents.
    Ghost {
        /// Offset in the plane of the points.
        offset: [f64; 2],
        /// Size of the set.
        copies: usize,
    },
    /// It belongs to another lattice in the same picture.
    SecondLattice,
    /// It lies at a node, but so far beyond the rest of the pattern that chance explains it as well.
    BeyondPattern {
        /// The order it would have.
        order: (i32, i32),
    },
    /// It lies at a node, but the geometry is not known well enough out there to number it.
    OutOfReach,
}

/// What speaks for the lattice chosen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Evidence {
    /// Points that carry an order.
    pub explained: usize,
    /// Nodes inside the photo and inside the region that the explained points span.
    pub predicted_visible: usize,
    /// Predicted nodes without a point.
    pub missing: usize,
    /// explained / `predicted_visible`, 0..1.
    pub fill: f64,
    /// Log evidence over chance, nats.
    pub log_evidence: f64,
    /// Robust rms distance of points from their nodes over |g| of the shortest vector.
    pub rms_orders: f64,
    /// What brightness, symmetry and the hint say for the chosen zero order, nats. Not part of `log_evidence`.
    pub zero_score: f64,
    /// Lead of the chosen zero order over the next best node, nats.
    pub zero_lead: f64,
    /// The best lattice that is another one.
    pub runner_up: Option<RunnerUp>,
}

/// The lattice that came second.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RunnerUp {
    /// Line or plane.
    pub shape: Shape,
    /// Its steps.
    pub g: [[f64; 2]; 2],
    /// Its cell area (or step) over that of the chosen lattice; 0.5 means twice as dense.
    pub cell_ratio: f64,
    /// Points that it explains.
    pub explained: usize,
    /// Its log evidence, nats.
    pub log_evidence: f64,
}

/// What a reader must know about the numbering.
#[derive(Debug, Clone, PartialEq)]
#[non_exhaustive]
pub enum Warning {
    /// Another numbering explains the points nearly as well.
    ThinNumbering {
        /// Lead over the runner-up, nats.
        lead: f64,
        /// Cell ratio of the runner-up.
        cell_ratio: f64,
    },
    /// The numbering rests on few points: without them all orders share a factor or parity.
    FewDeciders {
        /// Index of the sublattice that holds all other points (2: factor-two risk).
        factor: u32,
        /// Number of points outside it.
        deciders: usize,
    },
    /// The orders between the strong ones are present but faint: the sample may have a finer period with a weak superstructure.
    FaintBetween {
        /// Index of the strong sublattice.
        factor: u32,
        /// Median brightness of the faint set over the strong one.
        brightness_ratio: f64,
    },
    /// No point sits at the zero order.
    ZeroUnseen,
    /// Another node is nearly as plausible as zero order.
    ZeroUncertain {
        /// Lead, nats.
        lead: f64,
        /// The other node, in orders of the chosen numbering.
        other: (i32, i32),
    },
    /// The brightest point of all carries no order, though it usually is the zero order.
    BrightestUnexplained {
        /// That point.
        point: usize,
    },
    /// So few points that nothing checks the result.
    FewPoints {
        /// Points with an order.
        explained: usize,
    },
    /// Points rejected here form a lattice of their own.
    SecondLattice {
        /// Its steps.
        g: [[f64; 2]; 2],
        /// Its points.
        points: usize,
    },
    /// Faint displaced copies of the pattern were set aside.
    Ghosts {
        /// Their number.
        points: usize,
    },
    /// A line pattern (one row) was favoured over a plane by a small margin, or the other way round.
    ShapeUncertain {
        /// Lead, nats.
        lead: f64,
    },
}
