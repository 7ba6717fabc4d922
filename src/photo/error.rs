/// Why a file is no usable photo. Each variant is one thing that the user can mend.
#[derive(Debug, thiserror::Error, Clone, PartialEq)]
#[non_exhaustive]
pub enum PhotoError {
    /// Nothing in the file.
    #[error("the file is empty (0 bytes): copy the photo again")]
    Empty,
    /// The first bytes are those of no image that can be read here.
    #[error("the file is {looks_like}, not a JPEG, PNG or TIFF photo: give the photo itself")]
    NotAPhoto {
        /// What the content looks like, with its article.
        looks_like: String,
    },
    /// The file ends before the picture does.
    #[error("the {format} file is cut off after {bytes} bytes: the lower part of the picture is missing; copy it again from the camera")]
    CutOff {
        /// Kind of file.
        format: &'static str,
        /// Size of what is there.
        bytes: usize,
    },
    /// The decoder gave up.
    #[error("the {format} file is damaged: {reason}; copy it again from the camera")]
    Damaged {
        /// Kind of file.
        format: &'static str,
        /// The decoder's own words.
        reason: String,
    },
    /// A form of an otherwise known format that is not read here.
    #[error("this form of {format} is not read: {reason}; save it as 8- or 16-bit grey or RGB")]
    UnsupportedForm {
        /// Kind of file.
        format: &'static str,
        /// What is special.
        reason: String,
    },
    /// More pixels than are taken.
    #[error("the picture is {width} x {height} px, above the limit of {limit_mega_px} megapixels: crop or reduce it")]
    TooLarge {
        /// Width, px.
        width: u32,
        /// Height, px.
        height: u32,
        /// Limit for this kind of file, megapixels.
        limit_mega_px: u64,
    },
    /// Fewer pixels than a measurement needs.
    #[error("the picture is only {width} x {height} px: at least {min_px} px along each side are needed to measure anything")]
    TooSmall {
        /// Width, px.
        width: u32,
        /// Height, px.
        height: u32,
        /// Smallest side that is taken, px.
        min_px: u32,
    },
}
