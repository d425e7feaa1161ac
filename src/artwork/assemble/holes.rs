//! Drill files and drill layers to holes: outline, span, plating, and digits that the file does not declare.

use super::Stage;
use crate::artwork::ArtworkOptions;
use crate::artwork::connect::DraftHole;
use crate::artwork::curve::{Pen, Xy, round, snap};
use crate::artwork::drill::{self, Digits, DrillError, DrillFile};
use crate::artwork::error::{ArtworkError, Problem};
use crate::artwork::gerber::image;
use crate::artwork::layer_role::{self, DrillRole};
use crate::diag::Origin;
use crate::geom::region::{Bounds, Contour, Fill, Point, Region};
use crate::job::{DrillPlan, HoleMeaning, LayerId};

/// Holes of one file, before their outlines are made.
pub(super) struct DrillSource {
    pub(super) file: usize,
    pub(super) role: DrillRole,
    pub(super) plan: DrillPlan,
    pub(super) holes: HoleSource,
}

pub(super) enum HoleSource {
    Drill(Box<DrillFile>),
    Gerber(Vec<image::Object>),
}

impl Stage<'_> {
    /// Outlines, spans and plating of all holes, once the copper is known.
    pub(super) fn drill(&mut self) {
        for source in std::mem::take(&mut self.drills) {
            let Some((from, to)) = self.span(&source) else { continue };
            let file = source.file;
            let holes = match source.holes {
                HoleSource::Drill(ref read) => self.drill_holes(file, read),
                HoleSource::Gerber(ref objects) => self.gerber_holes(file, objects),
            };
            let plan = &source.plan;
            for mut hole in holes {
                let plated = plan.plated.or(source.role.plated);
                let plated = if plan.removes_metal { Some(false) } else { plated.or(hole.plated) };
                if let HoleMeaning::Finished { plating } = plan.hole
                    && plated != Some(false)
                {
                    hole.widen(2.0 * plating);
                }
                let Some(region) = hole.region(self.options) else { continue };
                let (at, diameter) = (round(hole.path[0]), hole.diameter);
                let origin = hole.origin;
                self.draft.holes.push(DraftHole { region, at, diameter, from, to, plated, origin });
            }
        }
    }

    /// From which conductor to which, by the job, then the file, else all of them.
    fn span(&mut self, source: &DrillSource) -> Option<(LayerId, LayerId)> {
        let mut ends = [self.stackup.conductors().next()?, self.stackup.conductors().next_back()?];
        if let Some((from, to)) = source.role.span {
            for (end, number) in ends.iter_mut().zip([from, to]) {
                match layer_role::conductor(self.stackup, number) {
                    Some(layer) => *end = layer,
                    None => {
                        let known = self.stackup.conductors().count();
                        let file = self.files[source.file].name.clone();
                        self.fail(source.file, Problem::LayerNumber { file, number, known });
                        return None;
                    }
                }
            }
        }
        for (end, named) in ends.iter_mut().zip([&source.plan.from, &source.plan.to]) {
            let Some(named) = named else { continue };
            let Some(layer) = self.stackup.find(&named.name) else {
                let known = self.stackup.layers.iter().map(|l| l.name.clone()).collect();
                let problem =
                    Problem::UnknownLayer { name: named.name.clone(), known, span: named.origin.span };
                self.errors.push(ArtworkError::at(named.origin, problem));
                return None;
            };
            *end = layer;
        }
        Some((ends[0].min(ends[1]), ends[0].max(ends[1])))
    }

    fn drill_holes(&mut self, file: usize, read: &DrillFile) -> Vec<RawHole> {
        let id = self.files[file].file;
        let settled = match read.undeclared {
            None => None,
            Some(span) => match self.settle_digits(file) {
                Ok(read) => Some(read),
                Err(found) => {
                    self.fail(file, Problem::from(DrillError::Digits { found, span }));
                    return Vec::new();
                }
            },
        };
        let read = settled.as_ref().unwrap_or(read);
        let hole = |hit: &drill::Hit| RawHole {
            path: hit.path.clone(),
            diameter: hit.diameter,
            contours: None,
            grown: 0.0,
            plated: hit.plated,
            origin: Origin::new(id, hit.span),
        };
        read.hits.iter().map(hole).collect()
    }

    /// Reads a file of undeclared digits in every customary way and keeps the one whose holes lie on the artwork.
    fn settle_digits(&mut self, file: usize) -> Result<DrillFile, String> {
        let Some(bounds) = self.artwork_bounds() else {
            return Err("there is no copper to compare with".to_owned());
        };
        let mut fitting: Vec<(Digits, DrillFile)> = Vec::new();
        let mut tried = Vec::new();
        for (integer, decimal) in [(3, 3), (2, 4), (4, 2), (4, 4), (3, 2), (2, 3), (2, 5), (4, 3)] {
            for trailing_omitted in [false, true] {
                let digits = Digits { integer, decimal, trailing_omitted };
                let bytes = &self.files[file].bytes;
                let Ok(read) = drill::read(bytes, self.options.grid, self.options.chord_error, Some(digits))
                else {
                    continue;
                };
                let on = self.share_on_copper(&read, &bounds);
                // Nearly every hole of a board goes through a pad; a wrong factor of ten puts hardly any on one.
                if on < 0.8 {
                    continue;
                }
                if fitting.iter().any(|(_, other)| other.hits == read.hits) {
                    continue;
                }
                tried.push(format!("{integer}.{decimal}"));
                fitting.push((digits, read));
            }
        }
        match fitting.pop() {
            None => Err("no customary format puts the holes on the copper".to_owned()),
            Some((digits, read)) if fitting.is_empty() => {
                let text = format!(
                    "`{}` does not declare its digits; read as {}.{} with {} zeros kept, which puts the holes on the copper",
                    self.files[file].name,
                    digits.integer,
                    digits.decimal,
                    if digits.trailing_omitted { "leading" } else { "trailing" }
                );
                self.warn(file, text);
                Ok(read)
            }
            Some(_) => Err(format!("{} fit alike", tried.join(" and "))),
        }
    }

    fn artwork_bounds(&self) -> Option<Bounds> {
        let mut all = self.draft.copper.iter().filter_map(|c| c.region.bounds());
        let first = all.next()?;
        Some(all.fold(first, |a, b| Bounds {
            lo: Point::new(a.lo.x.min(b.lo.x), a.lo.y.min(b.lo.y)),
            hi: Point::new(a.hi.x.max(b.hi.x), a.hi.y.max(b.hi.y)),
        }))
    }

    /// Share of the first 60 holes whose edge lies on copper.
    fn share_on_copper(&self, read: &DrillFile, bounds: &Bounds) -> f64 {
        let some: Vec<&drill::Hit> = read.hits.iter().take(60).collect();
        let on = some.iter().filter(|hit| {
            let at = round(hit.path[0]);
            // A little outside the hole, since some writers leave its inside free of copper.
            let reach = self.options.grid.snap(hit.diameter * 0.55).unwrap_or(0);
            let inside = Bounds { lo: at, hi: at }.meets(bounds);
            inside
                && self.draft.copper.iter().any(|c| {
                    c.region.contains(Point::new(at.x + reach, at.y))
                        || c.region.contains(Point::new(at.x, at.y + reach))
                })
        });
        #[expect(clippy::cast_precision_loss, reason = "at most 60")]
        {
            on.count() as f64 / some.len().max(1) as f64
        }
    }

    fn gerber_holes(&mut self, file: usize, objects: &[image::Object]) -> Vec<RawHole> {
        let id = self.files[file].file;
        let step = self.options.grid.step();
        #[expect(clippy::cast_precision_loss, reason = "coordinates are far below 2^53 steps")]
        let xy = |p: &Point| -> Xy { [p.x as f64, p.y as f64] };
        let mut holes = Vec::new();
        for object in objects.iter().filter(|o| o.dark) {
            let (path, diameter, contours) = match &object.kind {
                image::Kind::Flash { at, diameter: Some(d) } => (vec![xy(at)], *d, None),
                image::Kind::Line { from, to, width } => (vec![xy(from), xy(to)], *width, None),
                image::Kind::Arc { path, width } => (path.iter().map(xy).collect(), *width, None),
                image::Kind::Flash { .. } | image::Kind::Region => {
                    let Some(b) = image::bounds_of(&object.contours) else { continue };
                    let mid = Point::new(i64::midpoint(b.lo.x, b.hi.x), i64::midpoint(b.lo.y, b.hi.y));
                    #[expect(clippy::cast_precision_loss, reason = "far below 2^53 steps")]
                    let width = (b.hi.x - b.lo.x).min(b.hi.y - b.lo.y) as f64;
                    (vec![xy(&mid)], width, Some(object.contours.clone()))
                }
            };
            let origin = Origin::new(id, object.span);
            holes.push(RawHole {
                path,
                diameter: diameter * step,
                contours,
                grown: 0.0,
                plated: None,
                origin,
            });
        }
        holes
    }
}

