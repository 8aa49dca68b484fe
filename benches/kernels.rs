//! How fast the log density and its derivatives are computed on one core: against the loop that one would first
//! write, and against what the machine can do at best.
//!
//! `cargo bench --bench kernels -- [--turns 15] [--million]`
//!
//! `--million` adds a million rows, eight points in lockstep against one at a time.

#[allow(dead_code, reason = "each bench uses its part")]
mod support;

use ratewright::fit::{Machine, Unwatched, laplace};
use ratewright::model::{Instructions, Model};
use ratewright::numeric::{Purpose, Stream};
use std::io::Write;
use support::clock::Clock;
use support::machine::Limits;
use support::pairs::{Piece, Spread, Turns, take_turns};
use support::plain::Rows;
use support::problems::{C, Columns, Family, L, M, Problem, Sampling, Study, study};
use support::{Failure, arguments, number_after};

/// Points evaluated together.
const WIDTHS: [usize; 4] = [1, 2, 4, 8];
/// Scatter at which the negative binomial is evaluated.
const SCATTER: f64 = 0.6;
/// Seed of the problems.
const SEED: u64 = 1;

fn main() -> Result<(), Failure> {
    let arguments = arguments();
    let turns = number_after(&arguments, "--turns", 15)? as usize;
    let mut out = std::io::stdout().lock();
    let limits = Limits::measure();
    writeln!(out, "{}", limits.told())?;
    writeln!(
        out,
        "Log density: time of one core, median of {turns} turns\n\n\
         | problem | rows x terms | family | instructions | together | us an evaluation | ns a row \
         | x the plain loop (quartiles) | at best | of the widest's speed | of the arithmetic peak | of the read bandwidth |\n\
         | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- |"
    )?;
    for problem in [M, L, C] {
        for family in Family::BOTH {
            evaluations(&mut out, &problem, family, turns, &limits)?;
        }
    }
    writeln!(
        out,
        "\nValue, gradient and Hessian on one core\n\n\
         | problem | rows x terms | family | instructions | us | ns a row | x the plain loop (quartiles) \
         | at best | of the arithmetic peak |\n\
         | --- | --- | --- | --- | --- | --- | --- | --- | --- |"
    )?;
    for problem in [M, L] {
        for family in Family::BOTH {
            derivatives(&mut out, &problem, family, turns, &limits)?;
        }
    }
    modes(&mut out, turns)?;
    if arguments.iter().any(|argument| argument == "--million") {
        million(&mut out, turns)?;
    }
    Ok(())
}

/// The model with each set of vector instructions that the machine has, narrow ones first. All give the same bits;
/// [`evaluations`] looks that they do.
fn by_instructions(model: &Model) -> Vec<(Instructions, Model)> {
    let with = |instructions| (instructions, model.clone().with_instructions(instructions));
    Instructions::available().into_iter().map(with).collect()
}

/// Points about the crude rate, one after the other.
fn points(model: &Model, many: usize) -> Vec<f64> {
    let mut stream = Stream::new(SEED, Purpose::Simulation, 1);
    let mut points = Vec::new();
    for _ in 0..many {
        let mut point: Vec<f64> = model.start().iter().map(|x| x + 0.05 * stream.normal()).collect();
        if model.scatter_place().is_some() {
            point.push(SCATTER);
        }
        points.extend(point);
    }
    points
}

/// The log likelihood by the plain loop.
fn plainly(rows: &Rows, model: &Model, point: &[f64]) -> f64 {
    match model.scatter_place() {
        Some(place) => rows.negative_binomial(&point[..place], point[place]),
        None => rows.poisson(point),
    }
}

/// An error unless two routes to one figure agree to nine digits of `scale`.
fn agree(what: &str, ours: f64, plain: f64, scale: f64) -> Result<(), Failure> {
    if (ours - plain).abs() <= 1e-9 * scale.abs() {
        return Ok(());
    }
    Err(format!("{what}: {ours} by the program, {plain} by the plain loop").into())
}

fn together(model: &Model, points: &[f64], out: &mut [f64]) -> f64 {
    model.log_densities(points, out);
    out.iter().sum()
}

