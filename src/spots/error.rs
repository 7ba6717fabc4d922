/// Why a photo gives no spots.
#[derive(Debug, thiserror::Error, Clone, PartialEq)]
#[non_exhaustive]
pub enum SpotError {
    /// Nothing stands out of the noise.
    #[error(
        "no spot stands out: the brightest thing, near pixel ({x_px:.0}, {y_px:.0}), reaches {signal_to_noise:.1} times the noise where \
         {needed:.1} are needed; expose longer, darken the room, or check that this is the pattern photo"
    )]
    NothingFound {
        /// Where the brightest thing is, px.
        x_px: f64,
        /// Where the brightest thing is, px.
        y_px: f64,
        /// Its height over the noise of the matched filter.
        signal_to_noise: f64,
        /// Height over the noise that the false-alarm rate asks for.
        needed: f64,
    },
    /// Things stand out, but none has the profile of a spot.
    #[error(
        "{candidates} things stand out of the noise, the brightest near pixel ({x_px:.0}, {y_px:.0}), but none has the profile of a laser spot; \
         darken the room so that the paper stays far from clipping, or check that this is the pattern photo"
    )]
    NoneFits {
        /// Number of things that stand out.
        candidates: usize,
        /// Where the brightest is, px.
        x_px: f64,
        /// Where the brightest is, px.
        y_px: f64,
    },
}
