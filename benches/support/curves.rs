//! Draws a curve of a scaling table as SVG: seconds of the whole program against what grows, both axes in logs.
//!
//! Drawn for a width of 80 mm, where a unit is a quarter of a millimetre and the smallest text 2.5 mm high.

#![allow(
    clippy::disallowed_methods,
    reason = "a picture is drawn to a tenth of a unit and nothing in it is hashed"
)]

use super::Failure;
use super::table::Table;
use std::fmt::Write;

/// One axis of growth.
#[derive(Debug, Clone, Copy)]
pub struct Axis {
    /// The value of the table's `axis` column.
    pub name: &'static str,
    /// What stands under the curve.
    pub label: &'static str,
}

/// The page in units, and the frame of the curves in it.
const WIDTH: f64 = 320.0;
const HEIGHT: f64 = 230.0;
const LEFT: f64 = 48.0;
const RIGHT: f64 = 262.0;
const TOP: f64 = 16.0;
const BOTTOM: f64 = 186.0;

/// A curve: the name beside it, its points, and how it is told from the other without colour.
struct Curve {
    name: String,
    points: Vec<(f64, f64)>,
}

/// Colours that stay apart for colour-blind readers and in grey, each with its own mark.
const INKS: [(&str, Mark); 2] = [("#0b5cad", Mark::Disc), ("#b34700", Mark::Square)];

#[derive(Debug, Clone, Copy)]
enum Mark {
    Disc,
    Square,
}

/// A span of values and where it lies on the page; both in logs.
struct Scale {
    low: f64,
    high: f64,
    from: f64,
    to: f64,
}

impl Scale {
    fn place(&self, value: f64) -> f64 {
        let share = (value.log10() - self.low) / (self.high - self.low);
        self.from + share * (self.to - self.from)
    }
}

/// The curves of one axis as SVG text.
///
/// # Errors
/// The table lacks a column, a cell is no number, or there is no point on this axis.
pub fn draw(table: &Table, axis: Axis) -> Result<String, Failure> {
    let curves = curves(table, axis)?;
    let all = || curves.iter().flat_map(|curve| &curve.points);
    let ticks_across: Vec<f64> = ticks_at(all().map(|point| point.0));
    let (left, right) = ends(all().map(|point| point.0)).ok_or("no point on this axis")?;
    let (least, most) = ends(all().map(|point| point.1)).ok_or("no point on this axis")?;
    let across = Scale {
        low: left.log10(),
        // A single value has no span: it stands at the left.
        high: if right > left {
            right.log10()
        } else {
            left.log10() + 1.0
        },
        from: LEFT + 10.0,
        to: RIGHT,
    };
    let up = Scale {
        low: least.log10().floor(),
        high: most.log10().ceil().max(least.log10().floor() + 1.0),
        from: BOTTOM,
        to: TOP,
    };
    let mut svg = format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"80mm\" viewBox=\"0 0 {WIDTH} {HEIGHT}\" role=\"img\" \
         font-family=\"sans-serif\" font-size=\"11\" fill=\"#222\">\n\
         <title>Seconds of the whole program against {}</title>\n\
         <rect width=\"{WIDTH}\" height=\"{HEIGHT}\" fill=\"#fff\"/>\n",
        axis.label
    );
    frame(&mut svg, &across, &up, &ticks_across, axis);
    for (curve, (ink, mark)) in curves.iter().zip(INKS) {
        line(&mut svg, curve, &across, &up, ink, mark);
    }
    names(&mut svg, &curves, &up);
    svg.push_str("</svg>\n");
    Ok(svg)
}

fn curves(table: &Table, axis: Axis) -> Result<Vec<Curve>, Failure> {
    let (of_axis, of_value) = (table.column("axis")?, table.column("value")?);
    let (of_family, of_seconds) = (table.column("family")?, table.column("seconds")?);
    let mut curves: Vec<Curve> = Vec::new();
    for row in table.rows().iter().filter(|row| row[of_axis] == axis.name) {
        let number = |place: usize| {
            let cell = row[place].parse::<f64>();
            cell.map_err(|_| format!("`{}` in the table is no number", row[place]))
        };
        let point = (number(of_value)?, number(of_seconds)?);
        match curves.iter_mut().find(|curve| curve.name == row[of_family]) {
            Some(curve) => curve.points.push(point),
            None => curves.push(Curve {
                name: row[of_family].clone(),
                points: vec![point],
            }),
        }
    }
    Ok(curves)
}

fn ends(values: impl Iterator<Item = f64>) -> Option<(f64, f64)> {
    values.fold(None, |ends, value| {
        let (low, high) = ends.unwrap_or((value, value));
        Some((value.min(low), value.max(high)))
    })
}

