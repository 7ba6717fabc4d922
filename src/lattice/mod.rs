//! In: plain points of a plane (dimensionless). Out: the lattice they lie on, each point's order (h, k), and what speaks for it.
//! Must never know: brightness in pixels, cameras, screens, wavelengths.
//! Start reading at [`index`].

/// Why points form no lattice.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum LatticeError {}
