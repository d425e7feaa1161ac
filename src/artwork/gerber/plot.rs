//! Commands to objects: the graphics state, apertures, blocks, step-repeat, regions, strokes and flashes.

use super::aperture::{self, Aperture, PenShape, Placement};
use super::attribute::{Attribute, Target};
use super::command::{Command, Commands, Coords, Digits, Format, Operation};
use super::error::GerberError;
use super::image::{Kind, NameIdx, Object};
use super::macros::{Macro, positive, sin_cos};
use crate::artwork::curve::{Arc, Pen, Xy, hull, round, snap};
use crate::diag::Span;
use crate::geom::region::{Contour, Fill, Grid, Point, Region, signed_area};
use gerber_types::{InterpolationMode, Mirroring, Polarity, QuadrantMode, Unit};
use std::collections::HashMap;
use std::sync::Arc as Shared;

/// Most objects one file may make.
const MAX_OBJECTS: u64 = 1_000_000;
/// Most corners the objects of one file may have together.
const MAX_POINTS: u64 = 12_000_000;
/// Most errors reported for one file.
const MAX_ERRORS: usize = 20;

/// What a Gerber file holds.
#[derive(Debug, Default)]
pub(crate) struct Plot {
    /// Objects in file order.
    pub(crate) objects: Vec<Object>,
    /// Net names; entry 0 is the empty one, for copper without a name.
    pub(crate) names: Vec<String>,
    /// File attributes in the order of the file.
    pub(crate) attributes: Vec<(String, Vec<String>)>,
    /// Things to tell.
    pub(crate) warnings: Vec<(String, Span)>,
}

impl Plot {
    /// The fields of file attribute `name`.
    pub(crate) fn attribute(&self, name: &str) -> Option<&[String]> {
        self.attributes.iter().find(|(n, _)| n == name).map(|(_, values)| values.as_slice())
    }
}

/// Reads a Gerber file.
///
/// # Errors
/// Everything found that the format does not allow or that we do not represent, up to a stated number.
pub(crate) fn plot(bytes: &[u8], grid: Grid, chord_error: f64) -> Result<Plot, Vec<GerberError>> {
    let mut plotter = Plotter::new(grid, chord_error);
    let mut commands = Commands::new(bytes);
    let mut errors = Vec::new();
    let mut found = Vec::new();
    loop {
        found.clear();
        let more = commands.read(&mut found);
        for (command, span) in found.drain(..) {
            if let Err(error) = plotter.run(command, span)
                && !errors.iter().any(|known| repeats(known, &error))
            {
                errors.push(error);
            }
            if plotter.ended {
                break;
            }
        }
        match more {
            Err(error) => errors.push(error),
            Ok(false) if !plotter.ended => {
                let end = bytes.len();
                let what = "it does not end with `M02`";
                errors.push(GerberError::Truncated { what, span: (end.saturating_sub(1)..end).into() });
                break;
            }
            Ok(_) => {}
        }
        let fatal =
            errors.iter().any(|e| matches!(e, GerberError::TooMany { .. } | GerberError::Truncated { .. }));
        if plotter.ended || fatal || errors.len() >= MAX_ERRORS {
            break;
        }
    }
    if errors.is_empty() { plotter.finish(bytes.len()).map_err(|e| vec![e]) } else { Err(errors) }
}

/// Whether an error says nothing new: what the first problem of a kind breaks repeats on every line.
fn repeats(known: &GerberError, new: &GerberError) -> bool {
    match (known, new) {
        (GerberError::UndefinedAperture { code: a, .. }, GerberError::UndefinedAperture { code: b, .. }) => {
            a == b
        }
        (GerberError::UndefinedMacro { name: a, .. }, GerberError::UndefinedMacro { name: b, .. }) => a == b,
        (GerberError::Unsupported { construct: a, .. }, GerberError::Unsupported { construct: b, .. }) => {
            a == b
        }
        _ => std::mem::discriminant(known) == std::mem::discriminant(new),
    }
}

/// Where objects go: the file, an open step-repeat, an open block aperture.
struct Frame {
    kind: FrameKind,
    objects: Vec<Object>,
    opened: Span,
}

enum FrameKind {
    File,
    Repeat { nx: u32, ny: u32, dx: f64, dy: f64 },
    Block(u32),
}

