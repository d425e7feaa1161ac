//! What can stop a report.

/// Why a report could not be printed.
#[derive(Debug, thiserror::Error, miette::Diagnostic)]
#[non_exhaustive]
pub enum ReportError {
    /// The JSON printer refused.
    #[error("the result cannot be printed as JSON")]
    #[diagnostic(code("report::json"), help("this is a fault of the program: report it with the job"))]
    Json(#[from] serde_json::Error),
    /// The CSV printer refused.
    #[error("the result cannot be printed as CSV")]
    #[diagnostic(code("report::csv"), help("this is a fault of the program: report it with the job"))]
    Csv(#[from] ::csv::Error),
}
