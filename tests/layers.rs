//! The folders of `src` may only use those below them.

use std::fs;
use std::path::{Path, PathBuf};

/// From the bottom up.
const LAYERS: [&str; 7] = [
    "sky", "season", "scenario", "chart", "sheet", "window", "cli",
];

fn rust_files(folder: &Path) -> Vec<PathBuf> {
    let mut files = Vec::new();
    for entry in fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            files.extend(rust_files(&path));
        } else if path.extension().is_some_and(|extension| extension == "rs") {
            files.push(path);
        }
    }
    files
}

#[test]
fn arrows_point_down_only() {
    let source = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut seen = 0;
    for (height, layer) in LAYERS.iter().enumerate() {
        for file in rust_files(&source.join(layer)) {
            let text = fs::read_to_string(&file).unwrap();
            for (number, line) in text.lines().enumerate() {
                for used in line.split("crate::").skip(1) {
                    let name: String = used
                        .chars()
                        .take_while(|c| c.is_alphanumeric() || *c == '_')
                        .collect();
                    let Some(depth) = LAYERS.iter().position(|layer| *layer == name) else {
                        continue;
                    };
                    seen += 1;
                    assert!(
                        depth <= height,
                        "{}:{}: {layer} uses {name} above it",
                        file.display(),
                        number + 1
                    );
                }
            }
        }
    }
    assert!(seen > 20, "only {seen} uses were read");
}

/// Doors to the outside world, and functions whose last digit depends on the system.
const FOREIGN: [&str; 14] = [
    "std::fs",
    "std::env",
    "SystemTime",
    "Instant::now",
    "Local::now",
    "egui",
    ".atan2(",
    ".powf(",
    ".ln()",
    ".exp()",
    ".log10()",
    ".asin()",
    ".acos()",
    ".cbrt()",
];

/// The engine takes clock, files and environment from its caller and its functions from libm.
#[test]
fn the_engine_is_pure() {
    let source = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    for layer in ["sky", "season"] {
        for file in rust_files(&source.join(layer)) {
            let text = fs::read_to_string(&file).unwrap();
            for word in FOREIGN {
                let hit = text
                    .lines()
                    .find(|line| line.contains(word) && !line.trim_start().starts_with("//"));
                assert!(hit.is_none(), "{}: {word} in {hit:?}", file.display());
            }
        }
    }
}