/// An open `G36`.
struct OpenRegion {
    contours: Vec<Contour>,
    path: Vec<Xy>,
    opened: Span,
}

struct Plotter {
    grid: Grid,
    chord_error: f64,
    format: Option<Format>,
    unit: Option<Unit>,
    interpolation: InterpolationMode,
    quadrant: Option<QuadrantMode>,
    incremental: bool,
    at: Xy,
    operation: Option<Operation>,
    selected: Option<u32>,
    pen: Option<(u32, Placement, Pen)>,
    dark: bool,
    placement: Placement,
    apertures: HashMap<u32, Aperture>,
    macros: HashMap<String, Macro>,
    frames: Vec<Frame>,
    region: Option<OpenRegion>,
    image: ImageTransform,
    net: NameIdx,
    name_index: HashMap<String, NameIdx>,
    plot: Plot,
    n_objects: u64,
    n_points: u64,
    ended: bool,
    warned_arc: bool,
}

/// The deprecated transformations of a whole image: on coordinates first, then a rotation of everything.
#[derive(Clone, Copy)]
struct ImageTransform {
    mirror_x: bool,
    mirror_y: bool,
    scale: f64,
    offset: Xy,
    rotation: u16,
}

impl Plotter {
    fn new(grid: Grid, chord_error: f64) -> Self {
        let file = Frame { kind: FrameKind::File, objects: Vec::new(), opened: Span::default() };
        Plotter {
            grid,
            chord_error: chord_error / grid.step(),
            format: None,
            unit: None,
            interpolation: InterpolationMode::Linear,
            quadrant: None,
            incremental: false,
            at: [0.0, 0.0],
            operation: None,
            selected: None,
            pen: None,
            dark: true,
            placement: Placement::IDENTITY,
            apertures: HashMap::new(),
            macros: HashMap::new(),
            frames: vec![file],
            region: None,
            image: ImageTransform {
                mirror_x: false,
                mirror_y: false,
                scale: 1.0,
                offset: [0.0, 0.0],
                rotation: 0,
            },
            net: 0,
            name_index: HashMap::from([(String::new(), 0)]),
            plot: Plot { names: vec![String::new()], ..Plot::default() },
            n_objects: 0,
            n_points: 0,
            ended: false,
            warned_arc: false,
        }
    }

    fn run(&mut self, command: Command, span: Span) -> Result<(), GerberError> {
        match command {
            Command::Format(format) => {
                if format.x.1 > 9 || format.y.1 > 9 {
                    return Err(GerberError::Malformed {
                        construct: "the coordinate format".into(),
                        expected: "at most 9 decimals",
                        span,
                    });
                }
                self.incremental = format.incremental;
                self.format = Some(format);
            }
            Command::Unit(unit) => self.unit = Some(unit),
            Command::Interpolation(mode) => self.interpolation = mode,
            Command::Quadrant(mode) => self.quadrant = Some(mode),
            Command::Incremental { on } => self.incremental = on,
            Command::Region { open: true } => {
                if self.region.is_some() {
                    return Err(GerberError::Nesting { what: "`G36`", span });
                }
                self.region = Some(OpenRegion { contours: Vec::new(), path: Vec::new(), opened: span });
            }
            Command::Region { open: false } => self.close_region(span)?,
            Command::Select(code) => self.select(code, span)?,
            Command::Operation { coords, kind } => self.operate(&coords, kind, span)?,
            Command::Define { code, shape } => {
                let unit = self.unit_steps(span)?;
                self.pen = None;
                match aperture::build(&shape, &self.macros, unit, (self.grid, self.chord_error), span) {
                    Ok(built) => drop(self.apertures.insert(code, built)),
                    Err(error) => {
                        // Its uses are no problems of their own.
                        self.apertures.insert(code, Aperture::Block(Shared::default()));
                        return Err(error);
                    }
                }
            }
            Command::Macro(found) => {
                self.macros.insert(found.name.clone(), *found);
            }
            Command::Polarity(polarity) => self.dark = polarity == Polarity::Dark,
            Command::Mirror(mode) => {
                self.placement.mirror_x = matches!(mode, Mirroring::X | Mirroring::XY);
                self.placement.mirror_y = matches!(mode, Mirroring::Y | Mirroring::XY);
            }
            Command::Rotate(degrees) => self.placement.rotation = degrees.to_radians(),
            Command::Scale(factor) => {
                if !(1e-3..=1e3).contains(&factor) {
                    return Err(GerberError::OutOfRange { what: "the aperture scale", span });
                }
                self.placement.scale = factor;
            }
            Command::Repeat { .. } | Command::RepeatClose | Command::BlockOpen(_) | Command::BlockClose => {
                self.run_frame(&command, span)?;
            }
            Command::ImageMirror { a, b } => (self.image.mirror_x, self.image.mirror_y) = (a, b),
            Command::ImageOffset { a, b } => {
                if a.abs().max(b.abs()) > 0.0 {
                    let unit = self.unit_steps(span)?;
                    self.image.offset = [a * unit, b * unit];
                    self.check_place(self.image.offset, span)?;
                }
            }
            Command::ImageScale(factor) => {
                if !(1e-3..=1e3).contains(&factor) {
                    return Err(GerberError::OutOfRange { what: "the scale factor", span });
                }
                self.image.scale = factor;
            }
            Command::ImageRotate(degrees) => self.image.rotation = degrees,
            Command::Attribute(attribute) => self.attribute(*attribute, span),
            Command::Nothing => {}
            Command::End => self.ended = true,
        }
        Ok(())
    }

