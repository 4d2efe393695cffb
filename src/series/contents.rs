//! What stands in the group: its arrays, their meanings, and a frame as chunks.

use blake3::{Hash, Hasher};
use ndarray::Array2;
use serde_json::{Map, Value, json};

use super::record::LENGTH;
use crate::field::{Status, VectorField};
use crate::store::zarr::{ArrayMetadata, Element, decode, encode, group_document};

/// The arrays with a chunk for each frame, in the order their chunks are hashed.
pub(super) const FRAME_ARRAYS: [&str; 5] = ["u", "v", "u_unc", "v_unc", "status"];

/// The array of records.
pub(super) const RECORD: &str = "record";

/// The attribute by which a group is known as a series.
pub(super) const BASIS: &str = "made_by";

/// Codes of the status array are places in this list.
const STATUSES: [Status; 4] = [
    Status::Measured,
    Status::Replaced,
    Status::Masked,
    Status::Outside,
];

/// The code of a vector whose frame has not been computed.
const NOT_COMPUTED: u8 = 255;

/// Dimensions of the arrays that have a chunk for each frame.
pub(super) fn dimensions(array: &str) -> usize {
    if array == RECORD { 2 } else { 3 }
}

/// The metadata of the group itself; `masks` are the different masks and which of them each pair
/// has.
pub(super) fn group(
    blank: &VectorField,
    basis: &Value,
    labels: &[String],
    masks: Option<(Value, Value)>,
) -> Value {
    let mut attributes = object(json!({
        "title": "vector fields of a recording of seeded flow",
        "axes": "x to the right, y upwards; the first row is the lowest",
        BASIS: basis,
        "pair_labels": labels,
    }));
    if let Some((width, height)) = blank.window {
        attributes.insert("window_size".to_owned(), json!([width, height]));
        attributes.insert(
            "window_size_units".to_owned(),
            json!(blank.grid.length.to_string()),
        );
    }
    if let Some((masks, of_pairs)) = masks {
        attributes.insert("masks".to_owned(), masks);
        attributes.insert("pair_masks".to_owned(), of_pairs);
    }
    group_document(attributes)
}

/// The arrays that have no frames: names, metadata and the bytes of their one chunk.
pub(super) fn coordinates(
    blank: &VectorField,
    pairs: usize,
) -> Vec<(&'static str, Value, Vec<u8>)> {
    let grid = &blank.grid;
    let length = grid.length.to_string();
    let float = |shape: Vec<usize>, dimensions: Vec<&'static str>, attributes| {
        let metadata = ArrayMetadata {
            element: Element::Float64,
            chunk: shape.clone(),
            shape,
            dimensions,
            attributes: object(attributes),
        };
        metadata.document()
    };
    let along = |name, axis, about: &str, values: Vec<f64>| {
        let attributes = json!({ "units": length, "axis": axis, "long_name": about });
        (
            name,
            float(vec![values.len()], vec![name], attributes),
            encode(&values),
        )
    };
    let pair = ArrayMetadata {
        element: Element::Int64,
        shape: vec![pairs],
        chunk: vec![pairs],
        dimensions: vec!["pair"],
        attributes: object(json!({ "long_name": "pair of exposures, from 0" })),
    };
    let numbers = (0..pairs as i64).flat_map(|k| k.to_le_bytes()).collect();
    let x = (0..grid.nx).map(|i| grid.x(i)).collect();
    let y = (0..grid.ny).map(|j| grid.y(j)).collect();
    let mut arrays = vec![
        along("x", "X", "position to the right", x),
        along("y", "Y", "position upwards", y),
        ("pair", pair.document(), numbers),
    ];
    if let Some(correlation) = &blank.error_correlation {
        let values = correlation.values();
        let attributes = json!({
            "long_name": "correlation of the errors of two vectors, by rows and columns apart",
            "units": "1",
        });
        let (rows, columns) = values.dim();
        let dimensions = vec!["rows_apart", "columns_apart"];
        let document = float(vec![rows, columns], dimensions, attributes);
        arrays.push(("error_correlation", document, encode(values)));
    }
    arrays
}

