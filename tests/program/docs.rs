//! What README and docs claim, held against the program and the tree.

use clap::Parser;
use std::collections::BTreeSet;
use std::fs;
use std::path::{Path, PathBuf};

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// README, guide and docs: where each is, and its text.
fn pages() -> Vec<(PathBuf, String)> {
    let mut paths = vec![root().join("README.md"), root().join("DEVELOPERS.md")];
    let docs = fs::read_dir(root().join("docs"))
        .unwrap()
        .map(|entry| entry.unwrap().path());
    paths.extend(docs.filter(|path| path.extension().is_some_and(|kind| kind == "md")));
    paths.sort();
    paths
        .into_iter()
        .map(|path| (path.clone(), fs::read_to_string(&path).unwrap()))
        .collect()
}

/// The fenced blocks of a page in this language.
fn blocks(text: &str, language: &str) -> Vec<String> {
    let fence = format!("```{language}\n");
    text.split(&fence)
        .skip(1)
        .map(|rest| rest.split("```").next().unwrap().to_string())
        .collect()
}

/// Every piece of code on a page: the lines of its shell blocks, and what stands between backticks in its prose.
fn code(text: &str) -> Vec<String> {
    let mut found: Vec<String> = blocks(text, "sh")
        .iter()
        .flat_map(|block| block.lines())
        .map(str::to_string)
        .collect();
    let mut prose = String::new();
    for (place, part) in text.split("```").enumerate() {
        if place % 2 == 0 {
            prose.push_str(part);
        }
    }
    found.extend(prose.split('`').skip(1).step_by(2).map(str::to_string));
    // What follows two spaces and a hash is a remark.
    found
        .iter()
        .map(|line| line.split("  #").next().unwrap().trim().to_string())
        .collect()
}

#[test]
fn every_link_within_the_project_leads_to_a_file() {
    let mut links = 0;
    for (path, text) in pages() {
        for link in text.split("](").skip(1).map(|rest| rest.split(')').next().unwrap()) {
            let target = link.split('#').next().unwrap();
            if target.is_empty() || target.contains("://") {
                continue;
            }
            links += 1;
            assert!(
                path.parent().unwrap().join(target).exists(),
                "{}: no {target}",
                path.display()
            );
        }
    }
    assert!(links > 5, "only {links} links were found");
}

#[test]
fn every_make_target_named_exists() {
    let makefile = fs::read_to_string(root().join("Makefile")).unwrap();
    let mut named = 0;
    for (path, text) in pages() {
        for target in code(&text).iter().filter_map(|code| code.strip_prefix("make ")) {
            named += 1;
            let rule = format!("\n{target}:");
            assert!(makefile.contains(&rule), "{}: no target {target}", path.display());
        }
    }
    assert!(named > 5, "only {named} targets were found");
}

#[test]
fn the_spec_shown_in_the_readme_is_one_that_the_program_accepts() {
    let readme = fs::read_to_string(root().join("README.md")).unwrap();
    let specs = blocks(&readme, "toml");
    assert_eq!(specs.len(), 1);
    ratewright::spec::parse("README.md", &specs[0]).unwrap();
}

/// The command lines shown: `ratewright …`, without what stands for a choice of the reader's.
fn command_lines() -> BTreeSet<Vec<String>> {
    let shown = |code: String| {
        let rest = code.strip_prefix("ratewright ")?.to_string();
        Some(rest.split_whitespace().map(str::to_string).collect::<Vec<_>>())
    };
    pages()
        .into_iter()
        .flat_map(|(_, text)| code(&text))
        .filter_map(shown)
        .collect()
}

#[test]
fn every_command_line_shown_is_understood() {
    let lines = command_lines();
    assert!(lines.len() > 5, "only {} command lines were found", lines.len());
    for words in lines {
        assert!(understood(&words), "ratewright {}", words.join(" "));
    }
    assert!(!understood(&[
        "fit".into(),
        "pools.toml".into(),
        "--no-such-option".into()
    ]));
}

fn understood(words: &[String]) -> bool {
    let words = std::iter::once("ratewright").chain(words.iter().map(String::as_str));
    ratewright::command::Cli::try_parse_from(words).is_ok()
}

/// Fits a study of this project into `run` and returns what it prints.
fn fit(spec: &str, run: &Path) -> String {
    let mut command = assert_cmd::Command::cargo_bin("ratewright").unwrap();
    let done = command
        .arg("fit")
        .arg(root().join(spec))
        .arg("--into")
        .arg(run)
        .arg("--quiet")
        .output()
        .unwrap();
    assert!(done.status.success(), "{}", String::from_utf8_lossy(&done.stderr));
    String::from_utf8(done.stdout).unwrap()
}

#[test]
fn the_demo_prints_what_the_readme_shows() {
    let folder = tempfile::tempdir().unwrap();
    let printed = fit("demo-data/swimming-pools/pools.toml", &folder.path().join("pools.run"));
    let readme = fs::read_to_string(root().join("README.md")).unwrap();
    let shown = blocks(&readme, "text");
    assert_eq!(shown.len(), 1);
    assert!(printed.starts_with(&shown[0]), "the demo now prints\n{printed}");
}

#[test]
fn reading_the_findings_names_every_file_and_column_of_a_run_and_no_other() {
    let folder = tempfile::tempdir().unwrap();
    let run = folder.path().join("clinic.run");
    fit("tests/reference/clinic.nb2.toml", &run);

    let page = fs::read_to_string(root().join("docs/reading-the-findings.md")).unwrap();
    let files: BTreeSet<String> = fs::read_dir(&run)
        .unwrap()
        .map(|entry| entry.unwrap().file_name().into_string().unwrap())
        .collect();
    assert_eq!(first_column(section(&page, "## The run folder")), files);

    for table in ["coefficients.csv", "rate_ratios.csv", "units.csv"] {
        let text = fs::read_to_string(run.join(table)).unwrap();
        let columns: BTreeSet<String> = text.lines().next().unwrap().split(',').map(str::to_string).collect();
        assert_eq!(
            first_column(section(&page, &format!("### `{table}`"))),
            columns,
            "{table}"
        );
    }
}

/// A page from this heading to the next.
fn section<'a>(page: &'a str, heading: &str) -> &'a str {
    let start = page.find(heading).unwrap_or_else(|| panic!("no heading {heading}")) + heading.len();
    let rest = &page[start..];
    &rest[..rest.find("\n#").unwrap_or(rest.len())]
}

/// The names between backticks in the first column of a section's table.
fn first_column(section: &str) -> BTreeSet<String> {
    let rows = section.lines().filter(|line| line.starts_with("| `"));
    rows.flat_map(|row| {
        let cell = row.trim_start_matches("| ").split(" |").next().unwrap();
        cell.split('`')
            .skip(1)
            .step_by(2)
            .map(str::to_string)
            .collect::<Vec<_>>()
    })
    .collect()
}