    fn run_frame(&mut self, command: &Command, span: Span) -> Result<(), GerberError> {
        if self.region.is_some() {
            return Err(GerberError::Nesting { what: "a block or step-repeat inside a region", span });
        }
        match *command {
            Command::BlockOpen(code) => {
                if self.frames.len() > 32 {
                    return Err(GerberError::Nesting { what: "more than 32 blocks, one in another,", span });
                }
                self.frames.push(Frame { kind: FrameKind::Block(code), objects: Vec::new(), opened: span });
            }
            Command::BlockClose => {
                self.close_repeat(span)?;
                match self.frames.pop_if(|frame| matches!(frame.kind, FrameKind::Block(_))) {
                    Some(Frame { kind: FrameKind::Block(code), objects, .. }) => {
                        self.apertures.insert(code, Aperture::Block(Shared::new(objects)));
                    }
                    _ => return Err(GerberError::Nesting { what: "`AB`", span }),
                }
            }
            Command::Repeat { nx, ny, dx, dy } => {
                // A new step-repeat ends the one before.
                self.close_repeat(span)?;
                let (dx, dy) = if nx == 1 && ny == 1 {
                    (0.0, 0.0)
                } else {
                    let unit = self.unit_steps(span)?;
                    (dx * unit, dy * unit)
                };
                self.check_place([f64::from(nx - 1) * dx, f64::from(ny - 1) * dy], span)?;
                if nx != 1 || ny != 1 {
                    let kind = FrameKind::Repeat { nx, ny, dx, dy };
                    self.frames.push(Frame { kind, objects: Vec::new(), opened: span });
                }
            }
            _ => self.close_repeat(span)?,
        }
        Ok(())
    }

    /// Ends the innermost step-repeat, if one is open: its objects once per place, X outside, Y inside.
    fn close_repeat(&mut self, span: Span) -> Result<(), GerberError> {
        let is_repeat = |frame: &mut Frame| matches!(frame.kind, FrameKind::Repeat { .. });
        let Some(frame) = self.frames.pop_if(is_repeat) else { return Ok(()) };
        let FrameKind::Repeat { nx, ny, dx, dy } = frame.kind else { return Ok(()) };
        let copies = u64::from(nx) * u64::from(ny);
        let points: u64 = frame.objects.iter().map(count_points).sum();
        let n = frame.objects.len() as u64;
        self.count("a step-repeat", n.saturating_mul(copies - 1), points.saturating_mul(copies - 1), span)?;
        let Some(parent) = self.frames.last_mut() else { return Ok(()) };
        for x in 0..nx {
            for y in 0..ny {
                let shift = round([f64::from(x) * dx, f64::from(y) * dy]);
                parent.objects.extend(frame.objects.iter().map(|o| shifted(o, shift)));
            }
        }
        Ok(())
    }

