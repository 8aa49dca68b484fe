//! The program as it is run: exit codes, streams, runs.
#![allow(missing_docs)]

use assert_cmd::Command;
use std::fs;
use std::path::Path;
use std::process::{Output, Stdio};
use std::sync::OnceLock;
use tempfile::TempDir;

/// A folder with the invented study of the landings in it.
pub fn place() -> TempDir {
    let place = tempfile::tempdir().unwrap();
    for file in ["landings.toml", "landings.csv"] {
        let from = Path::new(env!("CARGO_MANIFEST_DIR"))
            .join("tests/command_line")
            .join(file);
        fs::copy(from, place.path().join(file)).unwrap();
    }
    place
}

pub fn ratewright(place: &Path, arguments: &[&str]) -> Output {
    let mut command = Command::cargo_bin("ratewright").unwrap();
    command.current_dir(place).args(arguments).output().unwrap()
}

/// A place with a finished run, made once: a fit is the slow part.
pub fn finished() -> &'static Path {
    static PLACE: OnceLock<TempDir> = OnceLock::new();
    PLACE
        .get_or_init(|| {
            let place = place();
            let output = ratewright(place.path(), &["fit", "landings.toml", "--quiet"]);
            assert_eq!(output.status.code(), Some(0), "{}", err(&output));
            fs::write(place.path().join("told.txt"), &output.stdout).unwrap();
            place
        })
        .path()
}

pub fn out(output: &Output) -> String {
    String::from_utf8(output.stdout.clone()).unwrap()
}

pub fn err(output: &Output) -> String {
    String::from_utf8(output.stderr.clone()).unwrap()
}

pub fn names(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> = fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
        .collect();
    names.sort();
    names
}

/// Words on one line, wherever they were wrapped.
pub fn unwrapped(text: &str) -> String {
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}

pub fn replaced(path: &Path, from: &str, to: &str) {
    let text = fs::read_to_string(path).unwrap();
    assert!(text.contains(from), "{} has no {from}", path.display());
    fs::write(path, text.replacen(from, to, 1)).unwrap();
}

#[test]
fn fit_tells_the_answer_and_leaves_a_run_beside_the_spec() {
    let place = finished();
    let told = fs::read_to_string(place.join("told.txt")).unwrap();
    let answer = told
        .find("Where decking is grooved")
        .or(told.find("The data do not settle"))
        .unwrap();
    assert!(answer < told.find("Rate ratios").unwrap());
    assert!(told.contains("ratewright replay landings.run"), "{told}");
    assert!(!told.contains('\u{1b}'), "escapes in a file: {told}");
    assert!(place.join("landings.run/findings.json").is_file());
}

#[test]
fn findings_of_a_fit_obey_the_printed_schema() {
    let output = ratewright(finished(), &["schema", "findings"]);
    let schema = serde_json::from_slice(&output.stdout).unwrap();
    let findings = fs::read(finished().join("landings.run/findings.json")).unwrap();
    let findings: serde_json::Value = serde_json::from_slice(&findings).unwrap();
    let validator = jsonschema::validator_for(&schema).unwrap();
    assert!(
        validator.is_valid(&findings),
        "{:?}",
        validator.iter_errors(&findings).next()
    );
}

#[test]
fn a_rate_ratio_is_the_exponential_of_its_coefficient() {
    let cells = |file: &str, line: usize| -> Vec<String> {
        let text = fs::read_to_string(finished().join("landings.run").join(file)).unwrap();
        text.lines().nth(line).unwrap().split(',').map(str::to_owned).collect()
    };
    let (coefficient, ratio) = (cells("coefficients.csv", 2), cells("rate_ratios.csv", 1));
    assert_eq!(
        (coefficient[0].as_str(), ratio[0].as_str()),
        ("decking=grooved", "decking=grooved")
    );
    for (log, factor) in coefficient[1..4].iter().zip(&ratio[2..5]) {
        let log: f64 = log.parse().unwrap();
        assert_eq!(ratewright::numeric::exp(log), factor.parse::<f64>().unwrap());
    }
}

