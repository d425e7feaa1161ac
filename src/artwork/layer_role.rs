//! Which file is what: by the job, by `.FileFunction`, by the job file, or by a customary extension (a guess).

use crate::job::{LayerId, LayerKind, Stackup};

/// What a file holds.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Role {
    /// Conductor layer number `.0`, from 1 at the top.
    Conductor(u32),
    /// The top or bottom conductor, of however many there are.
    Outer(Side),
    /// Inner conductor number `.0` from the top, by extension; what 1 means depends on the set.
    Inner(u32),
    /// A layer named in the job.
    Layer(LayerId),
    /// Openings of the solder mask.
    Mask(Side),
    /// The board's outline.
    Profile,
    /// Holes.
    Drill(DrillRole),
    /// Of no electrical effect, or not modelled; the text says which.
    Ignored(&'static str),
}

/// Top or bottom.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Side {
    Top,
    Bottom,
}

/// What is said about a file of holes.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(super) struct DrillRole {
    /// `None`: not said.
    pub(super) plated: Option<bool>,
    /// Conductor layer numbers from 1.
    pub(super) span: Option<(u32, u32)>,
}

/// The role that the fields of `.FileFunction` (or of a job file's `FileFunction`) give.
pub(super) fn by_function(fields: &[String]) -> Option<Role> {
    let field = |k: usize| fields.get(k).map(|f| f.trim().to_ascii_lowercase()).unwrap_or_default();
    let side = |k: usize| match field(k).as_str() {
        "bot" | "bottom" => Side::Bottom,
        _ => Side::Top,
    };
    Some(match field(0).as_str() {
        "copper" => Role::Conductor(field(1).strip_prefix('l')?.parse().ok()?),
        "soldermask" => Role::Mask(side(1)),
        "profile" => Role::Profile,
        "plated" => Role::Drill(DrillRole { plated: Some(true), span: span(&field(1), &field(2)) }),
        "nonplated" => Role::Drill(DrillRole { plated: Some(false), span: span(&field(1), &field(2)) }),
        "mixedplating" => Role::Drill(DrillRole { plated: None, span: span(&field(1), &field(2)) }),
        "legend" => Role::Ignored("legend"),
        "paste" | "solderpaste" => Role::Ignored("solder paste"),
        "glue" => Role::Ignored("glue"),
        "carbonmask" => Role::Ignored("carbon ink, which conducts and is NOT modelled"),
        "goldmask" | "silvermask" | "tinmask" | "heatsinkmask" | "peelablemask" => {
            Role::Ignored("a finish mask")
        }
        "depthrout" => Role::Ignored("routing to depth, which is NOT modelled"),
        "vcut" | "vcutmap" => Role::Ignored("a V-cut"),
        "drillmap" => Role::Ignored("a drill map"),
        "component" | "pads" => Role::Ignored("component data"),
        "other" | "otherdrawing" | "fabricationdrawing" | "assemblydrawing" | "arraydrawing" | "viafill" => {
            Role::Ignored("a drawing")
        }
        _ => return None,
    })
}

fn span(from: &str, to: &str) -> Option<(u32, u32)> {
    from.parse().ok().zip(to.parse().ok())
}

/// The role that the customary extension of `name` gives; a guess.
pub(super) fn by_extension(name: &str) -> Option<Role> {
    let extension = name.rsplit_once('.')?.1.to_ascii_lowercase();
    Some(match extension.as_str() {
        "gtl" | "cmp" => Role::Outer(Side::Top),
        "gbl" | "sol" => Role::Outer(Side::Bottom),
        "gts" | "stc" => Role::Mask(Side::Top),
        "gbs" | "sts" => Role::Mask(Side::Bottom),
        "gto" | "gbo" | "plc" | "pls" => Role::Ignored("legend"),
        "gtp" | "gbp" | "crc" | "crs" => Role::Ignored("solder paste"),
        "gko" | "gm" | "gml" | "oln" => Role::Profile,
        "gm1" => Role::Profile,
        "gd1" | "gg1" | "gpt" | "gpb" | "gwk" => Role::Ignored("a drawing"),
        other => {
            let digits = other.strip_prefix("gl").or_else(|| other.strip_prefix("gp"));
            let digits = digits.or_else(|| other.strip_prefix('g'))?;
            if digits.starts_with('m') {
                return None;
            }
            let digits = digits.strip_suffix('l').unwrap_or(digits);
            Role::Inner(digits.parse().ok()?)
        }
    })
}

/// The conductor with number `number` from 1 at the top.
pub(super) fn conductor(stackup: &Stackup, number: u32) -> Option<LayerId> {
    stackup.conductors().nth(usize::try_from(number.checked_sub(1)?).ok()?)
}

/// The coatings on a side of the board.
pub(super) fn coatings(stackup: &Stackup, side: Side) -> Vec<LayerId> {
    let Some(first_conductor) = stackup.conductors().next() else { return Vec::new() };
    let is_coating = |id: &LayerId| matches!(stackup.get(*id).kind, LayerKind::Coating { .. });
    let on_side = |id: &LayerId| match side {
        Side::Top => *id < first_conductor,
        Side::Bottom => *id > first_conductor,
    };
    stackup.iter().map(|(id, _)| id).filter(is_coating).filter(on_side).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn function(text: &str) -> Option<Role> {
        let fields: Vec<String> = text.split(',').map(str::to_owned).collect();
        by_function(&fields)
    }

    #[test]
    fn roles_by_function_and_extension() {
        assert_eq!(function("Copper,L4,Bot"), Some(Role::Conductor(4)));
        assert_eq!(function("Soldermask,Bot"), Some(Role::Mask(Side::Bottom)));
        assert_eq!(function("SolderMask,Top"), Some(Role::Mask(Side::Top)));
        let plated = DrillRole { plated: Some(true), span: Some((1, 4)) };
        assert_eq!(function("Plated,1,4,PTH"), Some(Role::Drill(plated)));
        assert_eq!(by_extension("PCB1.GTL"), Some(Role::Outer(Side::Top)));
        assert_eq!(by_extension("PCB1.G2"), Some(Role::Inner(2)));
        assert_eq!(by_extension("PCB1.GM"), Some(Role::Profile));
        assert_eq!(by_extension("top.gbr"), None);
    }
}