    fn count(
        &mut self,
        what: &'static str,
        objects: u64,
        points: u64,
        span: Span,
    ) -> Result<(), GerberError> {
        self.n_objects = self.n_objects.saturating_add(objects);
        self.n_points = self.n_points.saturating_add(points);
        if self.n_objects > MAX_OBJECTS {
            let (count, limit) = (self.n_objects, MAX_OBJECTS);
            return Err(GerberError::TooMany { what, count, unit: "objects", limit, span });
        }
        if self.n_points > MAX_POINTS {
            let (count, limit) = (self.n_points, MAX_POINTS);
            return Err(GerberError::TooMany { what, count, unit: "corners", limit, span });
        }
        Ok(())
    }

    /// The file's unit in grid steps.
    fn unit_steps(&self, span: Span) -> Result<f64, GerberError> {
        let metres = match self.unit {
            Some(Unit::Millimeters) => 1e-3,
            Some(Unit::Inches) => 25.4e-3,
            None => return Err(GerberError::Undeclared { what: "the unit", cure: "%MOMM*%", span }),
        };
        Ok(metres / self.grid.step())
    }

    fn length(&self, digits: Digits, axis: (u8, u8), span: Span) -> Result<f64, GerberError> {
        let unit = self.unit_steps(span)?;
        let trailing = self.format.is_some_and(|f| f.trailing_omitted);
        let decimals = match digits.decimals {
            Some(decimals) => i32::from(decimals),
            None if trailing => i32::from(axis.1) + i32::from(digits.count) - i32::from(axis.0 + axis.1),
            None => i32::from(axis.1),
        };
        #[expect(clippy::cast_precision_loss, reason = "at most 15 digits")]
        let value = digits.value as f64;
        Ok(value * (unit / 10f64.powi(decimals)))
    }

    fn check_place(&self, p: Xy, span: Span) -> Result<(), GerberError> {
        let limit = super::max_steps(self.grid);
        if p[0].abs() <= limit && p[1].abs() <= limit {
            return Ok(());
        }
        Err(GerberError::OutOfRange { what: "a coordinate", span })
    }

    fn operate(&mut self, coords: &Coords, kind: Option<Operation>, span: Span) -> Result<(), GerberError> {
        let Some(format) = self.format else {
            return Err(GerberError::Undeclared {
                what: "the coordinate format",
                cure: "%FSLAX46Y46*%",
                span,
            });
        };
        if kind.is_some() {
            self.operation = kind;
        }
        let mut to = self.at;
        for (axis, digits, format) in [(0, coords.x, format.x), (1, coords.y, format.y)] {
            let Some(digits) = digits else { continue };
            let length = self.length(digits, format, span)? * self.image.scale;
            let mirrored = if axis == 0 { self.image.mirror_x } else { self.image.mirror_y };
            let length = if mirrored { -length } else { length };
            to[axis] =
                if self.incremental { self.at[axis] + length } else { length + self.image.offset[axis] };
        }
        self.check_place(to, span)?;
        match self.operation {
            Some(Operation::Draw) => {
                let path = self.segment(coords, to, format, span)?;
                if let Some(region) = &mut self.region {
                    let (from, arc) = (self.at, path);
                    if region.path.is_empty() {
                        region.path.push(from);
                    }
                    match arc {
                        Some(arc) => {
                            let path = arc.path(self.chord_error);
                            region.path.extend(path.into_iter().skip(1));
                        }
                        None => region.path.push(to),
                    }
                    // Counted here so that a file of nothing but corners stays bounded.
                    let n = region.path.len() as u64;
                    if n > MAX_POINTS {
                        self.count("a region", 0, n, span)?;
                    }
                } else {
                    self.stroke(to, path, span)?;
                }
            }
            Some(Operation::Move) => self.end_contour(),
            Some(Operation::Flash) => {
                if self.region.is_some() {
                    return Err(GerberError::Nesting { what: "a flash inside a region", span });
                }
                self.flash(to, span)?;
            }
            None => {
                return Err(GerberError::Malformed {
                    construct: "a coordinate".into(),
                    expected: "D01, D02 or D03 with it or before it",
                    span,
                });
            }
        }
        self.at = to;
        Ok(())
    }