fn evaluations(
    out: &mut impl Write,
    problem: &Problem,
    family: Family,
    turns: usize,
    limits: &Limits,
) -> Result<(), Failure> {
    let Study { design, model, .. } = study(problem, family, SEED, Sampling::default())?;
    let rows = Rows::new(&design);
    let points = points(&model, WIDTHS[WIDTHS.len() - 1]);
    let d = model.dimension();
    let point = &points[..d];
    let density = model.log_density(point);
    let likelihood = density - model.log_prior(point);
    agree("log likelihood", likelihood, plainly(&rows, &model, point), likelihood)?;

    let models = by_instructions(&model);
    let mut pieces = vec![Piece::new(|| plainly(&rows, &model, point))];
    for (instructions, model) in &models {
        if model.log_density(point).to_bits() != density.to_bits() {
            return Err(format!("{instructions} gives other bits than {}", Instructions::widest()).into());
        }
        for width in WIDTHS {
            let points = &points[..width * d];
            let mut densities = vec![0.0; width];
            pieces.push(Piece::new(move || together(model, points, &mut densities)));
        }
    }
    let times = take_turns(pieces, turns, Clock::Thread);
    let many = problem.rows as f64;
    let label = label(problem, family);
    let plain = times.seconds(0).median;
    writeln!(
        out,
        "{label} plain loop | 1 | {:.1} | {:.2} | 1 | 1 | | | |",
        plain * 1e6,
        plain / many * 1e9
    )?;
    let bytes = necessary_bytes(problem);
    let piece_of = |set: usize, width: usize| 1 + set * WIDTHS.len() + width;
    for (set, (instructions, _)) in models.iter().enumerate() {
        for (place, width) in WIDTHS.into_iter().enumerate() {
            let piece = piece_of(set, place);
            let together = times.seconds(piece).median;
            let each = together / width as f64;
            let shares = match problem.columns {
                Columns::Numbers(terms) => format!(
                    "{:.0} % | {:.0} %",
                    100.0 * many * necessary_operations(terms, family) / each / limits.arithmetic_with(*instructions),
                    100.0 * bytes as f64 / together / limits.read_rate(bytes)
                ),
                // What is necessary there depends on how the categories are stored.
                Columns::Categories(_) => "- | -".to_owned(),
            };
            writeln!(
                out,
                "{label} {instructions} | {width} | {:.1} | {:.2} | {} | {:.1} | {:.2} | {shares} |",
                each * 1e6,
                each / many * 1e9,
                scaled(&times, piece, width as f64),
                times.ratio_at_best(0, piece) * width as f64,
                times.ratio(piece_of(models.len() - 1, place), piece).median,
            )?;
        }
    }
    Ok(())
}

fn label(problem: &Problem, family: Family) -> String {
    format!(
        "| {} | {} x {} | {} |",
        problem.name,
        problem.rows,
        problem.terms(),
        family.name()
    )
}

/// How many times as long as an evaluation of a piece the plain loop takes, where the piece holds `width` of them.
fn scaled(times: &Turns, piece: usize, width: f64) -> Spread {
    let ratio = times.ratio(0, piece);
    Spread {
        lower: ratio.lower * width,
        median: ratio.median * width,
        upper: ratio.upper * width,
    }
}

/// Multiplications and additions of a row: two for each term and one for the offset; in the exponential 7 for the
/// split and 23 for the polynomial. Then Poisson weighs and adds; the negative binomial scales by c^2, multiplies
/// eight rows of equal counts together (3 each) and shares among them one log(1 + x) of some 36 and its sum. Divisions,
/// comparisons and bit moves are not counted.
fn necessary_operations(terms: usize, family: Family) -> f64 {
    let mean = 2.0 * terms as f64 + 1.0 + 30.0;
    match family {
        Family::Poisson => mean + 2.0,
        Family::NegativeBinomial => mean + 4.0 + 40.0 / 8.0,
    }
}

/// Bytes that one pass over the rows reads at least: the columns and the offset. (Counts and weights are equal
/// in a lane, so that they hardly add to it.)
fn necessary_bytes(problem: &Problem) -> usize {
    problem.rows * (problem.terms() + 1) * size_of::<f64>()
}

