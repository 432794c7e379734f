//! A module uses what stands above it in `src/lib.rs`, never below: data flows one way.

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

fn rust_files(folder: &Path, list: &mut Vec<PathBuf>) {
    for entry in fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            rust_files(&path, list);
        } else if path.extension().is_some_and(|e| e == "rs") {
            list.push(path);
        }
    }
}

/// The top-level modules that a file's `crate::` paths name, with the line numbers.
fn used(text: &str) -> Vec<(usize, String)> {
    let mut uses = Vec::new();
    for (number, line) in text.lines().enumerate() {
        let code = line.split("//").next().unwrap_or("");
        for after in code.split("crate::").skip(1) {
            let name: String = after
                .chars()
                .take_while(|c| c.is_alphanumeric() || *c == '_')
                .collect();
            if !name.is_empty() {
                uses.push((number + 1, name));
            }
        }
    }
    uses
}

#[test]
fn no_module_reaches_back() {
    let source = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let library = fs::read_to_string(source.join("lib.rs")).unwrap();
    let order: BTreeMap<String, usize> = library
        .lines()
        .filter_map(|line| {
            line.strip_prefix("pub mod ")?
                .strip_suffix(';')
                .map(str::to_owned)
        })
        .enumerate()
        .map(|(place, name)| (name, place))
        .collect();
    assert!(
        order.len() > 5,
        "the order is read from src/lib.rs: {order:?}"
    );
    let mut files = Vec::new();
    rust_files(&source, &mut files);
    let mut wrong = Vec::new();
    for file in files {
        let inside = file.strip_prefix(&source).unwrap();
        let module = inside
            .components()
            .next()
            .unwrap()
            .as_os_str()
            .to_string_lossy()
            .replace(".rs", "");
        let Some(own) = order.get(&module) else {
            continue;
        };
        for (line, name) in used(&fs::read_to_string(&file).unwrap()) {
            if order.get(&name).is_some_and(|place| place > own) {
                wrong.push(format!(
                    "{}:{line}: {module} uses {name}, which stands below it",
                    inside.display()
                ));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// Numerics know numbers only, and only the command line touches the world outside.
#[test]
fn rooms_keep_to_their_business() {
    let source = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut files = Vec::new();
    rust_files(&source, &mut files);
    let mut wrong = Vec::new();
    for file in files {
        let inside = file
            .strip_prefix(&source)
            .unwrap()
            .to_string_lossy()
            .into_owned();
        let text = fs::read_to_string(&file).unwrap();
        if inside.starts_with("numerics") && text.contains("crate::") {
            wrong.push(format!("{inside}: numerics use nothing else of the crate"));
        }
        if !inside.starts_with("cli") && inside != "main.rs" {
            for outside in [
                "std::fs",
                "std::env",
                "std::time",
                "std::io",
                "println!",
                "eprintln!",
            ] {
                if text.contains(outside) {
                    wrong.push(format!("{inside}: {outside} belongs to cli"));
                }
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}
