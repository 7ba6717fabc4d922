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

    /// What lies in `sample-images/` belongs to the scene beside it: the bench file to the letter, the orders to 0.001 px, photos of its size.
    #[test]
    fn the_sample_folders_belong_to_their_scenes() {
        let samples = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("sample-images");
        for name in DEMO_NAMES {
            let (folder, scene) = (samples.join(name), demo_scene(name).unwrap());
            assert_eq!(std::fs::read_to_string(folder.join("bench.toml")).unwrap(), scene.bench_text(), "{name}");
            let truth: serde_json::Value = serde_json::from_slice(&std::fs::read(folder.join("truth.json")).unwrap()).unwrap();
            let drawn = crate::synth::orders(&scene);
            for (told, order) in truth["orders"].as_array().unwrap().iter().zip(&drawn) {
                assert_eq!((told["h"].as_i64(), told["k"].as_i64()), (Some(order.h.into()), Some(order.k.into())), "{name}");
                let place = crate::frames::PixelPoint { x_px: told["x_px"].as_f64().unwrap(), y_px: told["y_px"].as_f64().unwrap() };
                assert!(place.distance_px(order.at) < 1e-3, "{name} {order:?}");
            }
            let photos =
                if scene.print.dots == crate::synth::Dots::OwnPhoto { vec!["pattern.jpg", "target.jpg"] } else { vec!["pattern.jpg"] };
            for photo in photos {
                let size = image::image_dimensions(folder.join(photo)).unwrap();
                assert_eq!(size, (scene.file.width_px, scene.file.height_px), "{name} {photo}");
            }
        }
    }

    /// About a hundred orders that a viewer can see, and the fifth missing with an opening of 3/5 of the pitch.
    #[test]
    fn the_mesh_shows_many_orders_and_misses_every_fifth() {
        let scene = demo_scene("filter-mesh").unwrap();
        let orders = crate::synth::orders(&scene);
        let visible = orders.iter().filter(|order| order.amplitude > 0.01).count();
        assert!((80..=150).contains(&visible), "{visible}");
        let peak = |h: i32| orders.iter().find(|order| (order.h, order.k) == (h, 0)).map_or(0.0, |order| order.amplitude);
        assert!(peak(5) < 0.02 * peak(4), "{} {}", peak(5), peak(4));
    }
}
