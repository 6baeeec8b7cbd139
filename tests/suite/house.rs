//! The house's own rules: layers, what a reference may contain, that README and code say the same.

use std::path::Path;
use std::process::Command;

use proofhouse::judge::verdict::RULES;

fn script(name: &str) {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let output = Command::new("python3").arg(root.join("scripts").join(name)).output().expect("python3 is needed");
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
}

#[test]
fn nobody_imports_what_is_not_theirs_and_nothing_goes_in_circles() {
    script("check-layers");
}

#[test]
fn references_are_made_of_integers_and_know_nothing_of_the_kernels() {
    script("check-reference");
}

#[test]
fn the_readme_has_the_verdict_rules_as_they_are() {
    let readme = std::fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("README.md")).unwrap();
    let rows: Vec<&str> =
        readme.lines().skip_while(|l| *l != "| when | verdict |").skip(2).take_while(|l| l.starts_with('|')).collect();
    let expected: Vec<String> = RULES.iter().map(|r| format!("| {} | {} |", r.when, r.then)).collect();
    assert_eq!(rows, expected);
}

#[test]
fn the_readme_names_two_commands_that_ci_and_users_run() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let readme = std::fs::read_to_string(root.join("README.md")).unwrap();
    // worked examples stand in fences
    let prose = readme.split("```").step_by(2);
    let commands: Vec<&str> = prose.flat_map(str::lines).filter_map(|l| l.strip_prefix("    ")).collect();
    assert_eq!(commands, ["cargo run --release -- window --budget 60s", "cargo test --release --workspace"]);
    let ci = std::fs::read_to_string(root.join(".ci/run")).unwrap();
    assert!(ci.lines().any(|l| l == commands[1]), "CI calls the very test command");
}