#[test]
fn json_prints_the_findings_and_nothing_else() {
    let place = place();
    let output = ratewright(place.path(), &["fit", "landings.toml", "--json", "--into", "x.run"]);
    assert_eq!(
        out(&output),
        fs::read_to_string(place.path().join("x.run/findings.json")).unwrap()
    );
    assert_eq!(err(&output), "");
}

#[test]
fn the_bytes_depend_on_no_thread_and_no_kernel_of_the_linear_algebra() {
    let manifest = fs::read_to_string(finished().join("landings.run/manifest.json")).unwrap();
    for (threads, kernel) in [("1", "Prescott"), ("2", "Haswell"), ("3", "Nehalem")] {
        let place = place();
        let mut command = Command::cargo_bin("ratewright").unwrap();
        command
            .current_dir(place.path())
            .env("OPENBLAS_CORETYPE", kernel)
            .args(["fit", "landings.toml", "--quiet", "--threads", threads]);
        command.assert().success();
        assert_eq!(
            fs::read_to_string(place.path().join("landings.run/manifest.json")).unwrap(),
            manifest
        );
    }
}

#[test]
fn whole_shows_small_counts_and_its_replay_agrees() {
    let place = place();
    let output = ratewright(place.path(), &["fit", "landings.toml", "--whole", "--quiet"]);
    assert_eq!(output.status.code(), Some(0), "{}", err(&output));
    let whole = fs::read_to_string(place.path().join("landings.run/units.csv")).unwrap();
    let hidden = fs::read_to_string(finished().join("landings.run/units.csv")).unwrap();
    assert!(hidden.contains(",hidden\n") && !whole.contains(",hidden\n"), "{hidden}");
    let replay = ratewright(place.path(), &["replay", "landings.run"]);
    assert_eq!(replay.status.code(), Some(0), "{}", out(&replay));
}

#[test]
fn the_plainest_study_fits_and_replays() {
    let place = place();
    let spec = "[study]\ntitle = \"Falls\"\nquestion = \"How many?\"\nanswer = \"baseline\"\nseed = 7\n\
                [data]\nfile = \"landings.csv\"\nunit = \"landing\"\n[incidents]\ncolumn = \"falls\"\n\
                [family]\nkind = \"poisson\"\n[baseline]\nplausible_rate = [1, 30]\n[sampling]\nprecision = 0.1\n";
    fs::write(place.path().join("plain.toml"), spec).unwrap();
    let output = ratewright(place.path(), &["fit", "plain.toml"]);
    assert_eq!(output.status.code(), Some(0), "{}", err(&output));
    assert!(out(&output).contains("falls per row"), "{}", out(&output));
    assert!(!out(&output).contains("Rate ratios"), "{}", out(&output));
    let replay = ratewright(place.path(), &["replay", "plain.run"]);
    assert_eq!(replay.status.code(), Some(0), "{}{}", out(&replay), err(&replay));
}

#[test]
fn vet_shows_what_the_priors_imply_and_no_count() {
    let output = ratewright(place().path(), &["vet", "landings.toml"]);
    assert_eq!(output.status.code(), Some(0), "{}", err(&output));
    insta::assert_snapshot!(out(&output));
}

#[test]
fn vet_tells_a_long_name_whole_and_within_eighty_columns() {
    let place = place();
    let long = "decking as it was laid after the second winter of works";
    for file in ["landings.toml", "landings.csv"] {
        let path = place.path().join(file);
        let text = fs::read_to_string(&path).unwrap();
        let renamed = text
            .replace("decking=", &format!("{long}="))
            .replace("\"decking\"", &format!("\"{long}\""))
            .replace(",decking,", &format!(",{long},"));
        fs::write(&path, renamed).unwrap();
    }
    let output = ratewright(place.path(), &["vet", "landings.toml"]);
    assert_eq!(output.status.code(), Some(0), "{}", err(&output));
    let told = out(&output);
    assert!(told.lines().all(|line| line.chars().count() <= 80), "{told}");
    assert!(
        unwrapped(&told).contains(&format!("rate ratio, {long}=grooved")),
        "{told}"
    );
}

