//! Why a refinement ended before its answer was as good as asked: data, and the sentence that a warning says.

use std::fmt;

use crate::extract::error_bar;
use crate::extract::level::Level;
use crate::extract::{Bars, ExtractError, ExtractOptions, Limit};
use crate::job::Accuracy;
use crate::net::ModelNet;
use crate::results::{CheckKind, CheckOutcome};

/// What is not as asked, and why no finer mesh mends it.
#[derive(Debug, Clone, PartialEq)]
pub struct Stop {
    /// What is not as asked on the finest mesh.
    pub unmet: Unmet,
    /// Why there is no finer mesh.
    pub cause: NoFiner,
}

/// What is not as asked.
#[derive(Debug, Clone, PartialEq)]
pub enum Unmet {
    /// A bar is wider than the target; this one is the widest.
    Bar {
        /// Row and column.
        nets: [String; 2],
        /// Bar over what the rule of accuracy measures it by.
        relative: f64,
        /// What it should be.
        target: f64,
    },
    /// Every bar fits the target, but a physical check fails; this one is the first.
    Check {
        /// Which.
        kind: CheckKind,
        /// Its defect, a ratio.
        value: f64,
        /// Largest defect that passes.
        threshold: f64,
    },
}

/// Why there is no mesh after a given one.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum NoFiner {
    /// It has too many panels.
    Room {
        /// Panels that it takes.
        panels: usize,
        /// Whether counting was given up at `panels`.
        at_least: bool,
        /// Panels that fit.
        fits: usize,
        /// What does not let more fit.
        limit: Limit,
    },
    /// The faces get no finer in any of the ways that there are.
    Faces {
        /// Panels of the finest mesh.
        panels: usize,
    },
}

impl NoFiner {
    /// The error when this stops the first level, which alone has no bar.
    pub(crate) fn after_one_level(self) -> ExtractError {
        match self {
            NoFiner::Room { panels, fits, .. } => {
                ExtractError::TooLarge { panels, needed: ExtractOptions::memory_of(panels), allowed: fits }
            }
            NoFiner::Faces { panels } => ExtractError::NotFiner { panels },
        }
    }
}

/// What is not as asked on a level; `None` when all is.
pub(crate) fn unmet(fine: &Level, bars: &Bars, accuracy: Accuracy, nets: &[ModelNet]) -> Option<Unmet> {
    let results = &fine.results;
    if !error_bar::meets(results, bars, accuracy) {
        let (i, j, relative) = error_bar::widest(results, bars, accuracy);
        let name = |k: usize| {
            let net = results.rows.get(k).and_then(|row| nets.get(row.idx()));
            net.map_or_else(String::new, |net| net.name.clone())
        };
        return Some(Unmet::Bar { nets: [name(i), name(j)], relative, target: accuracy.target });
    }
    let failed = results.checks.iter().find(|check| check.passed() == Some(false))?;
    match failed.outcome {
        CheckOutcome::Made { value, threshold } => Some(Unmet::Check { kind: failed.kind, value, threshold }),
        CheckOutcome::NotApplicable(_) => None,
    }
}

impl fmt::Display for Stop {
    /// What is not as asked, the cause, and what can be done.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}: {}; ", self.unmet, self.cause)?;
        match (&self.unmet, self.cause) {
            (Unmet::Bar { .. }, NoFiner::Room { limit, .. }) => {
                f.write_str("take a smaller `margin` or `window` in [region]")?;
                if limit == Limit::Memory {
                    f.write_str(", free memory")?;
                }
                f.write_str(", or ask for a wider `target` in [accuracy]")
            }
            (Unmet::Bar { .. }, NoFiner::Faces { .. }) => {
                f.write_str("ask for a wider `target` in [accuracy]")
            }
            (Unmet::Check { .. }, NoFiner::Room { .. }) => f.write_str(
                "do not rely on these numbers: take a smaller `margin` or `window` in [region], so that finer meshes fit, and see whether the check then passes",
            ),
            (Unmet::Check { .. }, NoFiner::Faces { .. }) => f.write_str(
                "do not rely on these numbers: see in `inspect` whether the layers and their permittivities are what you mean",
            ),
        }
    }
}

