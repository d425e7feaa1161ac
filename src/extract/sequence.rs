//! The sequence of levels: refine until every bar fits, or say what stopped it.

use crate::diag::{Origin, Warning};
use crate::extract::error::ExtractError;
use crate::extract::error_bar::{self, OtherParts, Step};
use crate::extract::level::{self, Level};
use crate::extract::stop::{self, NoFiner, Stop};
use crate::extract::{Bars, ExtractOptions, MeshCount, Progress};
use crate::faces::Faces;
use crate::job::Accuracy;
use crate::mesh::{Mesh, MeshError};
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
    /// What stopped it before every bar met the target and every check passed; `None` when all is well.
    pub stopped: Option<Stop>,
    /// Stage and seconds, summed over every solve.
    pub seconds: Vec<(String, f64)>,
}

/// Solves faces level after level until the bars fit `accuracy` and the physical checks hold, or no finer mesh fits `options`. What stopped it
/// is appended to `warnings`.
///
/// # Errors
/// [`ExtractError::TooLarge`] when fewer than two levels fit, [`ExtractError::NotFiner`] when the faces give one only;
/// otherwise what the stages report.
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
    let mut density = options.density;
    let (coarsest, allowed) = (mesh.panels.len(), options.panels_that_fit());
    if coarsest > allowed {
        let needed = ExtractOptions::memory_of(2 * coarsest);
        return Err(ExtractError::TooLarge { panels: 2 * coarsest, needed, allowed });
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
    let (bars, stopped) = loop {
        let bars = bars_of(&levels);
        let unmet = match levels.as_slice() {
            [.., _, fine] => stop::unmet(fine, &bars, accuracy, &faces.nets),
            _ => None,
        };
        if levels.len() >= 2 && unmet.is_none() {
            break (bars, None);
        }
        let before = (mesh.panels.len(), levels.len());
        match (finer(faces, before, &mut density, options)?, unmet) {
            (Ok(finer), _) => mesh = finer,
            (Err(cause), Some(unmet)) => break (bars, Some(Stop { unmet, cause })),
            (Err(cause), None) => return Err(cause.after_one_level()),
        }
        levels.push(solved(&mesh, levels.len() + 1)?);
    };
    warnings.extend(stopped.iter().map(|stop| Warning::new(stop.to_string(), Origin::default())));
    let seconds = sum_seconds(levels.iter().chain(&inner));
    let n_levels = levels.len();
    let finest = levels.swap_remove(n_levels - 1);
    Ok(Refinement {
        results: finest.results,
        bars,
        count: MeshCount { levels: n_levels, ..finest.count },
        info: finest.info,
        stopped,
        seconds,
    })
}

/// The mesh after one of `n_panels` panels at this level, with at least [`LEAST_GROWTH`] times as many, or why there is
/// none.
fn finer(
    faces: &Faces,
    (n_panels, level): (usize, usize),
    density: &mut f64,
    options: &ExtractOptions,
) -> Result<Result<Mesh, NoFiner>, ExtractError> {
    let (fits, limit) = (options.panels_that_fit(), options.limit());
    let no_room = |panels, at_least| Ok(Err(NoFiner::Room { panels, at_least, fits, limit }));
    #[expect(clippy::cast_precision_loss, reason = "panel counts are far below 2^53")]
    let grown = |mesh: &Mesh| mesh.panels.len() as f64 >= LEAST_GROWTH * n_panels as f64;
    let mut tried = *density;
    let mut ungrown = Vec::with_capacity(MOST_TRIES);
    for _ in 0..MOST_TRIES {
        tried *= DENSITY_RATIO;
        let mesh = match level::panelize(faces, tried, options.most_panels(), &mut Vec::new()) {
            Err(ExtractError::Mesh(MeshError::TooMany { needed, at_least, .. })) => {
                return no_room(needed, at_least);
            }
            // Denser than a mesh may be.
            Err(ExtractError::Mesh(MeshError::BadDensity { .. })) => break,
            other => other?,
        };
        if mesh.panels.len() > fits {
            return no_room(mesh.panels.len(), false);
        }
        if grown(&mesh) {
            *density = tried;
            return Ok(Ok(mesh));
        }
        ungrown.push((tried, mesh));
    }
    // A model of smooth faces only has nothing that grading could refine.
    for (tried, mesh) in ungrown {
        let mesh = level::halve_smooth(mesh, faces, level);
        if mesh.panels.len() > fits {
            return no_room(mesh.panels.len(), false);
        }
        if grown(&mesh) {
            *density = tried;
            return Ok(Ok(mesh));
        }
    }
    Ok(Err(NoFiner::Faces { panels: n_panels }))
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