#[test]
fn vet_says_the_same_whatever_the_outcome() {
    let place = place();
    let before = out(&ratewright(place.path(), &["vet", "landings.toml"]));
    let path = place.path().join("landings.csv");
    let table = fs::read_to_string(&path).unwrap();
    let doubled: Vec<String> = table
        .lines()
        .map(|line| {
            let mut cells: Vec<String> = line.split(',').map(str::to_owned).collect();
            if let Ok(count) = cells[3].parse::<u64>() {
                cells[3] = (2 * count + 1).to_string();
            }
            cells.join(",")
        })
        .collect();
    fs::write(&path, doubled.join("\n")).unwrap();
    assert_ne!(fs::read_to_string(&path).unwrap(), table);
    assert_eq!(out(&ratewright(place.path(), &["vet", "landings.toml"])), before);
}

#[test]
fn vet_as_json_is_json() {
    let output = ratewright(place().path(), &["vet", "landings.toml", "--json"]);
    let vetting: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    assert_eq!(vetting["data"]["rows_used"], 24);
    assert_eq!(vetting["prior"]["state"], "clear");
}

#[test]
fn a_draft_passes_vet_and_is_never_written_over() {
    let place = place();
    fs::create_dir(place.path().join("specs")).unwrap();
    let draft = ratewright(place.path(), &["draft", "landings.csv", "--into", "specs/new.toml"]);
    assert_eq!(draft.status.code(), Some(0), "{}", err(&draft));
    assert_eq!(out(&draft), "");
    let vet = ratewright(place.path(), &["vet", "specs/new.toml"]);
    assert_eq!(vet.status.code(), Some(0), "{}", err(&vet));
    assert!(out(&vet).contains("provisional"), "{}", out(&vet));
    let again = ratewright(place.path(), &["draft", "landings.csv", "--into", "specs/new.toml"]);
    assert_eq!(again.status.code(), Some(1), "{}", err(&again));
    assert!(err(&again).contains("exists"), "{}", err(&again));
    let printed = ratewright(place.path(), &["draft", "landings.csv"]);
    assert!(out(&printed).contains("file = \"landings.csv\""), "{}", out(&printed));
}

#[test]
fn wrong_input_is_told_on_standard_error_and_nothing_is_written() {
    let place = place();
    replaced(
        &place.path().join("landings.toml"),
        "reference = \"plain\"",
        "reference = \"plane\"",
    );
    let output = ratewright(place.path(), &["fit", "landings.toml"]);
    assert_eq!((output.status.code(), out(&output).as_str()), (Some(2), ""));
    assert!(
        err(&output).contains("landings.toml:") && err(&output).contains("plane"),
        "{}",
        err(&output)
    );
    assert_eq!(names(place.path()), ["landings.csv", "landings.toml"]);
    assert_eq!(
        ratewright(place.path(), &["fit", "no such.toml"]).status.code(),
        Some(2)
    );
    assert_eq!(ratewright(place.path(), &["fit"]).status.code(), Some(2));
    assert_eq!(ratewright(place.path(), &["--help"]).status.code(), Some(0));
}

#[test]
fn no_place_to_write_is_told_before_the_slow_part() {
    let place = place();
    let output = ratewright(place.path(), &["fit", "landings.toml", "--into", "no such/x.run"]);
    assert_eq!(output.status.code(), Some(1), "{}", err(&output));
    assert!(err(&output).contains("no such"), "{}", err(&output));
    fs::create_dir(place.path().join("photos")).unwrap();
    fs::write(place.path().join("photos/quay.jpg"), "x").unwrap();
    let output = ratewright(place.path(), &["fit", "landings.toml", "--into", "photos", "--replace"]);
    assert_eq!(output.status.code(), Some(1), "{}", err(&output));
    assert_eq!(names(&place.path().join("photos")), ["quay.jpg"]);
}