/// A hole as its file gives it.
struct RawHole {
    path: Vec<Xy>,
    diameter: f64,
    contours: Option<Vec<Contour>>,
    /// By how much it is wider than `contours`, m.
    grown: f64,
    plated: Option<bool>,
    origin: Origin,
}

impl RawHole {
    fn widen(&mut self, by: f64) {
        self.diameter += by;
        self.grown += by;
    }

    /// Its outline; `None` for a tool of no size.
    fn region(&self, options: &ArtworkOptions) -> Option<Region> {
        let step = options.grid.step();
        if let Some(contours) = &self.contours {
            let drawn = Region::from_contours(contours, Fill::NonZero);
            if self.grown / step < 2.0 {
                return Some(drawn);
            }
            let pen = Pen::new(self.grown / 2.0 / step, options.chord_error / step);
            #[expect(clippy::cast_precision_loss, reason = "coordinates are far below 2^53 steps")]
            let xy = |p: &Point| -> Xy { [p.x as f64, p.y as f64] };
            let rim = contours.iter().flat_map(|ring| ring.iter().zip(ring.iter().cycle().skip(1)));
            let rim: Vec<_> = rim.map(|(a, b)| snap(&pen.stroke(xy(a), xy(b)))).collect();
            return Some(drawn.union(&Region::from_contours(&rim, Fill::NonZero)));
        }
        if self.diameter / step < 1.0 {
            return None;
        }
        let pen = Pen::new(self.diameter / 2.0 / step, options.chord_error / step);
        let contours: Vec<_> = match self.path.as_slice() {
            [at] => vec![snap(&pen.dot(*at))],
            path => path.windows(2).map(|p| snap(&pen.stroke(p[0], p[1]))).collect(),
        };
        Some(Region::from_contours(&contours, Fill::NonZero))
    }
}
