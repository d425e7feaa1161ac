//! `capacitance.csv` and `neighbours.csv`: one number a line, so that any sheet can pivot them.

use crate::extract::Extraction;
use crate::report::ReportError;
use crate::report::figures::{stable, stable_bar};
use crate::report::values::{self, Barred};

/// Every pair of row nets with its Maxwell entry and its mutual capacitance (with itself: to the reference).
pub(crate) fn capacitance(x: &Extraction) -> Result<String, ReportError> {
    let names = values::row_names(x);
    let mut writer = csv::Writer::from_writer(Vec::new());
    writer.write_record(["net_i", "net_j", "maxwell_F", "maxwell_bar_F", "mutual_F", "mutual_bar_F"])?;
    for (i, a) in names.iter().enumerate() {
        for (j, b) in names.iter().enumerate() {
            let scale = values::scale(x, i, j);
            let maxwell = cells(values::maxwell(x, i, j), scale);
            let mutual = cells(values::mutual(x, i, j), scale);
            writer.write_record([a, b, &*maxwell[0], &*maxwell[1], &*mutual[0], &*mutual[1]])?;
        }
    }
    finish(writer)
}

/// Every neighbour of every row net, the most charged first.
pub(crate) fn neighbours(x: &Extraction) -> Result<String, ReportError> {
    let mut writer = csv::Writer::from_writer(Vec::new());
    writer.write_record(["net", "neighbour", "role", "capacitance_F", "bar_F"])?;
    for (row, name) in values::row_names(x).into_iter().enumerate() {
        for neighbour in values::neighbours(x, row) {
            let [value, bar] = cells(neighbour.capacitance, values::scale(x, row, row));
            writer.write_record([name, &neighbour.name, values::role_word(neighbour.role), &value, &bar])?;
        }
    }
    finish(writer)
}

fn cells(number: Barred, scale: f64) -> [String; 2] {
    [format!("{:e}", stable(number.value, number.bar, scale)), format!("{:e}", stable_bar(number.bar))]
}

fn finish(writer: csv::Writer<Vec<u8>>) -> Result<String, ReportError> {
    let bytes = writer.into_inner().map_err(|error| csv::Error::from(error.into_error()))?;
    Ok(String::from_utf8_lossy(&bytes).into_owned())
}
