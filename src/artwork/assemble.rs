//! Files to a draft of the artwork: read each, settle what it is, put it where it belongs.

use super::connect::{Draft, DraftCopper, DraftHole, connect};
use super::curve::{Pen, Xy, round, snap};
use super::drill::{self, Digits, DrillError, DrillFile};
use super::error::{ArtworkError, ArtworkErrors, Problem};
use super::gerber::{self, Plot, image};
use super::job_file::{self, Entry, base_name};
use super::layer_role::{self, DrillRole, Role, Side};
use super::netlist;
use super::{Artwork, ArtworkOptions, InputFile, Pattern};
use crate::diag::{Origin, Warned, Warning};
use crate::geom::region::{Bounds, Fill, Point, Region};
use crate::job::{DrillPlan, FileContent, HoleMeaning, Job, LayerId, LayerKind, Stackup};
use rayon::prelude::*;
use std::collections::BTreeMap;

/// Ends of profile lines closer than this are taken as one, m: ten times the last digit of a coarse 2.4 inch file.
const PROFILE_TOLERANCE: f64 = 25e-6;

/// Reads the artwork: all of `files`, and the shapes drawn in `job`.
///
/// # Errors
/// Every problem found; at least one.
pub fn read(
    files: &[InputFile],
    job: &Job,
    stackup: &Stackup,
    options: &ArtworkOptions,
) -> Result<Warned<Artwork>, ArtworkErrors> {
    if !(options.chord_error > 0.0 && options.chord_error <= 1e-3) {
        let problem = Problem::ChordError { found: options.chord_error };
        return Err(ArtworkErrors(vec![ArtworkError { file: None, problem }]));
    }
    let parsed: Vec<Parsed> = files.par_iter().map(|file| parse(file, options)).collect();
    let mut stage = Stage {
        files,
        job,
        stackup,
        options,
        errors: Vec::new(),
        warnings: Vec::new(),
        draft: Draft::default(),
        drills: Vec::new(),
    };
    stage.place(parsed);
    stage.patterns();
    stage.shapes();
    stage.drill();
    stage.missing();
    let Stage { mut errors, mut warnings, draft, .. } = stage;
    if errors.is_empty() {
        match connect(draft, job, stackup, options, &mut warnings) {
            Ok(value) => return Ok(Warned { value, warnings }),
            Err(found) => errors = found,
        }
    }
    Err(ArtworkErrors(errors))
}

/// A file, read.
enum Parsed {
    Gerber(Box<Plot>),
    Drill(Box<DrillFile>),
    JobFile(Vec<Entry>),
    Netlist(Vec<netlist::TestPoint>),
    Other,
    Failed(Vec<Problem>),
}

fn parse(file: &InputFile, options: &ArtworkOptions) -> Parsed {
    let bytes = &file.bytes;
    let failed = |problems: Vec<Problem>| Parsed::Failed(problems);
    if file.name.to_ascii_lowercase().ends_with(".gbrjob") {
        return match job_file::read(bytes) {
            Ok(entries) => Parsed::JobFile(entries),
            Err(reason) => failed(vec![Problem::JobFile { file: file.name.clone(), reason }]),
        };
    }
    if netlist::has_signature(bytes) {
        return match netlist::read(bytes, options.grid) {
            Ok(points) => Parsed::Netlist(points),
            Err((expected, span)) => {
                failed(vec![Problem::Netlist { file: file.name.clone(), expected, span }])
            }
        };
    }
    if drill::has_signature(bytes) {
        return match drill::read(bytes, options.grid, options.chord_error, None) {
            Ok(read) => Parsed::Drill(Box::new(read)),
            Err(errors) => failed(errors.into_iter().map(Problem::from).collect()),
        };
    }
    if gerber::has_signature(bytes) {
        return match gerber::plot(bytes, options.grid, options.chord_error) {
            Ok(plot) => Parsed::Gerber(Box::new(plot)),
            Err(errors) => failed(errors.into_iter().map(Problem::from).collect()),
        };
    }
    if file.content == FileContent::Unsaid {
        return Parsed::Other;
    }
    failed(vec![Problem::NotArtwork { file: file.name.clone() }])
}

/// Holes of one file, before their outlines are made.
struct DrillSource {
    file: usize,
    role: DrillRole,
    plan: DrillPlan,
    holes: HoleSource,
}

enum HoleSource {
    Drill(Box<DrillFile>),
    Gerber(Vec<image::Object>),
}