    /// The arc from the current point to `to`; `None` for a straight segment.
    fn segment(
        &mut self,
        coords: &Coords,
        to: Xy,
        format: Format,
        span: Span,
    ) -> Result<Option<Arc>, GerberError> {
        if self.interpolation == InterpolationMode::Linear {
            return Ok(None);
        }
        let read = |digits: Option<Digits>, axis| digits.map_or(Ok(0.0), |d| self.length(d, axis, span));
        let (i, j) =
            (read(coords.i, format.x)? * self.image.scale, read(coords.j, format.y)? * self.image.scale);
        if coords.i.is_none() && coords.j.is_none() && round(self.at) != round(to) {
            if !std::mem::replace(&mut self.warned_arc, true) {
                let text =
                    "an arc without `I` and `J` is drawn straight (the file does not go back to `G01`)";
                self.plot.warnings.push((text.to_owned(), span));
            }
            return Ok(None);
        }
        let mut counter = self.interpolation == InterpolationMode::CounterclockwiseCircular;
        if self.image.mirror_x != self.image.mirror_y {
            counter = !counter;
        }
        self.check_place([i, j], span)?;
        let sign = |mirror: bool| if mirror { -1.0 } else { 1.0 };
        let (i, j) = (i * sign(self.image.mirror_x), j * sign(self.image.mirror_y));
        let from = self.at;
        let lsb = self.length(
            Digits { value: 1, count: 1, decimals: None },
            (0, format.x.1.min(format.y.1)),
            span,
        )?;
        let arc = match self.quadrant {
            Some(QuadrantMode::Multi) => Arc::about([from[0] + i, from[1] + j], from, to, counter),
            Some(QuadrantMode::Single) => {
                if round(from) == round(to) {
                    return Ok(None);
                }
                single_quadrant(from, to, i.abs(), j.abs(), counter, lsb.abs())
            }
            None => {
                return Err(GerberError::Undeclared {
                    what: "the quadrant mode of an arc",
                    cure: "G75*",
                    span,
                });
            }
        };
        let deviation = (arc.radius - arc.end_radius).abs();
        let radius = arc.radius.max(arc.end_radius);
        if radius < lsb.abs().max(0.5) {
            return Ok(None);
        }
        // Coordinates are rounded to the last digit, I and J as well; old 2.3 files round coarsely.
        if deviation > 0.05 * radius && deviation > 10.0 * lsb.abs() {
            let mm = |steps: f64| (steps * self.grid.step() * 1e9).round() / 1e6;
            let (start_mm, end_mm) = (mm(arc.radius), mm(arc.end_radius));
            return Err(GerberError::BadArc { start_mm, end_mm, span });
        }
        Ok(Some(arc))
    }

    fn select(&mut self, code: u32, span: Span) -> Result<(), GerberError> {
        self.selected = Some(code);
        if !self.apertures.contains_key(&code) {
            return Err(GerberError::UndefinedAperture { code, span });
        }
        Ok(())
    }

    fn stroke(&mut self, to: Xy, arc: Option<Arc>, span: Span) -> Result<(), GerberError> {
        let code = self.selected.ok_or(GerberError::NoAperture { span })?;
        let shape = match self.apertures.get(&code) {
            Some(Aperture::Shape { pen, .. }) => *pen,
            Some(Aperture::Block(_)) => PenShape::None("a block aperture"),
            None => return Err(GerberError::UndefinedAperture { code, span }),
        };
        let from = self.at;
        let width;
        let outlines: Vec<Vec<Xy>> = match (shape, arc) {
            (PenShape::Round(radius), arc) => {
                let radius = radius * self.placement.scale;
                width = 2.0 * radius;
                if radius < 0.5 {
                    Vec::new()
                } else {
                    let pen = self.pen(code, radius);
                    arc.map_or_else(|| vec![pen.stroke(from, to)], |arc| pen.arc_stroke(&arc))
                }
            }
            (PenShape::Rectangle(w, h), None) => {
                let corners = super::macros::rectangle([-w / 2.0, -h / 2.0], w, h);
                let corners = self.placement.apply(corners);
                let at = |p: Xy| corners.iter().map(move |c| [c[0] + p[0], c[1] + p[1]]);
                width = w.min(h) * self.placement.scale;
                vec![hull(at(from).chain(at(to)).collect())]
            }
            (PenShape::Rectangle(..), Some(_)) => {
                return Err(GerberError::Unsupported {
                    construct: "an arc drawn with a rectangular aperture".into(),
                    span,
                });
            }
            (PenShape::None(what), _) => {
                return Err(GerberError::Unsupported {
                    construct: format!("a stroke drawn with {what}"),
                    span,
                });
            }
        };
        let kind = match arc {
            None => Kind::Line { from: round(from), to: round(to), width },
            Some(arc) => {
                let path = arc.path(self.chord_error).into_iter().map(round).collect();
                Kind::Arc { path, width }
            }
        };
        let contours = outlines.iter().map(|o| snap(o)).filter(|c| c.len() > 2).collect();
        self.push(contours, kind, span)
    }

