//! The quadrature over the scatter: at which values of it the posterior is looked at.
//!
//! Where all of the mass is in one hump well above 0, as in most studies of many rows, evenly spaced
//! nodes one standard deviation apart are enough: for a normal density their sum is right to 5e-9,
//! and for any smooth one almost as good (Trefethen & Weideman 2014, SIAM Review 56, 385-458).
//! Elsewhere Gauss-Legendre panels follow the profile's grid and its peaks.

use super::newton::{ClimbFailed, NODE, Surface};
use super::profile::{NEGLIGIBLE, Profile, Section, section, section_near};
use super::watch::Watch;
use crate::numeric::{exp, legendre};

/// Sections at the nodes, each with its weight.
///
/// # Errors
/// [`ClimbFailed`] where the coefficients have no mode at some scatter, or the watcher asks to stop.
pub fn nodes(surface: Surface, profile: &Profile, watch: &dyn Watch) -> Result<Vec<(Section, f64)>, ClimbFailed> {
    match evenly_spaced(surface, profile, watch)? {
        Some(nodes) => Ok(nodes),
        None => in_panels(surface, profile, watch),
    }
}

/// Evenly spaced nodes end where the mass is this far below the peak's, on the log scale.
const END: f64 = 22.0;
/// And a normal density has ended after seven of them.
const MOST_TO_A_SIDE: usize = 10;

/// Nodes one standard deviation apart about the one peak; `None` where they would not do.
fn evenly_spaced(
    surface: Surface,
    profile: &Profile,
    watch: &dyn Watch,
) -> Result<Option<Vec<(Section, f64)>>, ClimbFailed> {
    let all = || profile.grid.iter().chain(&profile.peaks);
    let top = all().map(|s| s.log_mass).fold(f64::NEG_INFINITY, f64::max);
    let mut peaks = profile.peaks.iter().filter(|peak| peak.log_mass > top - NEGLIGIBLE);
    let (Some(peak), None) = (peaks.next(), peaks.next()) else {
        return Ok(None);
    };
    if peak.scatter <= 0.0 || peak.curvature >= 0.0 {
        return Ok(None);
    }
    let step = 1.0 / (-peak.curvature).sqrt();
    let Some(below) = to_a_side(surface, peak, -step, watch)? else {
        return Ok(None);
    };
    let Some(above) = to_a_side(surface, peak, step, watch)? else {
        return Ok(None);
    };
    let sections: Vec<Section> = below.into_iter().rev().chain([peak.clone()]).chain(above).collect();
    Ok(enough(&sections).then(|| sections.into_iter().map(|section| (section, step)).collect()))
}

/// The nodes on one side of the peak, the nearest first; `None` where the mass does not end in time.
fn to_a_side(
    surface: Surface,
    peak: &Section,
    step: f64,
    watch: &dyn Watch,
) -> Result<Option<Vec<Section>>, ClimbFailed> {
    let mut nodes: Vec<Section> = Vec::new();
    for k in 1..=MOST_TO_A_SIDE {
        if watch.stop_asked() {
            return Err(ClimbFailed::Stopped);
        }
        let scatter = peak.scatter + step * k as f64;
        if scatter <= 0.0 {
            return Ok(None);
        }
        let (last, before) = match nodes.as_slice() {
            [] => (peak, None),
            [only] => (only, Some(peak)),
            [.., before, last] => (last, Some(before)),
        };
        // Where the bent line leads out of the region of density above 0, panels find another way.
        let Ok(next) = section(surface, scatter, &last.ahead(scatter, before), NODE) else {
            return Ok(None);
        };
        let over = next.log_mass < peak.log_mass - END;
        nodes.push(next);
        if over {
            return Ok(Some(nodes));
        }
    }
    Ok(None)
}

/// Whether evenly spaced nodes are close enough: whether every second of them would almost do. For a
/// normal density these are 1.4 % off in the mass and 14 % in the variance, and the error falls with
/// the fourth power or faster when nodes are twice as many: mean and standard deviation are then right
/// to a few millionths of the standard deviation.
fn enough(sections: &[Section]) -> bool {
    let top = sections.iter().map(|s| s.log_mass).fold(f64::NEG_INFINITY, f64::max);
    let moments = |every: usize| {
        let taken = || {
            sections
                .iter()
                .step_by(every)
                .map(|s| (s.scatter, exp(s.log_mass - top)))
        };
        let mass: f64 = taken().map(|(_, mass)| mass).sum();
        let mean = taken().map(|(c, mass)| c * mass).sum::<f64>() / mass;
        let variance = taken().map(|(c, mass)| (c - mean) * (c - mean) * mass).sum::<f64>() / mass;
        (mass * every as f64, mean, variance)
    };
    let ((mass, mean, variance), (rough_mass, rough_mean, rough_variance)) = (moments(1), moments(2));
    (rough_mass / mass - 1.0).abs() < 0.04
        && (rough_mean - mean).abs() < 0.05 * variance.sqrt()
        && (rough_variance / variance - 1.0).abs() < 0.25
}

/// Edges of the quadrature's panels around a peak, in its widths.
const EDGES: [f64; 9] = [-9.0, -5.0, -2.5, -1.0, 0.0, 1.0, 2.5, 5.0, 9.0];

