//! Formulas of one flat panel and one point, or of two panels; no mesh, no storage.
