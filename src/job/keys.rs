//! Every key of both files, section by section. Readers refuse what is not listed here, and a test holds the JSON
//! Schemas to the same lists.

/// The keys of one kind of table.
#[derive(Debug)]
pub(super) struct KeySet {
    /// How messages call the table.
    pub(super) name: &'static str,
    /// Its keys.
    pub(super) keys: &'static [&'static str],
}

pub(super) const JOB: KeySet = KeySet {
    name: "the job file",
    keys: &["title", "stackup", "frequency", "artwork", "shape", "region", "nets", "materials", "accuracy"],
};

pub(super) const ARTWORK: KeySet = KeySet { name: "`[artwork]`", keys: &["folder", "files", "netlist"] };

pub(super) const FILE: KeySet = KeySet {
    name: "an entry of `files`",
    keys: &["path", "layer", "role", "plated", "from", "to", "hole", "plating"],
};

pub(super) const SHAPE: KeySet = KeySet {
    name: "`[[shape]]`",
    keys: &["net", "layer", "through", "rectangle", "circle", "polygon", "stroke", "holes"],
};

pub(super) const HOLE: KeySet =
    KeySet { name: "an entry of `holes`", keys: &["rectangle", "circle", "polygon", "stroke"] };

pub(super) const RECTANGLE: KeySet = KeySet { name: "`rectangle`", keys: &["from", "to"] };

pub(super) const CIRCLE: KeySet = KeySet { name: "`circle`", keys: &["at", "diameter"] };

pub(super) const STROKE: KeySet = KeySet { name: "`stroke`", keys: &["path", "width"] };

pub(super) const REGION: KeySet = KeySet { name: "`[region]`", keys: &["around", "margin", "window"] };

pub(super) const NETS: KeySet = KeySet {
    name: "`[nets]`",
    keys: &["ground", "rows", "others", "float", "join", "label", "ground_plane"],
};

pub(super) const FLOAT: KeySet = KeySet { name: "an entry of `float`", keys: &["net", "charge"] };

pub(super) const LABEL: KeySet = KeySet { name: "an entry of `label`", keys: &["net", "layer", "at"] };

pub(super) const MATERIAL: KeySet = KeySet {
    name: "a material",
    keys: &["er", "loss_tangent", "strength", "thickness", "depth_on_copper", "prepreg"],
};

pub(super) const ACCURACY: KeySet = KeySet { name: "`[accuracy]`", keys: &["target", "floor"] };

pub(super) const STACKUP: KeySet = KeySet { name: "the stackup file", keys: &["layer"] };

pub(super) const LAYER: KeySet = KeySet {
    name: "`[[layer]]`",
    keys: &[
        "name",
        "kind",
        "er",
        "material",
        "loss_tangent",
        "conductivity",
        "strength",
        "thickness",
        "prepreg",
        "fill",
        "pattern",
        "side_slope",
        "wide_face",
        "etch_bias",
        "depth_on_laminate",
        "depth_on_copper",
        "depth_beside_copper",
        "tolerance",
    ],
};

pub(super) const TOLERANCE: KeySet = KeySet {
    name: "`tolerance`",
    keys: &[
        "er",
        "thickness",
        "side_slope",
        "etch_bias",
        "depth_on_laminate",
        "depth_on_copper",
        "depth_beside_copper",
    ],
};

/// Which keys of [`LAYER`] each kind of layer takes, beside `name`, `kind` and `tolerance`.
pub(super) const LAYER_KINDS: [(&str, &[&str]); 4] = [
    ("open", &["er", "material", "loss_tangent", "conductivity", "strength"]),
    (
        "coating",
        &[
            "er",
            "material",
            "loss_tangent",
            "conductivity",
            "strength",
            "depth_on_laminate",
            "depth_on_copper",
            "depth_beside_copper",
        ],
    ),
    ("conductor", &["thickness", "fill", "side_slope", "wide_face", "etch_bias"]),
    (
        "dielectric",
        &[
            "er",
            "material",
            "loss_tangent",
            "conductivity",
            "strength",
            "thickness",
            "prepreg",
            "fill",
            "pattern",
        ],
    ),
];
