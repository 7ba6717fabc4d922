//! What README.md shows is what the program prints. `UPDATE=1 cargo test --release readme` rewrites the shown result.

use std::{fs, path::Path, process::Command};

const BEGIN: &str = "<!-- result of the first command -->\n";
const END: &str = "<!-- end of the result -->\n";

#[test]
fn readme_shows_what_the_program_prints() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let arguments = ["measure", "sample-images/embossed-film/pattern.jpg"];
    let done = Command::new(env!("CARGO_BIN_EXE_spotrule")).args(arguments).current_dir(root).output().unwrap();
    assert!(done.status.success(), "{}", String::from_utf8_lossy(&done.stderr));
    let printed: String = String::from_utf8(done.stdout)
        .unwrap()
        .lines()
        .map(|line| if line.is_empty() { "\n".to_owned() } else { format!("    {line}\n") })
        .collect();
    let path = root.join("README.md");
    let readme = fs::read_to_string(&path).unwrap();
    let (before, rest) = readme.split_once(BEGIN).unwrap();
    let (shown, after) = rest.split_once(END).unwrap();
    assert!(before.contains(&format!("cargo run --release -- {}\n", arguments.join(" "))));
    let wanted = format!("\n{printed}\n");
    if std::env::var_os("UPDATE").is_some() && shown != wanted {
        fs::write(&path, format!("{before}{BEGIN}{wanted}{END}{after}")).unwrap();
    } else {
        assert_eq!(shown, wanted, "UPDATE=1 rewrites README.md");
    }
}