/// Metadata of an array with a chunk for each frame.
pub(super) fn frame_array(name: &str, blank: &VectorField, pairs: usize) -> Value {
    let (ny, nx) = blank.grid.shape();
    let velocity = |about: &str, beside: &str| {
        json!({
            "long_name": about,
            "units": blank.unit().to_string(),
            "ancillary_variables": beside,
        })
    };
    let attributes = match name {
        "u" => velocity("velocity to the right", "u_unc status"),
        "v" => velocity("velocity upwards", "v_unc status"),
        "u_unc" => velocity("standard uncertainty of u", "status"),
        "v_unc" => velocity("standard uncertainty of v", "status"),
        RECORD => json!({
            "long_name": "what each frame was made from: BLAKE3 hashes of the plan, calibration \
                and program (bytes 0 to 31), of the pixels of both exposures and which of them \
                are hidden (32 to 63), and of the chunks u, v, u_unc, v_unc, status (64 to 95)",
        }),
        _ => json!({
            "long_name": "what each vector is worth",
            "flag_values": [0, 1, 2, 3, NOT_COMPUTED],
            "flag_meanings": "measured replaced masked outside not_computed",
        }),
    };
    let (element, frame, dimensions) = match name {
        RECORD => (Element::Byte, vec![LENGTH], vec!["pair", "record_byte"]),
        "status" => (Element::Byte, vec![ny, nx], vec!["pair", "y", "x"]),
        _ => (Element::Float64, vec![ny, nx], vec!["pair", "y", "x"]),
    };
    let with = |first: usize| {
        std::iter::once(first)
            .chain(frame.iter().copied())
            .collect()
    };
    let metadata = ArrayMetadata {
        element,
        shape: with(pairs),
        chunk: with(1),
        dimensions,
        attributes: object(attributes),
    };
    metadata.document()
}

fn object(value: Value) -> Map<String, Value> {
    match value {
        Value::Object(map) => map,
        _ => Map::new(),
    }
}

/// One frame as the bytes of its chunks, in the order of [`FRAME_ARRAYS`].
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Chunks(pub [Vec<u8>; 5]);

impl Chunks {
    /// The chunks of a field.
    pub(super) fn of(field: &VectorField) -> Self {
        let unknown = || encode(&vec![f64::NAN; field.u.len()]);
        let (u_unc, v_unc) = match &field.unc {
            Some((u, v)) => (encode(u), encode(v)),
            None => (unknown(), unknown()),
        };
        let code = |status: &Status| {
            let place = STATUSES.iter().position(|s| s == status);
            place.map_or(NOT_COMPUTED, |place| place as u8)
        };
        let status = field.status.iter().map(code).collect();
        Self([encode(&field.u), encode(&field.v), u_unc, v_unc, status])
    }

    /// Hash of all five, each with its length.
    pub(super) fn hash(&self) -> Hash {
        let mut hasher = Hasher::new();
        for chunk in &self.0 {
            hasher.update(&(chunk.len() as u64).to_le_bytes());
            hasher.update(chunk);
        }
        hasher.finalize()
    }

    /// The field they hold, with the grid and units of `blank`; `None` where the sizes do not fit
    /// the grid or a status has no meaning.
    pub(super) fn field(&self, blank: &VectorField, label: &str) -> Option<VectorField> {
        let shape = blank.grid.shape();
        let numbers = |bytes: &[u8]| Array2::from_shape_vec(shape, decode(bytes)).ok();
        let status = |code: &u8| STATUSES.get(usize::from(*code)).copied();
        let [u, v, u_unc, v_unc, codes] = &self.0;
        let statuses = codes.iter().map(status).collect::<Option<Vec<_>>>()?;
        Some(VectorField {
            u: numbers(u)?,
            v: numbers(v)?,
            unc: Some((numbers(u_unc)?, numbers(v_unc)?)),
            status: Array2::from_shape_vec(shape, statuses).ok()?,
            label: label.to_owned(),
            ..blank.clone()
        })
    }
}