impl fmt::Display for Unmet {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Unmet::Bar { nets: [row, column], relative, target } => {
                let whose =
                    if row == column { format!("of `{row}`") } else { format!("of `{row}` with `{column}`") };
                write!(f, "the error bar {whose} is {}, the target {}", percent(*relative), percent(*target))
            }
            Unmet::Check { kind, value, threshold } => {
                let (value, threshold) = (percent(*value), percent(*threshold));
                write!(f, "the check `{kind}` fails at {value}, where {threshold} would pass")
            }
        }
    }
}

impl fmt::Display for NoFiner {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            NoFiner::Room { panels, at_least, fits, limit } => {
                let more = if *at_least { "more than " } else { "" };
                write!(f, "the next mesh takes {more}{panels} panels, and {fits} ")?;
                match limit {
                    Limit::Memory => f.write_str("fit into the memory"),
                    Limit::Panels => f.write_str("are the most that are solved"),
                }
            }
            NoFiner::Faces { panels } => write!(f, "the faces get no finer than {panels} panels"),
        }
    }
}

/// A ratio as per cent, two significant digits or all before the point.
fn percent(ratio: f64) -> String {
    let percent = 100.0 * ratio;
    let digits = [10.0, 1.0, 0.1, 0.01].iter().take_while(|step| percent.abs() < **step).count();
    let digits = if ratio.is_finite() { digits } else { 0 };
    format!("{percent:.digits$} %")
}

#[cfg(test)]
mod tests {
    use super::*;

    /// What: the sentence names what is not as asked, the cause with its numbers, and something to do.
    /// Seen to fail with: `fits` and `panels` swapped.
    #[test]
    fn a_stop_says_what_and_why_and_what_to_do() {
        let bar = Unmet::Bar { nets: ["A".to_owned(), "B".to_owned()], relative: 0.0731, target: 0.05 };
        let own = Unmet::Bar { nets: ["A".to_owned(), "A".to_owned()], relative: 0.00123, target: 0.001 };
        let check = Unmet::Check { kind: CheckKind::Neutrality, value: 0.4, threshold: 0.1 };
        let room = |limit, at_least| NoFiner::Room { panels: 240, at_least, fits: 120, limit };
        let faces = NoFiner::Faces { panels: 96 };
        for (unmet, cause, said) in [
            (
                bar.clone(),
                room(Limit::Memory, false),
                "the error bar of `A` with `B` is 7.3 %, the target 5.0 %: the next mesh takes 240 panels, and 120 fit into the memory; take a smaller `margin` or `window` in [region], free memory, or ask for a wider `target` in [accuracy]",
            ),
            (
                own,
                room(Limit::Panels, true),
                "the error bar of `A` is 0.12 %, the target 0.10 %: the next mesh takes more than 240 panels, and 120 are the most that are solved; take a smaller `margin` or `window` in [region], or ask for a wider `target` in [accuracy]",
            ),
            (
                bar,
                faces,
                "the error bar of `A` with `B` is 7.3 %, the target 5.0 %: the faces get no finer than 96 panels; ask for a wider `target` in [accuracy]",
            ),
            (
                check.clone(),
                room(Limit::Panels, false),
                "the check `neutrality` fails at 40 %, where 10 % would pass: the next mesh takes 240 panels, and 120 are the most that are solved; do not rely on these numbers: take a smaller `margin` or `window` in [region], so that finer meshes fit, and see whether the check then passes",
            ),
            (
                check,
                faces,
                "the check `neutrality` fails at 40 %, where 10 % would pass: the faces get no finer than 96 panels; do not rely on these numbers: see in `inspect` whether the layers and their permittivities are what you mean",
            ),
        ] {
            assert_eq!(Stop { unmet, cause }.to_string(), said);
        }
    }
}