/// Nodes in panels, for a profile of any shape.
///
/// Panels end at the places of the grid, which is fine enough where the posterior runs into 0, and
/// around each peak inside at multiples of its width, since it may be narrower than the grid. They
/// reach from the last place of the grid without mass below to the first above.
fn in_panels(surface: Surface, profile: &Profile, watch: &dyn Watch) -> Result<Vec<(Section, f64)>, ClimbFailed> {
    let known = || profile.grid.iter().chain(&profile.peaks);
    let top = known()
        .map(|section| section.log_mass)
        .fold(f64::NEG_INFINITY, f64::max);
    let matters = |section: &&Section| section.log_mass > top - NEGLIGIBLE;
    let lowest = known().filter(matters).map(|s| s.scatter).fold(f64::INFINITY, f64::min);
    let highest = known().filter(matters).map(|s| s.scatter).fold(0.0, f64::max);
    let places = || profile.grid.iter().map(|section| section.scatter);
    let from = places().filter(|place| *place < lowest).fold(0.0, f64::max);
    let to = places().filter(|place| *place > highest).fold(f64::INFINITY, f64::min);
    let to = if to.is_finite() { to } else { highest };
    let mut edges: Vec<f64> = places().filter(|place| (from..=to).contains(place)).collect();
    for peak in profile.peaks.iter().filter(matters).filter(|peak| peak.curvature < 0.0) {
        let width = 1.0 / (-peak.curvature).sqrt();
        edges.extend(EDGES.iter().map(|t| (peak.scatter + t * width).clamp(from, to)));
    }
    edges.sort_by(f64::total_cmp);
    // Edges of two peaks may fall together: a panel a millionth of its place wide says nothing.
    edges.dedup_by(|b, a| *b - *a <= 1e-6 * *b);
    let mut nodes: Vec<(Section, f64)> = Vec::new();
    for pair in edges.windows(2) {
        if watch.stop_asked() {
            return Err(ClimbFailed::Stopped);
        }
        for (scatter, weight) in legendre(pair[0], pair[1]) {
            let nearest = nodes.last().map_or(&profile.grid[0], |(section, _)| section);
            let nearest = closest(profile, nearest, scatter);
            nodes.push((section_near(surface, nearest, scatter, NODE)?, weight));
        }
    }
    Ok(nodes)
}

/// The known section closest to a scatter: the last one, or one of the profile.
fn closest<'a>(profile: &'a Profile, last: &'a Section, scatter: f64) -> &'a Section {
    let far = |section: &Section| (section.scatter - scatter).abs();
    let known = profile.grid.iter().chain(&profile.peaks);
    known.fold(
        last,
        |best, section| if far(section) < far(best) { section } else { best },
    )
}

#[cfg(test)]
mod tests {
    use super::super::profile::profile;
    use super::super::watch::Unwatched;
    use super::*;
    use crate::design::Design;
    use crate::model::{BaselinePrior, Model, NormalPrior, ScatterPrior};
    use crate::numeric::{Purpose, Stream};

    /// Mean and standard deviation of the scatter.
    fn moments(nodes: &[(Section, f64)]) -> (f64, f64) {
        let top = nodes.iter().map(|(s, _)| s.log_mass).fold(f64::NEG_INFINITY, f64::max);
        let mass = || nodes.iter().map(|(s, w)| (s.scatter, w * exp(s.log_mass - top)));
        let total: f64 = mass().map(|(_, m)| m).sum();
        let mean = mass().map(|(c, m)| c * m).sum::<f64>() / total;
        let variance = mass().map(|(c, m)| (c - mean) * (c - mean) * m).sum::<f64>() / total;
        (mean, variance.sqrt())
    }

    #[test]
    fn evenly_spaced_nodes_give_the_moments_that_panels_give() {
        let mut taken = 0;
        for seed in 0..40 {
            let mut stream = Stream::new(seed, Purpose::Simulation, 5);
            let rows = [60, 150, 400, 1_500][seed as usize % 4];
            let scatter = [0.3, 0.6, 1.0, 2.0, 0.1][seed as usize % 5];
            let square: f64 = scatter * scatter;
            let column: Vec<f64> = (0..rows).map(|_| stream.normal()).collect();
            let counts = column
                .iter()
                .map(|x| {
                    let factor = square * stream.gamma(1.0 / square);
                    stream.poisson(exp(1.5 + 0.3 * x) * factor)
                })
                .collect();
            let design = Design::of_columns(vec![column], vec![1.0; rows], counts);
            let baseline = BaselinePrior::Range(NormalPrior { mean: 1.5, sd: 1.5 });
            let terms = vec![NormalPrior { mean: 0.0, sd: 1.0 }];
            let model = Model::with_priors(&design, baseline, terms, Some(ScatterPrior { rate: 3.0 }));
            let surface = Surface {
                model: &model,
                threads: 1,
            };
            let profile = profile(surface, &Unwatched).unwrap();
            let panels = moments(&in_panels(surface, &profile, &Unwatched).unwrap());
            let Some(nodes) = evenly_spaced(surface, &profile, &Unwatched).unwrap() else {
                continue;
            };
            taken += 1;
            let (mean, sd) = moments(&nodes);
            let error = ((mean - panels.0) / panels.1).abs().max((sd / panels.1 - 1.0).abs());
            assert!(error < 1e-5, "seed {seed}: {error:e}");
        }
        assert!(taken >= 15, "{taken}");
    }
}
