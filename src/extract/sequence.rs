//! The sequence of levels: refine until every bar fits, or say what stopped it.

use crate::diag::{Origin, Warning};
use crate::extract::error::ExtractError;
use crate::extract::error_bar::{self, OtherParts, Step};
use crate::extract::level::{self, Level};
use crate::extract::{Bars, ExtractOptions, MeshCount, Progress};
use crate::faces::Faces;
use crate::job::Accuracy;
use crate::mesh::Mesh;
use crate::results::Results;
use crate::solve::SolveInfo;

/// Density ratio of neighbouring levels: doubles the panels, whose number grows as the square of the density.
const DENSITY_RATIO: f64 = std::f64::consts::SQRT_2;
/// A level must have at least this many times the panels of the one before to say anything about convergence.
const LEAST_GROWTH: f64 = 1.3;
/// Densities tried for one level before the faces are taken to be as fine as grading makes them.
const MOST_TRIES: usize = 4;

/// The finest level of a sequence, with its bars.
#[derive(Debug, Clone)]
pub struct Refinement {
    /// What the finest mesh says.
    pub results: Results,
    /// Half-widths of the error bars of those values.
    pub bars: Bars,
    /// Panels of the finest mesh, and how many meshes were solved.
    pub count: MeshCount,
    /// How well the finest mesh was solved.
    pub info: SolveInfo,
    /// Whether every bar met the target.
    pub target_met: bool,
    /// Stage and seconds, summed over every solve.
    pub seconds: Vec<(String, f64)>,
}

/// Solves faces level after level until the bars fit `accuracy` and the physical checks hold, or no finer mesh fits `options`. What stopped it
/// is appended to `warnings`.
///
/// # Errors
/// [`ExtractError::TooLarge`] when fewer than two levels fit; otherwise what the stages report.
pub fn refine(
    faces: &Faces,
    accuracy: Accuracy,
    options: &ExtractOptions,
    warnings: &mut Vec<Warning>,
    progress: &(dyn Fn(Progress) + Sync),
) -> Result<Refinement, ExtractError> {
    let coarsest = level::panelize(faces, options.density, options.most_panels(), warnings)?;
    refine_from(faces, coarsest, accuracy, options, warnings, progress)
}

/// As [`refine`], with the coarsest mesh at hand.
pub(crate) fn refine_from(
    faces: &Faces,
    mut mesh: Mesh,
    accuracy: Accuracy,
    options: &ExtractOptions,
    warnings: &mut Vec<Warning>,
    progress: &(dyn Fn(Progress) + Sync),
) -> Result<Refinement, ExtractError> {
    let allowed = options.panels_that_fit();
    let mut density = options.density;
    let coarsest = mesh.panels.len();
    let too_large = || ExtractError::TooLarge {
        panels: 2 * coarsest,
        needed: ExtractOptions::memory_of(2 * coarsest),
        allowed,
    };
    if coarsest > allowed {
        return Err(too_large());
    }
    let solved = |mesh: &Mesh, number| {
        let mut level = level::solve(mesh, number, progress)?;
        level.allow(accuracy);
        Ok::<Level, ExtractError>(level)
    };
    let mut levels = vec![solved(&mesh, 1)?];
    let inner = inner_part(&mesh).map(|inner| solved(&inner, 1)).transpose()?;
    let bars_of = |levels: &[Level]| {
        let steps: Vec<Step<'_>> = levels.iter().map(|level| (&level.results, level.count.panels)).collect();
        let moved = inner.as_ref().map(|inner| (&levels[0].results, &inner.results));
        let residual = levels.last().map_or(0.0, |level| level.info.relative_residual);
        error_bar::bars(&steps, moved, OtherParts { chord: options.chord_share, residual })
    };
    let (bars, target_met) = loop {
        let bars = bars_of(&levels);
        let good = |fine: &Level| fine.checks_hold() && error_bar::meets(&fine.results, &bars, accuracy);
        if levels.len() >= 2 && levels.last().is_some_and(good) {
            break (bars, true);
        }
        let before = (mesh.panels.len(), levels.len());
        let Some(finer) = finer(faces, before, &mut density, options)? else {
            break (bars, false);
        };
        mesh = finer;
        levels.push(solved(&mesh, levels.len() + 1)?);
    };
    if levels.len() < 2 {
        return Err(too_large());
    }
    if !target_met {
        let text = format!(
            "the error bars did not reach the target of {} %: {allowed} panels fit into the memory or the limit given; ask for less accuracy, model a smaller region, or allow more panels",
            100.0 * accuracy.target
        );
        warnings.push(Warning::new(text, Origin::default()));
    }
    let seconds = sum_seconds(levels.iter().chain(&inner));
    let n_levels = levels.len();
    let finest = levels.swap_remove(n_levels - 1);
    Ok(Refinement {
        results: finest.results,
        bars,
        count: MeshCount { levels: n_levels, ..finest.count },
        info: finest.info,
        target_met,
        seconds,
    })
}

