//! Instructions of a whole fit for each effective draw: a count that is the same in every run, so that a step
//! backwards shows even on a busy machine.
//!
//! `cargo bench --bench instructions -- [--renew]`
//!
//! Counted by Valgrind's callgrind on small problems at fixed draws: the process that makes a fit less the process
//! that only makes the study ready for it. The counts are held against `benches/instructions.csv`; one that is above its
//! entry by more than 2 % ends the bench with a failure, and `--renew` writes the table anew. Instructions are those of
//! AVX2 wherever the processor has it: Valgrind knows nothing wider.
//!
//! As long as the draws are the same bits, so are the effective draws. A change of the sampler moves them by
//! chance as well as by merit, here by some per cent: look at `--bench sampler` before the table is renewed.

#[allow(dead_code, reason = "each bench uses its part")]
mod support;

use ratewright::fit::{self, Machine, Unwatched};
use std::io::Write;
use std::path::Path;
use std::process::{Command, ExitCode};
use support::problems::{D, Family, S, Sampling, study};
use support::table::Table;
use support::{Failure, arguments};

/// Kept draws of a counted fit.
const DRAWS: usize = 8_000;
/// Seed of the problems and their fits.
const SEED: u64 = 1;
/// How far above its entry a count may be.
const ALLOWED: f64 = 1.02;
/// Columns of the table.
const HEADER: [&str; 5] = [
    "problem",
    "family",
    "instructions",
    "effective_draws",
    "instructions_per_effective_draw",
];

fn main() -> Result<ExitCode, Failure> {
    let arguments = arguments();
    let words: Vec<&str> = arguments.iter().map(String::as_str).collect();
    match words.as_slice() {
        ["ready", problem, family] => counted(problem, family, Until::Ready),
        ["fit", problem, family] => counted(problem, family, Until::Fitted),
        [] => compare(),
        ["--renew"] => renew(),
        _ => Err("the arguments are: nothing, or --renew".into()),
    }
}

/// How far a counted process goes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Until {
    /// The study is simulated and its model built.
    Ready,
    /// It is fitted.
    Fitted,
}

/// The process whose instructions are counted: tells the effective draws of the worst parameter.
fn counted(problem: &str, family: &str, until: Until) -> Result<ExitCode, Failure> {
    let problem = [S, D]
        .into_iter()
        .find(|known| known.name == problem)
        .ok_or("no such problem")?;
    let family = Family::BOTH
        .into_iter()
        .find(|known| known.name() == family)
        .ok_or("no such family")?;
    let study = study(&problem, family, SEED, Sampling::of_draws(DRAWS))?;
    if until == Until::Fitted {
        let machine = Machine {
            threads: 1,
            lockstep: 8,
        };
        let fit = fit::run(&study.model, &study.spec, machine, &Unwatched)?;
        let effective = fit
            .assessments
            .iter()
            .map(|a| a.effective_draws)
            .fold(f64::INFINITY, f64::min);
        writeln!(std::io::stdout(), "{effective}")?;
    }
    Ok(ExitCode::SUCCESS)
}

/// Instructions of such a process, and what it told.
fn count(until: &str, problem: &str, family: &str) -> Result<(u64, String), Failure> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("target/bench");
    std::fs::create_dir_all(&folder)?;
    let file = folder.join("callgrind.out");
    let output = Command::new("valgrind")
        .args(["--tool=callgrind", "--quiet"])
        .arg(format!("--callgrind-out-file={}", file.display()))
        .arg(std::env::current_exe()?)
        .args([until, problem, family])
        .output()
        .map_err(|error| format!("cannot start valgrind ({error}); on Debian: apt-get install valgrind"))?;
    if !output.status.success() {
        return Err(format!("valgrind: {}", String::from_utf8_lossy(&output.stderr)).into());
    }
    let profile = std::fs::read_to_string(&file)?;
    let totals = profile
        .lines()
        .find_map(|line| line.strip_prefix("totals: "))
        .ok_or("callgrind told no total")?;
    Ok((totals.trim().parse()?, String::from_utf8(output.stdout)?))
}

/// Counts all problems.
fn measure() -> Result<Table, Failure> {
    let mut table = Table::new(&HEADER);
    for problem in [S, D] {
        for family in Family::BOTH {
            let (ready, _) = count("ready", problem.name, family.name())?;
            let (fitted, told) = count("fit", problem.name, family.name())?;
            let instructions = fitted.saturating_sub(ready);
            let effective: f64 = told.trim().parse()?;
            table.push(vec![
                problem.name.to_owned(),
                family.name().to_owned(),
                instructions.to_string(),
                format!("{effective:.1}"),
                format!("{:.0}", instructions as f64 / effective),
            ]);
        }
    }
    Ok(table)
}

fn kept() -> std::path::PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("benches/instructions.csv")
}

fn renew() -> Result<ExitCode, Failure> {
    measure()?.write(&kept())?;
    writeln!(
        std::io::stdout(),
        "benches/instructions.csv is renewed: look at the difference before you commit it."
    )?;
    Ok(ExitCode::SUCCESS)
}

fn compare() -> Result<ExitCode, Failure> {
    let (table, now) = (Table::read(&kept())?, measure()?);
    let mut out = std::io::stdout().lock();
    writeln!(
        out,
        "Instructions for each effective draw, whole fits of {DRAWS} draws\n\n\
         | problem | family | instructions | effective draws | for each | in the table | |\n\
         | --- | --- | --- | --- | --- | --- | --- |"
    )?;
    let mut ended = ExitCode::SUCCESS;
    for row in now.rows() {
        let [problem, family, instructions, effective, each] = row.as_slice() else {
            return Err("a count has other columns than the table".into());
        };
        let entry = table.rows().iter().find(|entry| entry[..2] == row[..2]);
        let entry = entry.ok_or_else(|| format!("the table lacks {problem}, {family}: renew it with -- --renew"))?;
        let share = each.parse::<f64>()? / entry[4].parse::<f64>()?;
        let said = if share > ALLOWED {
            ended = ExitCode::FAILURE;
            "MORE than allowed"
        } else if share < 1.0 / ALLOWED {
            "fewer: the table can be renewed"
        } else {
            "as in the table"
        };
        writeln!(
            out,
            "| {problem} | {family} | {instructions} | {effective} | {each} | {} | {:+.1} %: {said} |",
            entry[4],
            100.0 * (share - 1.0)
        )?;
    }
    if ended == ExitCode::FAILURE {
        writeln!(
            out,
            "\nA fit takes over 2 % more instructions than benches/instructions.csv says. Mend it, or renew the table with \
             `cargo bench --bench instructions -- --renew` and say in the commit what the instructions buy."
        )?;
    }
    Ok(ended)
}
