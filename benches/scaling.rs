//! How the whole program grows with rows, terms, chains and threads: a CSV table, and curves drawn from it.
//!
//! `cargo bench --bench scaling -- [--full] [--renew-docs | --draw]`
//!
//! Each study is written as a CSV file with its spec, and the program reads, fits, checks and writes. The table goes into
//! `target/bench`. `--full` goes on to a million rows (minutes, and 400 MB of table); `--renew-docs` also keeps
//! the table as `docs/scaling.csv` and draws the curves there; `--draw` only draws them again.

#[allow(dead_code, reason = "each bench uses its part")]
mod support;

use std::io::Write;
use std::path::Path;
use support::curves::{Axis, draw};
use support::problems::{Columns, Family, M, Problem, Sampling, spec_text};
use support::program::{parts, start, text};
use support::simulate::{csv_text, simulate};
use support::table::Table;
use support::{Failure, arguments};

/// Columns of the table.
const HEADER: [&str; 12] = [
    "axis",
    "value",
    "family",
    "rows",
    "terms",
    "chains",
    "threads",
    "seconds",
    "read_seconds",
    "fit_seconds",
    "write_seconds",
    "megabytes",
];

/// The curves: what grows, and how it is called.
const AXES: [Axis; 4] = [
    Axis {
        name: "rows",
        label: "rows (20 terms)",
    },
    Axis {
        name: "terms",
        label: "terms (10,000 rows)",
    },
    Axis {
        name: "chains",
        label: "chains (10,000 rows, 20 terms)",
    },
    Axis {
        name: "threads",
        label: "threads (10,000 rows, 20 terms, 16 chains)",
    },
];

/// One whole run of the program.
#[derive(Debug, Clone, Copy)]
struct Point {
    axis: &'static str,
    value: usize,
    problem: Problem,
    chains: usize,
    threads: usize,
}

fn main() -> Result<(), Failure> {
    let arguments = arguments();
    let given = |name: &str| arguments.iter().any(|argument| argument == name);
    let docs = Path::new(env!("CARGO_MANIFEST_DIR")).join("docs");
    let kept = docs.join("scaling.csv");
    if given("--draw") {
        return draw_all(&Table::read(&kept)?, &docs);
    }
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("target/bench");
    std::fs::create_dir_all(&folder)?;
    let mut out = std::io::stdout().lock();
    writeln!(out, "| {} |", HEADER.join(" | "))?;
    writeln!(out, "|{}", " --- |".repeat(HEADER.len()))?;
    let mut table = Table::new(&HEADER);
    for point in points(given("--full")) {
        for family in Family::BOTH {
            let row = measure(&point, family, &folder)?;
            writeln!(out, "| {} |", row.join(" | "))?;
            table.push(row);
        }
    }
    table.write(&folder.join("scaling.csv"))?;
    if given("--renew-docs") {
        table.write(&kept)?;
        draw_all(&table, &docs)?;
    }
    Ok(())
}

fn points(full: bool) -> Vec<Point> {
    let cores = std::thread::available_parallelism().map_or(1, usize::from);
    let middle = Point {
        axis: "rows",
        value: M.rows,
        problem: M,
        chains: 4,
        threads: cores,
    };
    let rows: &[usize] = match full {
        false => &[1_000, 10_000, 100_000],
        true => &[1_000, 3_000, 10_000, 30_000, 100_000, 300_000, 1_000_000],
    };
    let mut points = Vec::new();
    for &value in rows {
        let problem = M.with_rows(value);
        points.push(Point {
            value,
            problem,
            ..middle
        });
    }
    for value in [5, 10, 20, 40, 80] {
        let problem = Problem {
            columns: Columns::Numbers(value),
            ..M
        };
        let axis = "terms";
        points.push(Point {
            axis,
            value,
            problem,
            ..middle
        });
    }
    for value in [4, 8, 16, 32] {
        let axis = "chains";
        points.push(Point {
            axis,
            value,
            chains: value,
            ..middle
        });
    }
    // One, two, four ... and all.
    let mut threads: Vec<usize> = (0..).map(|k| 1 << k).take_while(|&n| n < cores).collect();
    threads.push(cores);
    for value in threads {
        let axis = "threads";
        points.push(Point {
            axis,
            value,
            chains: 16,
            threads: value,
            ..middle
        });
    }
    points
}

/// A row of the table: the median of three runs, or one where it is long.
fn measure(point: &Point, family: Family, folder: &Path) -> Result<Vec<String>, Failure> {
    let (spec, run) = (folder.join("scaling.toml"), folder.join("scaling.run"));
    let design = simulate(&point.problem, family, 1);
    let sampling = Sampling {
        chains: point.chains,
        ..Sampling::default()
    };
    std::fs::write(folder.join("scaling-rows.csv"), csv_text(&design))?;
    std::fs::write(&spec, spec_text(&design, "scaling-rows.csv", family, 1, sampling))?;
    let threads = point.threads.to_string();
    let command = [
        "fit",
        text(&spec)?,
        "--into",
        text(&run)?,
        "--replace",
        "--quiet",
        "--threads",
        &threads,
    ];
    let runs = if point.problem.rows > M.rows { 1 } else { 3 };
    // The parts are those of the run that took the median time, so that they add up to it.
    let mut took = Vec::new();
    for _ in 0..runs {
        let one = start(&command, 1)?;
        took.push((one.wall[0], one.memory, parts(&run)?));
    }
    took.sort_by(|a, b| a.0.total_cmp(&b.0));
    let (seconds, memory, parts) = &took[took.len() / 2];
    let of = |name: &str| {
        let seconds: f64 = parts
            .iter()
            .filter(|(part, _)| part.contains(name))
            .map(|(_, seconds)| seconds)
            .sum();
        format!("{seconds:.4}")
    };
    Ok(vec![
        point.axis.to_owned(),
        point.value.to_string(),
        family.name().to_owned(),
        point.problem.rows.to_string(),
        point.problem.terms().to_string(),
        point.chains.to_string(),
        threads.clone(),
        format!("{seconds:.4}"),
        of("read"),
        of("fit"),
        of("write"),
        format!("{:.0}", *memory as f64 * 1e-6),
    ])
}

fn draw_all(table: &Table, docs: &Path) -> Result<(), Failure> {
    for axis in AXES {
        std::fs::write(docs.join(format!("scaling-{}.svg", axis.name)), draw(table, axis)?)?;
    }
    Ok(())
}