struct Stage<'a> {
    files: &'a [InputFile],
    job: &'a Job,
    stackup: &'a Stackup,
    options: &'a ArtworkOptions,
    errors: Vec<ArtworkError>,
    warnings: Vec<Warning>,
    draft: Draft,
    drills: Vec<DrillSource>,
}

impl Stage<'_> {
    fn fail(&mut self, file: usize, problem: Problem) {
        self.errors.push(ArtworkError { file: Some(self.files[file].file), problem });
    }

    fn warn(&mut self, file: usize, text: impl Into<String>) {
        self.warnings.push(Warning::new(text, Origin::new(self.files[file].file, 0..0)));
    }

    /// Puts each file where it belongs.
    fn place(&mut self, parsed: Vec<Parsed>) {
        let entries: Vec<Entry> = parsed
            .iter()
            .filter_map(|p| if let Parsed::JobFile(entries) = p { Some(entries.clone()) } else { None })
            .flatten()
            .collect();
        let mut roles: Vec<Option<(Role, Source)>> = Vec::new();
        for (k, parsed) in parsed.iter().enumerate() {
            let role = self.role(k, parsed, &entries);
            roles.push(role);
        }
        self.settle_inner(&mut roles);
        self.refuse_doubles(&mut roles);
        let (mut passed_over, mut unknown) = (Vec::new(), Vec::new());
        for (k, (parsed, role)) in parsed.into_iter().zip(roles).enumerate() {
            match (parsed, role) {
                (Parsed::Failed(problems), role) => {
                    // A legend that we cannot read is of no consequence.
                    if !matches!(role, Some((Role::Ignored(_), _))) {
                        problems.into_iter().for_each(|problem| self.fail(k, problem));
                    }
                }
                (Parsed::Other, _) => passed_over.push(format!("`{}`", self.files[k].name)),
                (Parsed::JobFile(_), _) => {}
                (Parsed::Netlist(points), _) => {
                    let file = self.files[k].file;
                    self.draft.names.extend(points.into_iter().map(|p| (Origin::new(file, p.span), p)));
                }
                (Parsed::Gerber(plot), Some((role, source))) => {
                    if source == Source::Guess {
                        let text = format!(
                            "`{}` is taken as {} by its extension, which is a guess",
                            self.files[k].name,
                            say(&role)
                        );
                        self.warn(k, text);
                    }
                    let entry = entries.iter().find(|e| e.name == base_name(&self.files[k].name));
                    self.gerber(k, *plot, role, entry);
                }
                (Parsed::Gerber(_), None) => unknown.push(k),
                (Parsed::Drill(read), role) => {
                    let role = match role {
                        Some((Role::Drill(role), _)) => role,
                        Some((Role::Ignored(what), _)) => {
                            self.warn(k, format!("`{}` is left out: {what}", self.files[k].name));
                            continue;
                        }
                        _ => DrillRole::default(),
                    };
                    let plan = self.plan(k);
                    let role = DrillRole { plated: role.plated.or(read.plated), ..role };
                    self.drills.push(DrillSource { file: k, role, plan, holes: HoleSource::Drill(read) });
                }
            }
        }
        self.unknown(&unknown);
        if !passed_over.is_empty() {
            let text = format!(
                "passed over, being neither Gerber nor drill nor job file: {}",
                passed_over.join(", ")
            );
            self.warnings.push(Warning::new(text, Origin::default()));
        }
    }

    /// Gerber files of which nothing says what they are: refused, unless every conductor has copper without them.
    fn unknown(&mut self, files: &[usize]) {
        let complete = self
            .stackup
            .conductors()
            .all(|layer| self.draft.copper.iter().any(|copper| copper.layer == layer));
        for k in files {
            let file = self.files[*k].name.clone();
            if complete {
                let text = format!(
                    "LEFT OUT: nothing says which layer `{file}` is, and every conductor layer has copper without it"
                );
                self.warn(*k, text);
            } else {
                self.fail(*k, Problem::UnknownRole { file });
            }
        }
    }

    fn plan(&self, k: usize) -> DrillPlan {
        match &self.files[k].content {
            FileContent::Drill(plan) => plan.clone(),
            _ => DrillPlan::default(),
        }
    }

    /// What file `k` is: the job's word first, then the file's own, then the job file's, then its extension.
    fn role(&mut self, k: usize, parsed: &Parsed, entries: &[Entry]) -> Option<(Role, Source)> {
        let file = &self.files[k];
        let own = match parsed {
            Parsed::Gerber(plot) => plot.attribute(".FileFunction").and_then(layer_role::by_function),
            Parsed::Drill(read) => read.function.as_deref().and_then(layer_role::by_function),
            _ => None,
        };
        let stated = match &file.content {
            FileContent::Layer(name) => match self.stackup.find(&name.name) {
                Some(layer) => Some(Role::Layer(layer)),
                None => {
                    let known = self.stackup.layers.iter().map(|l| l.name.clone()).collect();
                    let problem =
                        Problem::UnknownLayer { name: name.name.clone(), known, span: name.origin.span };
                    self.errors.push(ArtworkError::at(name.origin, problem));
                    Some(Role::Ignored("its layer is unknown"))
                }
            },
            FileContent::Profile => Some(Role::Profile),
            FileContent::Drill(_) => match own {
                Some(Role::Drill(role)) => Some(Role::Drill(role)),
                _ => Some(Role::Drill(DrillRole::default())),
            },
            FileContent::Unsaid => None,
        };
        let pattern = || {
            let named = |layer: &(LayerId, &crate::job::Layer)| match &layer.1.kind {
                LayerKind::Dielectric { pattern: Some(p), .. } => base_name(&p.name) == base_name(&file.name),
                _ => false,
            };
            self.stackup.iter().find(named).map(|(id, _)| Role::Layer(id))
        };
        if let Some(role) = stated.or_else(pattern) {
            return Some((role, Source::Job));
        }
        if let Some(role) = own {
            return Some((role, Source::File));
        }
        if let Some(entry) = entries.iter().find(|e| e.name == base_name(&file.name)) {
            return Some((entry.role.clone(), Source::JobFile));
        }
        layer_role::by_extension(&file.name).map(|role| (role, Source::Guess))
    }

    /// `.G1`, `.G2`: the first inner layer is 1 with some writers and 2 with others; a full set tells.
    fn settle_inner(&mut self, roles: &mut [Option<(Role, Source)>]) {
        let mut inner: Vec<(u32, usize)> = Vec::new();
        for (k, role) in roles.iter().enumerate() {
            if let Some((Role::Inner(n), _)) = role {
                inner.push((*n, k));
            }
        }
        inner.sort_unstable();
        let n_conductors = self.stackup.conductors().count();
        for (role, _) in roles.iter_mut().flatten() {
            if let Role::Outer(side) = role {
                let last = u32::try_from(n_conductors).unwrap_or(u32::MAX);
                *role = Role::Conductor(if *side == Side::Top { 1 } else { last });
            }
        }
        if inner.len() + 2 == n_conductors {
            for (place, (_, k)) in (2u32..).zip(&inner) {
                roles[*k] = Some((Role::Conductor(place), Source::Guess));
            }
        } else {
            for (_, k) in inner {
                roles[k] = None;
            }
        }
    }

    /// Two files with one role: a guess yields to a stated role, two stated ones are refused.
    fn refuse_doubles(&mut self, roles: &mut [Option<(Role, Source)>]) {
        let mut taken: BTreeMap<String, usize> = BTreeMap::new();
        for k in 0..roles.len() {
            let Some((role, source)) = &roles[k] else { continue };
            let key = match role {
                Role::Conductor(n) => format!("conductor layer {n}"),
                Role::Layer(id) => match layer_number(self.stackup, *id) {
                    Some(n) => format!("conductor layer {n}"),
                    None => continue,
                },
                Role::Profile => "the profile".to_owned(),
                _ => continue,
            };
            let source = *source;
            let Some(other) = taken.insert(key.clone(), k) else { continue };
            let theirs = roles[other].as_ref().map_or(Source::Guess, |r| r.1);
            // A listed file may come in several parts; a folder's files may not.
            if source == Source::Job && theirs == Source::Job {
                continue;
            }
            let weaker = if source == theirs { None } else { Some(if source > theirs { k } else { other }) };
            let (first, second) = (self.files[other].name.clone(), self.files[k].name.clone());
            match weaker {
                None => self.fail(k, Problem::SameRole { first, second, role: key }),
                Some(weak) => {
                    let name = self.files[weak].name.clone();
                    self.warn(
                        weak,
                        format!("`{name}` is left out: another file is {key} by a better source"),
                    );
                    roles[weak] = Some((Role::Ignored("another file has its role"), Source::Job));
                    let kept = if weak == k { other } else { k };
                    taken.insert(key, kept);
                }
            }
        }
    }

    fn gerber(&mut self, k: usize, plot: Plot, role: Role, entry: Option<&Entry>) {
        for (text, span) in &plot.warnings {
            self.warnings.push(Warning::new(text.clone(), Origin::new(self.files[k].file, *span)));
        }
        let own = plot.attribute(".FilePolarity").and_then(|v| v.first()).cloned();
        let polarity = own.or_else(|| entry.map(|e| e.polarity.clone()).filter(|p| !p.is_empty()));
        let is = |what: &str| polarity.as_deref().is_some_and(|p| p.eq_ignore_ascii_case(what));
        let (negative, positive) = (is("Negative"), is("Positive"));
        let name = self.files[k].name.clone();
        let bad = |expected| Problem::Polarity {
            file: name.clone(),
            found: polarity.clone().unwrap_or_default(),
            expected,
        };
        match role {
            Role::Conductor(_) | Role::Outer(_) | Role::Inner(_) | Role::Layer(_) if negative => {
                self.fail(k, bad("a positive image"));
            }
            Role::Mask(_) if positive => self.fail(k, bad("a negative image, its objects being openings")),
            Role::Conductor(number) => match layer_role::conductor(self.stackup, number) {
                Some(layer) => self.copper(k, layer, plot),
                None => {
                    let known = self.stackup.conductors().count();
                    self.fail(k, Problem::LayerNumber { file: name, number, known });
                }
            },
            Role::Layer(layer) => match self.stackup.get(layer).kind {
                LayerKind::Conductor { .. } => self.copper(k, layer, plot),
                LayerKind::Dielectric { .. } => {
                    self.draft.patterns.push(Pattern { layer, region: image_of(plot) })
                }
                LayerKind::Coating { .. } => {
                    self.draft.openings.push(Pattern { layer, region: image_of(plot) })
                }
                LayerKind::Open { .. } => {
                    let layer = self.stackup.get(layer).name.clone();
                    let expected = "a conductor, a dielectric or a coating";
                    self.fail(k, Problem::LayerKind { name: layer, expected, span: (0..0).into() });
                }
            },
            Role::Mask(side) => self.mask(k, side, plot),
            Role::Profile => self.profile(k, &plot),
            Role::Drill(role) => {
                let plan = self.plan(k);
                let holes = HoleSource::Gerber(plot.objects);
                self.drills.push(DrillSource { file: k, role, plan, holes });
            }
            Role::Ignored(what) => {
                if what != "another file has its role" {
                    self.warn(k, format!("`{name}` is left out: {what}"));
                }
            }
            // Settled before.
            Role::Outer(_) | Role::Inner(_) => self.fail(k, Problem::UnknownRole { file: name }),
        }
    }

    fn copper(&mut self, k: usize, layer: LayerId, plot: Plot) {
        let file = self.files[k].file;
        for image in image::compose(plot.objects) {
            let name = plot.names.get(image.net as usize).filter(|name| !name.is_empty()).cloned();
            let origin = Origin::new(file, image.span);
            self.draft.copper.push(DraftCopper { layer, name, region: image.region, origin });
        }
    }

    fn mask(&mut self, k: usize, side: Side, plot: Plot) {
        let layers = layer_role::coatings(self.stackup, side);
        if layers.is_empty() {
            let side = if side == Side::Top { "top" } else { "bottom" };
            let name = &self.files[k].name;
            let text = format!(
                "SOLDER MASK LEFT OUT: `{name}` shows a mask on the {side}, and the stackup has no coating there; add a `kind = \"coating\"` layer to model it"
            );
            self.warn(k, text);
            return;
        }
        let region = image_of(plot);
        for layer in layers {
            self.draft.openings.push(Pattern { layer, region: region.clone() });
        }
    }

    fn profile(&mut self, k: usize, plot: &Plot) {
        let tolerance = self.options.grid.snap(PROFILE_TOLERANCE).unwrap_or(1);
        match super::profile::region(&plot.objects, tolerance) {
            Ok(region) => self.draft.profile = Some(region),
            Err(super::profile::OpenProfile::Empty) => {
                self.warn(
                    k,
                    format!("`{}` encloses nothing: the board's edge is not modelled", self.files[k].name),
                );
            }
            Err(super::profile::OpenProfile::EndsAt(at)) => {
                let mm = |steps: i64| self.options.grid.length(steps) * 1e3;
                let text = format!(
                    "the outline in `{}` does not close: it ends at ({:.4} mm, {:.4} mm); the board's edge is not modelled",
                    self.files[k].name,
                    mm(at.x),
                    mm(at.y)
                );
                self.warn(k, text);
            }
        }
    }

    /// Every pattern file that the stackup names must have come.
    fn patterns(&mut self) {
        for (id, layer) in self.stackup.iter() {
            let LayerKind::Dielectric { pattern: Some(pattern), .. } = &layer.kind else { continue };
            let given = self.files.iter().any(|f| base_name(&f.name) == base_name(&pattern.name));
            if !given && !self.draft.patterns.iter().any(|p| p.layer == id) {
                let (file, layer) = (pattern.name.clone(), layer.name.clone());
                let problem = Problem::PatternFile { file, layer, span: pattern.origin.span };
                self.errors.push(ArtworkError::at(pattern.origin, problem));
            }
        }
        let mut joined: BTreeMap<(bool, LayerId), Vec<Region>> = BTreeMap::new();
        for pattern in self.draft.openings.drain(..) {
            joined.entry((true, pattern.layer)).or_default().push(pattern.region);
        }
        for ((_, layer), regions) in joined {
            self.draft.openings.push(Pattern { layer, region: Region::union_all(&regions) });
        }
    }

    fn shapes(&mut self) {
        let mut patterns: BTreeMap<LayerId, Vec<Region>> = BTreeMap::new();
        for pattern in self.draft.patterns.drain(..) {
            patterns.entry(pattern.layer).or_default().push(pattern.region);
        }
        for drawn in &self.job.shapes {
            let region = match super::shape::region(drawn, self.options.grid, self.options.chord_error) {
                Ok(region) => region,
                Err(error) => {
                    self.errors.push(error);
                    continue;
                }
            };
            for named in std::iter::once(&drawn.layer).chain(&drawn.through) {
                let Some(layer) = self.stackup.find(&named.name) else {
                    let known = self.stackup.layers.iter().map(|l| l.name.clone()).collect();
                    let problem =
                        Problem::UnknownLayer { name: named.name.clone(), known, span: named.origin.span };
                    self.errors.push(ArtworkError::at(named.origin, problem));
                    continue;
                };
                let kind = &self.stackup.get(layer).kind;
                let conductor = matches!(kind, LayerKind::Conductor { .. });
                let dielectric = matches!(kind, LayerKind::Dielectric { .. });
                if conductor || (dielectric && drawn.net.is_some()) {
                    let name = drawn.net.as_ref().map(|n| n.name.clone());
                    let origin = drawn.origin;
                    self.draft.copper.push(DraftCopper { layer, name, region: region.clone(), origin });
                } else if dielectric {
                    patterns.entry(layer).or_default().push(region.clone());
                } else {
                    let expected = "a conductor or a dielectric";
                    let problem =
                        Problem::LayerKind { name: named.name.clone(), expected, span: named.origin.span };
                    self.errors.push(ArtworkError::at(named.origin, problem));
                }
            }
        }
        for (layer, regions) in patterns {
            self.draft.patterns.push(Pattern { layer, region: Region::union_all(&regions) });
        }
    }

    fn drill(&mut self) {
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

    /// Conductor layers that nothing was drawn in.
    fn missing(&mut self) {
        for layer in self.stackup.conductors() {
            if !self.draft.copper.iter().any(|c| c.layer == layer) && self.errors.is_empty() {
                let layer = self.stackup.get(layer);
                let text =
                    format!("conductor layer `{}` has no copper: no file and no shape is there", layer.name);
                self.warnings.push(Warning::new(text, layer.origin));
            }
        }
    }
}

/// Who says what a file is; the earlier, the better.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Source {
    Job,
    File,
    JobFile,
    Guess,
}

/// A hole as its file gives it.
struct RawHole {
    path: Vec<Xy>,
    diameter: f64,
    contours: Option<Vec<crate::geom::Contour>>,
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

/// All of a file's image, nets disregarded.
fn image_of(plot: Plot) -> Region {
    let images = image::compose(plot.objects);
    Region::union_all(images.iter().map(|image| &image.region))
}

fn layer_number(stackup: &Stackup, id: LayerId) -> Option<usize> {
    stackup.conductors().position(|layer| layer == id).map(|k| k + 1)
}

fn say(role: &Role) -> String {
    match role {
        Role::Conductor(n) => format!("conductor layer {n}"),
        Role::Mask(Side::Top) => "the top solder mask".to_owned(),
        Role::Mask(Side::Bottom) => "the bottom solder mask".to_owned(),
        Role::Profile => "the profile".to_owned(),
        Role::Ignored(what) => (*what).to_owned(),
        Role::Outer(_) | Role::Inner(_) | Role::Layer(_) | Role::Drill(_) => "another layer".to_owned(),
    }
}