fn derivatives(
    out: &mut impl Write,
    problem: &Problem,
    family: Family,
    turns: usize,
    limits: &Limits,
) -> Result<(), Failure> {
    let Study { design, model, .. } = study(problem, family, SEED, Sampling::default())?;
    let rows = Rows::new(&design);
    let points = points(&model, 1);
    let coefficients = &points[..problem.terms() + 1];
    let plain = || match family {
        Family::Poisson => rows.poisson_derivatives(coefficients),
        Family::NegativeBinomial => rows.negative_binomial_derivatives(coefficients, SCATTER),
    };
    let ours = model.derivatives(&points, 1).ok_or("the density is 0 at the point")?;
    let theirs = plain();
    agree(
        "log likelihood",
        ours.value - model.log_prior(&points),
        theirs.value,
        theirs.value,
    )?;
    // Beyond the first, every coefficient has a standard normal prior: its curvature is -1.
    let (d, size) = (model.dimension(), coefficients.len());
    for i in 1..size {
        let (gradient, curvature) = (ours.gradient[i] + coefficients[i], ours.hessian[i * d + i] + 1.0);
        let largest = theirs.hessian[i * size + i];
        agree("gradient", gradient, theirs.gradient[i], largest)?;
        agree("curvature", curvature, largest, largest)?;
    }
    let models = by_instructions(&model);
    let mut pieces = vec![Piece::new(|| plain().value)];
    for (_, model) in &models {
        let points = &points;
        let value = move || {
            model
                .derivatives(points, 1)
                .map_or(f64::NAN, |derivatives| derivatives.value)
        };
        pieces.push(Piece::new(value));
    }
    let times = take_turns(pieces, turns, Clock::Thread);
    let (terms, many) = (problem.terms(), problem.rows as f64);
    let label = label(problem, family);
    let first = times.seconds(0).median;
    writeln!(
        out,
        "{label} plain loop | {:.0} | {:.1} | 1 | 1 | |",
        first * 1e6,
        first / many * 1e9
    )?;
    // The triangle of the Hessian, two operations for each of its entries, is nearly all of the work.
    let operations = necessary_operations(terms, family) + (terms * (terms + 1)) as f64 + 3.0 * terms as f64;
    for (set, (instructions, _)) in models.iter().enumerate() {
        let each = times.seconds(set + 1).median;
        writeln!(
            out,
            "{label} {instructions} | {:.0} | {:.1} | {} | {:.1} | {:.0} % |",
            each * 1e6,
            each / many * 1e9,
            times.ratio(0, set + 1),
            times.ratio_at_best(0, set + 1),
            100.0 * many * operations / each / limits.arithmetic_with(*instructions)
        )?;
    }
    Ok(())
}

/// Mode and Laplace approximation, from nothing to done.
fn modes(out: &mut impl Write, turns: usize) -> Result<(), Failure> {
    writeln!(
        out,
        "\nMode and Laplace approximation: ms on the wall\n\n\
         | problem | family | one thread (quartiles) | all threads | Newton steps |\n| --- | --- | --- | --- | --- |"
    )?;
    let all = Machine::default().threads;
    for problem in [M, L] {
        for family in Family::BOTH {
            let Study { model, .. } = study(&problem, family, SEED, Sampling::default())?;
            let found =
                |threads: usize| laplace(&model, threads, &Unwatched).map_or(f64::NAN, |(mode, _)| mode.steps as f64);
            let pieces = vec![Piece::new(|| found(1)), Piece::new(|| found(all))];
            let times = take_turns(pieces, turns, Clock::Wall);
            let milliseconds = |piece: usize| {
                let Spread { lower, median, upper } = times.seconds(piece);
                format!("{:.1} ({:.1} to {:.1})", median * 1e3, lower * 1e3, upper * 1e3)
            };
            writeln!(
                out,
                "| {} | {} | {} | {} | {:.0} |",
                problem.name,
                family.name(),
                milliseconds(0),
                milliseconds(1),
                found(1)
            )?;
        }
    }
    Ok(())
}

/// A million rows: what lockstep saves when the design lies in memory.
fn million(out: &mut impl Write, turns: usize) -> Result<(), Failure> {
    writeln!(out, "\nA million rows x 20: points in lockstep\n")?;
    writeln!(
        out,
        "| family | ms an evaluation, 1 | 8 together | 1 against 8 (quartiles) | at best |\n| --- | --- | --- | --- | --- |"
    )?;
    for family in Family::BOTH {
        let Study { model, .. } = study(&L.with_rows(1_000_000), family, SEED, Sampling::default())?;
        let points = points(&model, 8);
        let (mut one, mut eight) = ([0.0], [0.0; 8]);
        let pieces = vec![
            Piece::new(|| together(&model, &points[..model.dimension()], &mut one)),
            Piece::new(|| together(&model, &points, &mut eight)),
        ];
        let times = take_turns(pieces, turns, Clock::Thread);
        writeln!(
            out,
            "| {} | {:.2} | {:.2} | {} | {:.1} |",
            family.name(),
            times.seconds(0).median * 1e3,
            times.seconds(1).median / 8.0 * 1e3,
            scaled(&times, 1, 8.0),
            times.ratio_at_best(0, 1) * 8.0
        )?;
    }
    Ok(())
}