#[test]
fn bold_is_for_terminals_and_yields_to_no_color() {
    let told = |variables: &[(&str, &str)]| {
        let mut command = Command::cargo_bin("ratewright").unwrap();
        command.current_dir(finished()).args(["vet", "landings.toml"]);
        command.env_remove("NO_COLOR").env_remove("CLICOLOR_FORCE");
        command.envs(variables.iter().copied());
        out(&command.output().unwrap())
    };
    assert!(told(&[("CLICOLOR_FORCE", "1")]).contains("\u{1b}[1m"));
    assert!(!told(&[("CLICOLOR_FORCE", "1"), ("NO_COLOR", "1")]).contains('\u{1b}'));
    assert!(!told(&[]).contains('\u{1b}'));
}

#[cfg(unix)]
mod signals {
    use super::*;
    use std::process::Command as Process;
    use std::time::{Duration, Instant};

    fn spawned(place: &Path, arguments: &[&str]) -> std::process::Child {
        Process::new(env!("CARGO_BIN_EXE_ratewright"))
            .current_dir(place)
            .args(arguments)
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap()
    }

    #[test]
    fn a_closed_pipe_ends_quietly() {
        for arguments in [&["schema", "spec"][..], &["vet", "landings.toml"]] {
            let mut child = spawned(finished(), arguments);
            drop(child.stdout.take());
            let output = child.wait_with_output().unwrap();
            assert_eq!((output.status.code(), err(&output).as_str()), (Some(0), ""));
        }
    }

    #[test]
    fn a_full_disk_is_told_with_the_file_and_leaves_nothing() {
        let place = place();
        // Files of at most 8 blocks: the draws need more. The limit's signal would end the process
        // unless it is watched; then the write itself fails, as it does on a full disk.
        let script = "ulimit -f 8; exec \"$0\" fit landings.toml --quiet";
        let output = Process::new("sh")
            .current_dir(place.path())
            .args(["-c", script, env!("CARGO_BIN_EXE_ratewright")])
            .output()
            .unwrap();
        assert_eq!(output.status.code(), Some(1), "{}", err(&output));
        assert!(err(&output).contains("landings.run/draws.parquet"), "{}", err(&output));
        assert_eq!(names(place.path()), ["landings.csv", "landings.toml"]);
    }

    #[test]
    fn an_interrupted_fit_leaves_nothing() {
        for signal in ["INT", "TERM", "HUP"] {
            interrupted_by(signal);
        }
    }

    fn interrupted_by(signal: &str) {
        let place = place();
        // A precision that takes minutes.
        let spec = place.path().join("landings.toml");
        replaced(
            &spec,
            "precision = 0.05",
            "precision = 0.001\nmost_draws = 50000000\nsteps = \"walk\"",
        );
        let child = spawned(place.path(), &["fit", "landings.toml"]);
        let begun = Instant::now();
        // The temporary folder appears when the slow part is about to begin.
        while names(place.path()).len() < 3 {
            assert!(begun.elapsed() < Duration::from_secs(60), "no fit began");
            std::thread::sleep(Duration::from_millis(20));
        }
        let sent = Process::new("sh")
            .args(["-c", &format!("kill -{signal} {}", child.id())])
            .status()
            .unwrap();
        assert!(sent.success());
        let output = child.wait_with_output().unwrap();
        assert_eq!(output.status.code(), Some(130), "{}", err(&output));
        assert_eq!(err(&output), "Interrupted: nothing was written.\n");
        assert_eq!(names(place.path()), ["landings.csv", "landings.toml"]);
    }
}
