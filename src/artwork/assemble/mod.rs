//! Files to a draft of the artwork: read each, settle what it is, put it where it belongs.

mod holes;
mod roles;

use super::connect::{Draft, DraftCopper, connect};
use super::drill::{self, DrillFile};
use super::error::{ArtworkError, ArtworkErrors, Problem};
use super::gerber::{self, Plot, image};
use super::job_file::{self, Entry, base_name};
use super::layer_role::{self, DrillRole, Role, Side};
use super::netlist;
use super::{Artwork, ArtworkOptions, InputFile, Pattern};
use crate::diag::{Origin, Warned, Warning};
use crate::geom::region::Region;
use crate::job::{DrillPlan, FileContent, Job, LayerId, LayerKind, Stackup};
use holes::{DrillSource, HoleSource};
use rayon::prelude::*;
use roles::Source;
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

/// All of a file's image, nets disregarded.
fn image_of(plot: Plot) -> Region {
    let images = image::compose(plot.objects);
    Region::union_all(images.iter().map(|image| &image.region))
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
