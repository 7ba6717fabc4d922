//! Applies the EXIF orientation tag.

use rayon::prelude::*;

use super::{Photo, Samples};

/// Edge of the blocks in which a turned picture is copied: both sides of the copy then stay in the nearest cache.
const BLOCK_PX: usize = 32;

/// The photo as it is meant to be seen; the tag itself is kept for the record.
pub(super) fn upright(mut photo: Photo) -> Photo {
    let Some(turn) = Turn::new(photo.exif.orientation, photo.width, photo.height) else { return photo };
    photo.samples = match (photo.samples, photo.channels) {
        (Samples::U8(from), 3) => Samples::U8(turn.copied::<u8, 3>(&from)),
        (Samples::U8(from), _) => Samples::U8(turn.copied::<u8, 1>(&from)),
        (Samples::U16(from), 3) => Samples::U16(turn.copied::<u16, 3>(&from)),
        (Samples::U16(from), _) => Samples::U16(turn.copied::<u16, 1>(&from)),
    };
    photo.width = turn.width;
    photo.height = turn.height;
    photo
}

/// Where the displayed pixel (x, y) lies in the stored one-dimensional order: `start + x * right + y * down`.
struct Turn {
    width: usize,
    height: usize,
    start: isize,
    right: isize,
    down: isize,
}

impl Turn {
    /// `None` for orientation 1 and unknown tags. Tag meanings: Exif 2.32 (CIPA DC-008), tag 0x0112.
    fn new(tag: u8, stored_width: usize, stored_height: usize) -> Option<Self> {
        let (Ok(w), Ok(h)) = (isize::try_from(stored_width), isize::try_from(stored_height)) else { return None };
        let last = w * h - 1;
        let (start, right, down) = match tag {
            2 => (w - 1, -1, w),
            3 => (last, -1, -w),
            4 => (w * (h - 1), 1, -w),
            5 => (0, w, 1),
            6 => (w * (h - 1), -w, 1),
            7 => (last, -w, -1),
            8 => (w - 1, w, -1),
            _ => return None,
        };
        let (width, height) = if tag >= 5 { (stored_height, stored_width) } else { (stored_width, stored_height) };
        Some(Self { width, height, start, right, down })
    }

    fn copied<T: Copy + Default + Send + Sync, const CHANNELS: usize>(&self, from: &[T]) -> Vec<T> {
        let (from, _) = from.as_chunks::<CHANNELS>();
        let mut to = vec![T::default(); self.width * self.height * CHANNELS];
        to.par_chunks_mut(self.width * CHANNELS * BLOCK_PX).enumerate().for_each(|(band, to)| {
            let (to, _) = to.as_chunks_mut::<CHANNELS>();
            for left in (0..self.width).step_by(BLOCK_PX) {
                let block = left..(left + BLOCK_PX).min(self.width);
                for (row, to) in to.chunks_mut(self.width).enumerate() {
                    let y = band * BLOCK_PX + row;
                    for x in block.clone() {
                        to[x] = from[self.stored(x, y)];
                    }
                }
            }
        });
        to
    }

    fn stored(&self, x: usize, y: usize) -> usize {
        // Both factors are below the pixel count of a picture that is already in memory.
        (self.start + self.right * x.cast_signed() + self.down * y.cast_signed()).cast_unsigned()
    }
}

#[cfg(test)]
mod tests {
    use super::upright;
    use crate::photo::{Exif, Photo, Samples};

    /// The eight stored forms of one picture
    ///   1 2
    ///   3 4
    ///   5 6
    /// written out by hand from the meaning of the tag ("row 0 is the ..., column 0 is the ...").
    const STORED: [(u8, usize, [u8; 6]); 8] = [
        (1, 2, [1, 2, 3, 4, 5, 6]),
        (2, 2, [2, 1, 4, 3, 6, 5]),
        (3, 2, [6, 5, 4, 3, 2, 1]),
        (4, 2, [5, 6, 3, 4, 1, 2]),
        (5, 3, [1, 3, 5, 2, 4, 6]),
        (6, 3, [2, 4, 6, 1, 3, 5]),
        (7, 3, [6, 4, 2, 5, 3, 1]),
        (8, 3, [5, 3, 1, 6, 4, 2]),
    ];

    #[test]
    fn all_eight_orientations_give_the_same_picture() {
        for (tag, width, stored) in STORED {
            let exif = Exif { orientation: tag, ..Exif::default() };
            let photo = upright(Photo { width, height: 6 / width, channels: 1, samples: Samples::U8(stored.to_vec()), exif });
            let Samples::U8(seen) = photo.samples else { panic!("form changed") };
            assert_eq!((photo.width, photo.height), (2, 3), "tag {tag}");
            assert_eq!(seen, [1, 2, 3, 4, 5, 6], "tag {tag}");
        }
    }
}
