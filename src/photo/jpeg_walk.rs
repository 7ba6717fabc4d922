//! Walks the markers of a JPEG without decoding it.
//!
//! Decoders fill what a truncated file lacks with grey and report success; a measurement must not.

/// What the markers say.
pub(super) struct Walk {
    /// The end marker was reached through well-formed segments.
    pub(super) complete: bool,
    /// Several scans per component; the decoder then holds all coefficients.
    pub(super) progressive: bool,
}

/// Follows the segments from the start marker to the end marker (ITU-T T.81, annex B.1).
///
/// Markers inside metadata segments (embedded previews) are skipped by their lengths; in entropy-coded data a marker is
/// 0xFF followed by neither 0x00 (stuffing), 0xFF (fill) nor a restart marker.
pub(super) fn walk(bytes: &[u8]) -> Walk {
    let mut state = Walk { complete: false, progressive: false };
    let mut at = 2;
    let mut has_scan = false;
    while let Some(marker) = next_marker(bytes, &mut at) {
        match marker {
            0xD9 => {
                state.complete = has_scan;
                return state;
            }
            0x01 | 0xD0..=0xD8 => {}
            _ => {
                state.progressive |= matches!(marker, 0xC2 | 0xC6 | 0xCA | 0xCE);
                has_scan |= marker == 0xDA;
                let Some(&[high, low]) = bytes.get(at..at + 2) else { return state };
                at += usize::from(u16::from_be_bytes([high, low]));
            }
        }
    }
    state
}

fn next_marker(bytes: &[u8], at: &mut usize) -> Option<u8> {
    loop {
        let gap = bytes.get(*at..)?.iter().position(|&byte| byte == 0xFF)?;
        let code = *bytes.get(*at + gap + 1)?;
        *at += gap + if code == 0xFF { 1 } else { 2 };
        if !matches!(code, 0x00 | 0xFF) {
            return Some(code);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::walk;

    const WHOLE: [u8; 16] = [0xFF, 0xD8, 0xFF, 0xC2, 0, 3, 9, 0xFF, 0xDA, 0, 2, 0x12, 0xFF, 0x00, 0xFF, 0xD9];

    #[test]
    fn whole_file_reaches_its_end_marker() {
        let state = walk(&WHOLE);
        assert!(state.complete && state.progressive);
    }

    #[test]
    fn every_shortened_file_is_incomplete() {
        for length in 0..WHOLE.len() {
            assert!(!walk(&WHOLE[..length]).complete, "{length} bytes");
        }
    }

    #[test]
    fn end_marker_of_an_embedded_preview_does_not_count() {
        let preview = [0xFF, 0xD8, 0xFF, 0xE1, 0, 8, 0xFF, 0xDA, 0xFF, 0xD9, 0, 0, 0xFF, 0xDA, 0, 2, 7];
        assert!(!walk(&preview).complete);
    }
}
