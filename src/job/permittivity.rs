//! Relative permittivity as a number, or as a table over frequency of which one value is chosen.

use crate::job::error::JobProblem;
use crate::job::section::{Item, Notes};
use crate::units::{Unit, brief};

/// The largest permittivity taken for one: far above every ferroelectric, so that a slip stands out.
pub(super) const LARGEST_ER: f64 = 1e9;

/// A permittivity and what vouches for it.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Er {
    pub(super) value: f64,
    /// "stackup", "job", or with the frequency of the table.
    pub(super) source: String,
}

/// `er` as written: a number, or pairs of frequency and number.
///
/// - `frequency`: Hz, at which a table is read.
/// - `source`: who states it, "stackup" or "job".
pub(super) fn read_er(item: Item<'_>, frequency: Option<f64>, source: &str, notes: &mut Notes) -> Option<Er> {
    if !item.is_list() {
        let value = er_number(item, notes)?;
        return Some(Er { value, source: source.to_owned() });
    }
    let entries = item.list("a number or a list of [frequency, er] pairs", notes)?;
    let n_entries = entries.len();
    let pairs: Vec<(f64, f64)> = entries.into_iter().filter_map(|entry| read_pair(entry, notes)).collect();
    if n_entries == 0 {
        item.list_length(0, "one [frequency, er] pair or more", notes);
    }
    if pairs.len() < n_entries {
        return None;
    }
    if let Some(pair) = pairs.windows(2).find(|pair| pair[1].0 <= pair[0].0) {
        let [low, high] = [pair[0].0, pair[1].0].map(|f| brief(f, Unit::Frequency));
        item.out_of_range(format!("{high} after {low}"), "frequencies in increasing order", notes);
        return None;
    }
    let (value, place) = choose(&pairs, frequency)?;
    if let Some(f) = frequency.filter(|_| place == Place::Beyond) {
        notes.warn(
            format!(
                "the table of `er` does not reach {}; its nearest entry is used",
                brief(f, Unit::Frequency)
            ),
            item.span(),
        );
    }
    Some(Er { value, source: format!("{source}, table {}", describe(place, &pairs, frequency)) })
}

fn er_number(item: Item<'_>, notes: &mut Notes) -> Option<f64> {
    let value = item.number(notes)?;
    if value > 0.0 && value <= LARGEST_ER {
        if value < 1.0 {
            let text = format!("`er` of {value} is below that of vacuum: no static permittivity is");
            notes.warn(text, item.span());
        }
        return Some(value);
    }
    let at = item.span().into();
    notes.problem(JobProblem::Permittivity { key: item.key, found: value.to_string(), at });
    None
}

fn read_pair(entry: Item<'_>, notes: &mut Notes) -> Option<(f64, f64)> {
    let pair = entry.list("a pair such as [\"1 GHz\", 4.2]", notes)?;
    let [frequency, er] = pair.as_slice() else {
        entry.list_length(pair.len(), "two values, frequency and er", notes);
        return None;
    };
    let f = frequency.quantity(Unit::Frequency, notes);
    let er = er_number(*er, notes);
    let f = f?;
    if f <= 0.0 {
        frequency.out_of_range(brief(f, Unit::Frequency), "more than 0 Hz", notes);
        return None;
    }
    Some((f, er?))
}

/// Where in its table a value was found.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Place {
    /// The lowest entry, since no frequency is given.
    Lowest,
    /// Between two entries, or on one.
    Inside,
    /// An end of the table, since the frequency lies outside.
    Beyond,
}

/// The value of the table at `frequency`: linear in er over the logarithm of frequency, the nearest end outside.
fn choose(pairs: &[(f64, f64)], frequency: Option<f64>) -> Option<(f64, Place)> {
    let (first, last) = (pairs.first()?, pairs.last()?);
    let Some(f) = frequency else {
        return Some((first.1, Place::Lowest));
    };
    if f < first.0 {
        return Some((first.1, Place::Beyond));
    }
    if f > last.0 {
        return Some((last.1, Place::Beyond));
    }
    let above = pairs.iter().position(|pair| f <= pair.0)?;
    let high = pairs[above];
    if above == 0 || f >= high.0 {
        return Some((high.1, Place::Inside));
    }
    let low = pairs[above - 1];
    let share = (f / low.0).ln() / (high.0 / low.0).ln();
    Some((low.1 + share * (high.1 - low.1), Place::Inside))
}

fn describe(place: Place, pairs: &[(f64, f64)], frequency: Option<f64>) -> String {
    let show = |f: f64| brief(f, Unit::Frequency);
    let (lowest, highest) = match (pairs.first(), pairs.last()) {
        (Some(first), Some(last)) => (first.0, last.0),
        _ => return String::new(),
    };
    match (place, frequency) {
        (Place::Inside, Some(f)) => format!("at {}", show(f)),
        (Place::Beyond, Some(f)) => format!("at {}", show(if f < lowest { lowest } else { highest })),
        _ => format!("at {} (no frequency given)", show(lowest)),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// What: log-frequency interpolation. Derived: halfway in log f (10 MHz between 1 and 100 MHz) is halfway in er.
    /// Tolerance: 4 EPSILON * er, two logarithms and a product. Seen to fail with: share linear in f.
    #[test]
    fn interpolates_over_log_frequency() {
        let pairs = [(1e6, 4.6), (1e8, 4.2), (1e9, 4.0)];
        let (er, place) = choose(&pairs, Some(1e7)).unwrap();
        assert!((er - 4.4).abs() <= 4.0 * f64::EPSILON * 4.4, "{er}");
        assert_eq!(place, Place::Inside);
        assert_eq!(choose(&pairs, Some(1e8)), Some((4.2, Place::Inside)));
        assert_eq!(choose(&pairs, Some(1e6)), Some((4.6, Place::Inside)));
        assert_eq!(choose(&pairs, Some(1e9)), Some((4.0, Place::Inside)));
        assert_eq!(choose(&pairs, Some(1e3)), Some((4.6, Place::Beyond)));
        assert_eq!(choose(&pairs, Some(1e10)), Some((4.0, Place::Beyond)));
        assert_eq!(choose(&pairs, None), Some((4.6, Place::Lowest)));
    }
}
