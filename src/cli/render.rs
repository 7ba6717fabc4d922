//! `spotrule render`: photos with known truth from a scene file or a built-in demo.

use super::{
    Failure,
    files::{self, Existing},
};
use crate::synth::{DEMO_NAMES, Dots, Scene, SynthError, demo_scene, encode, render_marked, render_pattern, render_target};
use std::{path::PathBuf, process::ExitCode};

const AXES: &str = "Axes (SI units, turns in radians, right-handed):
  bench    z along the zero order towards the screen, y up; x points to the LEFT of a person who looks along the beam
  turns    a plane is turned about x, then about y
  sample   incidence_rad turns its normal away from the zero order; the lattice lies in its own x and y
  print    X right, Y up as its reader sees it; viewer: right and up from the zero order
  photo    x right, y DOWN, a whole number is the centre of a pixel

Lasers can blind: these photos need none, a bench does. Follow your local laser-safety rules and your laser safety officer; class and
eyewear per IEC 60825-1.

Examples:
  spotrule render --demo embossed-film --out my-demo
  spotrule render my-scene.toml --out my-demo";

/// Draw the photos of an invented bench, with the truth behind them
///
/// Writes pattern.jpg, target.jpg (where the scene has a target photo), bench.toml and truth.json into a folder.
/// The scene file is TOML; sample-images/*/scene.toml are complete, commented examples. Unknown keys are refused.
#[derive(Debug, clap::Args)]
#[command(after_long_help = AXES)]
pub(super) struct RenderArgs {
    /// Scene file (TOML)
    #[arg(required_unless_present = "demo", conflicts_with = "demo")]
    pub(super) scene: Option<PathBuf>,
    /// A built-in scene instead of a file
    #[arg(long, value_name = "NAME", value_parser = clap::builder::PossibleValuesParser::new(DEMO_NAMES))]
    pub(super) demo: Option<String>,
    /// Folder to write into; made if it does not exist
    #[arg(long, value_name = "DIR")]
    pub(super) out: PathBuf,
    /// Replace files that exist
    #[arg(long)]
    pub(super) force: bool,
}

/// Runs the command; names each file written on stdout.
///
/// # Errors
/// A scene that cannot be read or drawn, files that exist (all are looked for before the first is written) or cannot be written.
pub(super) fn run(arguments: &RenderArgs) -> Result<ExitCode, Failure> {
    let scene = scene(arguments)?;
    let taken = file_names(&scene).into_iter().map(|name| arguments.out.join(name)).find(|path| path.exists());
    if let (Some(path), false) = (taken, arguments.force) {
        return Err(Failure::Exists { path });
    }
    std::fs::create_dir_all(&arguments.out).map_err(|cause| Failure::Unwritable { path: arguments.out.clone(), cause })?;
    let existing = if arguments.force { Existing::Replaced } else { Existing::Kept };
    for (name, bytes) in drawn(&scene).map_err(|error| Failure::Usage(error.to_string()))? {
        let path = arguments.out.join(name);
        files::write(&path, &bytes, existing)?;
        files::print(&format!("{}\n", path.display()))?;
    }
    Ok(ExitCode::SUCCESS)
}

fn scene(arguments: &RenderArgs) -> Result<Scene, Failure> {
    match (&arguments.demo, &arguments.scene) {
        (Some(name), _) => demo_scene(name).map_err(|error| Failure::Usage(error.to_string())),
        (None, Some(path)) => {
            Scene::from_toml(&files::read_text(path)?).map_err(|error| Failure::Usage(format!("{}: {error}", path.display())))
        }
        (None, None) => Err(Failure::Usage(format!("name a scene file or a demo: --demo {}", DEMO_NAMES.join(" | --demo ")))),
    }
}

fn file_names(scene: &Scene) -> Vec<&'static str> {
    let mut names = vec![scene.pattern_file(), "bench.toml", "truth.json"];
    if scene.print.dots == Dots::OwnPhoto {
        names.push(scene.target_file());
    }
    names
}

fn drawn(scene: &Scene) -> Result<Vec<(&'static str, Vec<u8>)>, SynthError> {
    let pattern = if scene.print.dots == Dots::InPattern { render_marked(scene)? } else { render_pattern(scene)? };
    let mut files = vec![
        (scene.pattern_file(), encode(scene, &pattern)?),
        ("bench.toml", scene.bench_text().into_bytes()),
        ("truth.json", pattern.truth.to_json(scene)?.into_bytes()),
    ];
    if scene.print.dots == Dots::OwnPhoto {
        files.push((scene.target_file(), encode(scene, &render_target(scene)?)?));
    }
    Ok(files)
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::path::Path;

    fn small_scene(folder: &Path) -> PathBuf {
        let mut scene = demo_scene("no-target").unwrap();
        (scene.file.width_px, scene.file.height_px) = (200, 150);
        scene.camera.lens.focal_px = 315.0;
        scene.camera.lens.principal_px = [100.0, 75.0];
        let path = folder.join("scene.toml");
        std::fs::write(&path, toml::to_string(&scene).unwrap()).unwrap();
        path
    }

    fn args(scene: PathBuf, out: PathBuf) -> RenderArgs {
        RenderArgs { scene: Some(scene), demo: None, out, force: false }
    }

    #[test]
    fn writes_the_files_once_and_again_only_by_force() {
        let folder = tempfile::tempdir().unwrap();
        let scene = small_scene(folder.path());
        let out = folder.path().join("made");
        run(&args(scene.clone(), out.clone())).unwrap();
        let mut written: Vec<String> =
            std::fs::read_dir(&out).unwrap().map(|entry| entry.unwrap().file_name().into_string().unwrap()).collect();
        written.sort();
        assert_eq!(written, ["bench.toml", "pattern.jpg", "truth.json"]);
        let truth: serde_json::Value = serde_json::from_slice(&std::fs::read(out.join("truth.json")).unwrap()).unwrap();
        assert!(truth["orders"].as_array().unwrap().len() > 5);
        assert!(matches!(run(&args(scene.clone(), out.clone())), Err(Failure::Exists { .. })));
        assert!(run(&RenderArgs { force: true, ..args(scene, out) }).is_ok());
    }

    #[test]
    fn a_missing_scene_file_is_named() {
        let message = run(&args("nowhere/scene.toml".into(), "nowhere-else".into())).unwrap_err().to_string();
        assert!(message.contains("nowhere"), "{message}");
    }
}