    /// The pen of aperture `code`, made once per selection.
    fn pen(&mut self, code: u32, radius: f64) -> Pen {
        match &self.pen {
            Some((made, placement, pen)) if *made == code && *placement == self.placement => pen.clone(),
            _ => {
                let pen = Pen::new(radius, self.chord_error);
                self.pen = Some((code, self.placement, pen.clone()));
                pen
            }
        }
    }

    fn flash(&mut self, at: Xy, span: Span) -> Result<(), GerberError> {
        let code = self.selected.ok_or(GerberError::NoAperture { span })?;
        match self.apertures.get(&code) {
            None => Err(GerberError::UndefinedAperture { code, span }),
            Some(Aperture::Shape { contours, pen }) => {
                let diameter = match pen {
                    PenShape::Round(radius) => Some(2.0 * radius * self.placement.scale),
                    _ => None,
                };
                let place = |ring: &Vec<Xy>| {
                    let placed = self.placement.apply(ring.clone());
                    let moved: Vec<Xy> = placed.iter().map(|c| [c[0] + at[0], c[1] + at[1]]).collect();
                    let mut ring = snap(&moved);
                    if self.placement.flips() {
                        ring.reverse();
                    }
                    ring
                };
                let contours = contours.iter().map(place).filter(|c| c.len() > 2).collect();
                self.push(contours, Kind::Flash { at: round(at), diameter }, span)
            }
            Some(Aperture::Block(objects)) => {
                let objects = Shared::clone(objects);
                for object in objects.iter() {
                    let placed = self.place_block(object, at, span);
                    self.push_object(placed)?;
                }
                Ok(())
            }
        }
    }

    /// An object of a block aperture, flashed at `at`: clear flashes swap the polarity.
    fn place_block(&self, object: &Object, at: Xy, span: Span) -> Object {
        #[expect(clippy::cast_precision_loss, reason = "coordinates are far below 2^53 steps")]
        let place = |p: &Point| {
            let placed = self.placement.apply(vec![[p.x as f64, p.y as f64]]);
            round([placed[0][0] + at[0], placed[0][1] + at[1]])
        };
        let mut object = map_object(object, place, self.placement.flips(), self.placement.scale);
        object.dark = object.dark == self.dark;
        object.span = span;
        if self.net != 0 {
            object.net = self.net;
        }
        object
    }

    fn end_contour(&mut self) {
        if let Some(region) = &mut self.region {
            let path = std::mem::take(&mut region.path);
            let ring = snap(&path);
            if ring.len() > 2 {
                // Cut-ins run along themselves and old files cross themselves: each contour is settled on its own,
                // so that the union of all never cancels.
                region.contours.extend(settle(ring));
            }
        }
    }

    fn close_region(&mut self, span: Span) -> Result<(), GerberError> {
        self.end_contour();
        let Some(region) = self.region.take() else {
            return Err(GerberError::Nesting { what: "`G37`", span });
        };
        self.push(region.contours, Kind::Region, Span { start: region.opened.start, end: span.end })
    }

    fn push(&mut self, contours: Vec<Contour>, kind: Kind, span: Span) -> Result<(), GerberError> {
        let object = Object { contours, dark: self.dark, net: self.net, kind, span };
        self.push_object(object)
    }

    fn push_object(&mut self, object: Object) -> Result<(), GerberError> {
        self.count("the file", 1, count_points(&object), object.span)?;
        if let Some(frame) = self.frames.last_mut() {
            frame.objects.push(object);
        }
        Ok(())
    }

    fn attribute(&mut self, attribute: Attribute, span: Span) {
        match attribute {
            Attribute::Set { target: Target::Object, name, values } if name == ".N" => {
                if values.len() > 1 {
                    let text = format!(
                        "an object belongs to several nets ({}); it is given to the first",
                        values.join(", ")
                    );
                    self.plot.warnings.push((text, span));
                }
                let name = values.first().map(|n| n.trim()).unwrap_or_default();
                let name = if name == "N/C" { "" } else { name };
                self.net = match self.name_index.get(name) {
                    Some(known) => *known,
                    None => {
                        let new = NameIdx::try_from(self.plot.names.len()).unwrap_or(0);
                        self.plot.names.push(name.to_owned());
                        self.name_index.insert(name.to_owned(), new);
                        new
                    }
                };
            }
            Attribute::Set { target: Target::File, name, values } => {
                self.plot.attributes.push((name, values))
            }
            Attribute::Delete(name) if name.as_deref().is_none_or(|n| n == ".N") => self.net = 0,
            Attribute::Set { .. } | Attribute::Delete(_) => {}
        }
    }

