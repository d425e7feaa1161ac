//! [`Extraction`](crate::extract::Extraction) to text: summary, JSON, CSV, SPICE.