/// The mesh after one of `n_panels` panels at this level, with at least [`LEAST_GROWTH`] times as many; `None` when it
/// would not fit, or when the faces do not get finer.
fn finer(
    faces: &Faces,
    (n_panels, level): (usize, usize),
    density: &mut f64,
    options: &ExtractOptions,
) -> Result<Option<Mesh>, ExtractError> {
    let fits = |mesh: &Mesh| mesh.panels.len() <= options.panels_that_fit();
    #[expect(clippy::cast_precision_loss, reason = "panel counts are far below 2^53")]
    let grown = |mesh: &Mesh| mesh.panels.len() as f64 >= LEAST_GROWTH * n_panels as f64;
    let mut tried = *density;
    let mut ungrown = Vec::with_capacity(MOST_TRIES);
    for _ in 0..MOST_TRIES {
        tried *= DENSITY_RATIO;
        let mesh = match level::panelize(faces, tried, options.most_panels(), &mut Vec::new()) {
            Err(ExtractError::Mesh(crate::mesh::MeshError::TooMany { .. })) => return Ok(None),
            other => other?,
        };
        if !fits(&mesh) {
            return Ok(None);
        }
        if grown(&mesh) {
            *density = tried;
            return Ok(Some(mesh));
        }
        ungrown.push((tried, mesh));
    }
    // A model of smooth faces only has nothing that grading could refine.
    for (tried, mesh) in ungrown {
        let mesh = level::halve_smooth(mesh, faces, level);
        if !fits(&mesh) {
            return Ok(None);
        }
        if grown(&mesh) {
            *density = tried;
            return Ok(Some(mesh));
        }
    }
    Ok(None)
}

/// The mesh without what lies beyond the border moved in by [`error_bar::BORDER_MOVE`]; `None` when nothing is
/// truncated.
pub(crate) fn inner_part(mesh: &Mesh) -> Option<Mesh> {
    let truncation = mesh.truncation?;
    let inside = |x: f64, axis: usize| {
        let moved = (truncation.extent[axis] / error_bar::BORDER_MOVE).max(truncation.copper[axis]);
        (x - truncation.centre[axis]).abs() <= moved
    };
    let mut inner = mesh.clone();
    inner.panels.retain(|panel| {
        let centre = panel.shape.centroid();
        inside(centre.x, 0) && inside(centre.y, 1)
    });
    Some(inner)
}

fn sum_seconds<'a>(levels: impl Iterator<Item = &'a Level>) -> Vec<(String, f64)> {
    let mut sums: Vec<(String, f64)> = Vec::new();
    for (stage, seconds) in levels.flat_map(|level| &level.seconds) {
        match sums.iter_mut().find(|(name, _)| name == stage) {
            Some((_, sum)) => *sum += seconds,
            None => sums.push(((*stage).to_owned(), *seconds)),
        }
    }
    sums
}