    fn finish(mut self, end: usize) -> Result<Plot, GerberError> {
        let last: Span = (end.saturating_sub(1)..end).into();
        if let Some(region) = &self.region {
            return Err(GerberError::Nesting {
                what: "a region (`G36`) that is still open at the end",
                span: region.opened,
            });
        }
        // Old files leave the last step-repeat open.
        self.close_repeat(last)?;
        let Some(frame) = self.frames.pop() else { return Ok(self.plot) };
        if !matches!(frame.kind, FrameKind::File) {
            return Err(GerberError::Nesting {
                what: "a block that is still open at the end",
                span: frame.opened,
            });
        }
        let (sin, cos) = sin_cos(f64::from(self.image.rotation).to_radians());
        self.plot.objects = if self.image.rotation == 0 {
            frame.objects
        } else {
            #[expect(clippy::cast_possible_truncation, reason = "-1, 0 or 1")]
            let (s, c) = (sin as i64, cos as i64);
            let turned = |p: &Point| Point::new(p.x * c - p.y * s, p.x * s + p.y * c);
            frame.objects.iter().map(|o| map_object(o, turned, false, 1.0)).collect()
        };
        Ok(self.plot)
    }
}

/// The arc of at most a quarter turn whose centre is one of the four places that unsigned `i`, `j` allow.
fn single_quadrant(from: Xy, to: Xy, i: f64, j: f64, counter: bool, lsb: f64) -> Arc {
    // A quarter turn may come out a little longer, for the rounding of its ends.
    let limit = std::f64::consts::FRAC_PI_2 + 0.02 + 4.0 * lsb / i.hypot(j).max(lsb);
    let candidates = [[1.0, 1.0], [1.0, -1.0], [-1.0, 1.0], [-1.0, -1.0]];
    let arcs = candidates.map(|s| Arc::about([from[0] + s[0] * i, from[1] + s[1] * j], from, to, counter));
    let misfit = |arc: &Arc| {
        let deviation = (arc.radius - arc.end_radius).abs();
        if arc.sweep.abs() <= limit { deviation } else { deviation + 1e18 }
    };
    arcs.into_iter().min_by(|a, b| misfit(a).total_cmp(&misfit(b))).unwrap_or(arcs[0])
}

/// A contour as contours that wind no point negatively.
fn settle(ring: Contour) -> Vec<Contour> {
    if ring.len() == 3 {
        return if signed_area(&ring) == 0.0 { Vec::new() } else { vec![positive(ring)] };
    }
    Region::from_contours(&[ring], Fill::NonZero).contours().cloned().collect()
}

fn count_points(object: &Object) -> u64 {
    object.contours.iter().map(|c| c.len() as u64).sum()
}

fn shifted(object: &Object, by: Point) -> Object {
    map_object(object, |p| Point::new(p.x + by.x, p.y + by.y), false, 1.0)
}

/// The object with `map` on every point; `flips` says that it turns orientation over, `scale` by how much it stretches.
fn map_object(object: &Object, map: impl Fn(&Point) -> Point, flips: bool, scale: f64) -> Object {
    let ring = |ring: &Contour| {
        let mut ring: Contour = ring.iter().map(&map).collect();
        if flips {
            ring.reverse();
        }
        ring
    };
    let kind = match &object.kind {
        Kind::Flash { at, diameter } => Kind::Flash { at: map(at), diameter: diameter.map(|d| d * scale) },
        Kind::Line { from, to, width } => Kind::Line { from: map(from), to: map(to), width: width * scale },
        Kind::Arc { path, width } => {
            Kind::Arc { path: path.iter().map(&map).collect(), width: width * scale }
        }
        Kind::Region => Kind::Region,
    };
    Object { contours: object.contours.iter().map(ring).collect(), kind, ..*object }
}