/// The values that occur, each once; the powers of ten alone where there are too many to read.
fn ticks_at(values: impl Iterator<Item = f64>) -> Vec<f64> {
    let mut values: Vec<f64> = values.collect();
    values.sort_by(f64::total_cmp);
    values.dedup();
    if values.len() > 5 {
        values.retain(|value| value.log10().fract().abs() < 1e-9);
    }
    values
}

fn frame(svg: &mut String, across: &Scale, up: &Scale, ticks_across: &[f64], axis: Axis) {
    let named: &[i32] = if up.high - up.low > 1.0 { &[1] } else { &[1, 2, 5] };
    // Writing into a string cannot fail, here and below.
    for decade in up.low as i32..=up.high as i32 {
        for step in 1..10 {
            let value = 10f64.powi(decade) * f64::from(step);
            let y = up.place(value);
            if y < TOP - 0.5 {
                break;
            }
            let (ink, width) = if step == 1 { ("#bbb", 0.7) } else { ("#e6e6e6", 0.4) };
            let _ = writeln!(
                svg,
                "<path d=\"M{LEFT} {y:.1}H{RIGHT}\" stroke=\"{ink}\" stroke-width=\"{width}\"/>"
            );
            if named.contains(&step) {
                let _ = writeln!(
                    svg,
                    "<text x=\"{}\" y=\"{:.1}\" text-anchor=\"end\">{}</text>",
                    LEFT - 5.0,
                    y + 4.0,
                    plain(value)
                );
            }
        }
    }
    let _ = writeln!(
        svg,
        "<path d=\"M{LEFT} {TOP}V{BOTTOM}H{RIGHT}\" fill=\"none\" stroke=\"#222\"/>"
    );
    for &value in ticks_across {
        let x = across.place(value);
        let _ = writeln!(
            svg,
            "<path d=\"M{x:.1} {BOTTOM}v4\" stroke=\"#222\"/>\
             <text x=\"{x:.1}\" y=\"{}\" text-anchor=\"middle\">{}</text>",
            BOTTOM + 15.0,
            plain(value)
        );
    }
    let middle = 0.5 * (TOP + BOTTOM);
    let _ = writeln!(
        svg,
        "<text x=\"{}\" y=\"{}\" text-anchor=\"middle\">{}</text>\
         <text transform=\"translate(11 {middle}) rotate(-90)\" text-anchor=\"middle\">seconds, whole program</text>",
        0.5 * (LEFT + RIGHT),
        HEIGHT - 8.0,
        axis.label
    );
}

fn line(svg: &mut String, curve: &Curve, across: &Scale, up: &Scale, ink: &str, mark: Mark) {
    let places: Vec<(f64, f64)> = curve
        .points
        .iter()
        .map(|(x, y)| (across.place(*x), up.place(*y)))
        .collect();
    let path: Vec<String> = places.iter().map(|(x, y)| format!("{x:.1} {y:.1}")).collect();
    let _ = writeln!(
        svg,
        "<path d=\"M{}\" fill=\"none\" stroke=\"{ink}\" stroke-width=\"1.6\"/>",
        path.join("L")
    );
    for (x, y) in places {
        let _ = match mark {
            Mark::Disc => writeln!(svg, "<circle cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"3\" fill=\"{ink}\"/>"),
            Mark::Square => writeln!(
                svg,
                "<rect x=\"{:.1}\" y=\"{:.1}\" width=\"5.4\" height=\"5.4\" fill=\"{ink}\"/>",
                x - 2.7,
                y - 2.7
            ),
        };
    }
}

/// The curves' names beside their ends, moved apart where those are close.
fn names(svg: &mut String, curves: &[Curve], up: &Scale) {
    let mut ends: Vec<(f64, usize)> = curves
        .iter()
        .enumerate()
        .filter_map(|(place, curve)| curve.points.last().map(|point| (up.place(point.1), place)))
        .collect();
    ends.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut above = f64::NEG_INFINITY;
    for (y, place) in ends {
        let y = y.max(above + 13.0);
        above = y;
        let _ = writeln!(
            svg,
            "<text x=\"{}\" y=\"{:.1}\" fill=\"{}\">{}</text>",
            RIGHT + 7.0,
            y + 4.0,
            INKS[place % INKS.len()].0,
            curves[place].name
        );
    }
}

/// A number as it is written on an axis: 0.01, 30, 100k, 1M.
fn plain(value: f64) -> String {
    if value >= 1e6 {
        format!("{}M", value / 1e6)
    } else if value >= 1e3 {
        format!("{}k", value / 1e3)
    } else if value < 1.0 {
        // One digit that is not 0: what the negative exponent left of an error is rounded away.
        format!("{value:.*}", (-value.log10() - 1e-9).ceil() as usize)
    } else {
        format!("{value}")
    }
}
