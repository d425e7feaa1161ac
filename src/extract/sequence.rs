//! The sequence of levels: refine until every bar fits, or say what stopped it.

use crate::diag::{Origin, Warning};
use crate::extract::adapt::Graded;
use crate::extract::border;
use crate::extract::error::ExtractError;
use crate::extract::error_bar::{self, OtherParts, Step};
use crate::extract::level::{self, Level};
use crate::extract::stop::{self, Stop};
use crate::extract::uniform;
use crate::extract::{Bars, ExtractOptions, MeshCount, Progress};
use crate::faces::Faces;
use crate::job::Accuracy;
use crate::mesh::Mesh;
use crate::results::Results;
use crate::solve::SolveInfo;

/// Models whose coarsest mesh has at most this many panels are refined all over. In larger ones most panels are what the
/// outlines need, far from where charge crowds, and only those are refined that the answer gains from.
const SMALL: usize = 3000;

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
    mesh: Mesh,
    accuracy: Accuracy,
    options: &ExtractOptions,
    warnings: &mut Vec<Warning>,
    progress: &(dyn Fn(Progress) + Sync),
) -> Result<Refinement, ExtractError> {
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
    let small = coarsest <= SMALL;
    let Start { mesh, first, border } = start(mesh, small, allowed, &solved)?;
    let mut density = options.density;
    let mut levels = vec![first];
    let mut grids = vec![Graded::first(mesh, density)];
    let bars_of = |levels: &[Level], grids: &[Graded]| {
        let steps: Vec<Step<'_>> =
            levels.iter().zip(grids).map(|(level, grid)| (&level.results, grid.gain)).collect();
        let moved = border.as_ref().map(|[whole, inner]| (&whole.results, &inner.results));
        let residual = levels.last().map_or(0.0, |level| level.charge.info.relative_residual);
        error_bar::bars(&steps, moved, OtherParts { chord: options.chord_share, residual })
    };
    let (bars, stopped) = loop {
        let bars = bars_of(&levels, &grids);
        let unmet = match levels.as_slice() {
            [.., _, fine] => stop::unmet(fine, &bars, accuracy, &faces.nets),
            _ => None,
        };
        if levels.len() >= 2 && unmet.is_none() {
            break (bars, None);
        }
        let (Some(grid), Some(level)) = (grids.last(), levels.last()) else { break (bars, None) };
        let next = if small {
            let n_before = grid.mesh.panels.len();
            uniform::finer(faces, (n_before, levels.len()), &mut density, options)?
                .map(|mesh| Graded::anew(mesh, density, n_before))
        } else {
            grid.refined(faces, &level.charge, options)?
        };
        match (next, unmet) {
            (Ok(finer), _) => grids.push(finer),
            (Err(cause), Some(unmet)) => break (bars, Some(Stop { unmet, cause })),
            (Err(cause), None) => return Err(cause.after_one_level()),
        }
        let number = levels.len() + 1;
        levels.extend(grids.last().map(|grid| solved(&grid.mesh, number)).transpose()?);
    };
    warnings.extend(stopped.iter().map(|stop| Warning::new(stop.to_string(), Origin::default())));
    // In a large model the first level is the whole mesh of the border.
    let once_more = border.iter().flatten().skip(usize::from(!small));
    let seconds = sum_seconds(levels.iter().chain(once_more));
    let n_levels = levels.len();
    let finest = levels.swap_remove(n_levels - 1);
    Ok(Refinement {
        results: finest.results,
        bars,
        count: MeshCount { levels: n_levels, ..finest.count },
        info: finest.charge.info,
        stopped,
        seconds,
    })
}

/// The first level, and the two solves that show what the border does.
struct Start {
    mesh: Mesh,
    first: Level,
    /// With all panels and without those beyond the moved border.
    border: Option<[Level; 2]>,
}

/// Solves what a refinement of `mesh` begins with. A large model begins with the mesh that is cut at the moved border, which
/// saves a solve; a small one keeps the coarsest, so that its next level is finer all over.
fn start(
    mesh: Mesh,
    small: bool,
    allowed: usize,
    solved: &impl Fn(&Mesh, usize) -> Result<Level, ExtractError>,
) -> Result<Start, ExtractError> {
    let Some([whole, inner]) = border::whole_and_inner(&mesh) else {
        let first = solved(&mesh, 1)?;
        return Ok(Start { mesh, first, border: None });
    };
    let panels = whole.panels.len();
    if panels > allowed {
        return Err(ExtractError::TooLarge { panels, needed: ExtractOptions::memory_of(panels), allowed });
    }
    let border = [solved(&whole, 1)?, solved(&inner, 1)?];
    Ok(if small {
        Start { first: solved(&mesh, 1)?, mesh, border: Some(border) }
    } else {
        Start { mesh: whole, first: border[0].clone(), border: Some(border) }
    })
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
