//! The five invented scenes of `sample-images/`, built into the program so that `spotrule render --demo` needs no files.

use super::{Scene, SynthError};

/// Names of the demo scenes, as their folders in `sample-images/`.
pub const DEMO_NAMES: [&str; 5] = ["embossed-film", "ruled-grating", "filter-mesh", "shelf-label-panel", "no-target"];

const TEXTS: [&str; 5] = [
    include_str!("../../sample-images/embossed-film/scene.toml"),
    include_str!("../../sample-images/ruled-grating/scene.toml"),
    include_str!("../../sample-images/filter-mesh/scene.toml"),
    include_str!("../../sample-images/shelf-label-panel/scene.toml"),
    include_str!("../../sample-images/no-target/scene.toml"),
];

/// A demo scene.
///
/// # Errors
/// [`SynthError::UnknownDemo`] lists the names.
pub fn demo_scene(name: &str) -> Result<Scene, SynthError> {
    Scene::from_toml(demo_text(name)?)
}

pub(super) fn demo_text(name: &str) -> Result<&'static str, SynthError> {
    let index = DEMO_NAMES.iter().position(|known| *known == name);
    index.map(|index| TEXTS[index]).ok_or_else(|| SynthError::UnknownDemo { name: name.to_owned() })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_demo_scene_can_be_read() {
        for name in DEMO_NAMES {
            assert!(demo_scene(name).is_ok(), "{name}: {:?}", demo_scene(name).err());
        }
    }

    #[test]
    fn an_unknown_name_is_answered_with_the_known_ones() {
        assert!(demo_scene("nothing").unwrap_err().to_string().contains("filter-mesh"));
    }
}
