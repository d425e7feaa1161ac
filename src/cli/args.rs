//! The words on the command line, as clap reads them. What they mean is settled in the rooms beside.

use clap::{Parser, Subcommand, ValueEnum};
use std::num::NonZeroUsize;
use std::path::PathBuf;

/// Capacitance and charge of circuit boards and micromachined parts, from their fabrication files.
#[derive(Debug, Clone, PartialEq, Parser)]
#[command(name = "chargeskin", version, arg_required_else_help = true)]
pub struct Args {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
    /// Number of threads
    ///
    /// Number of threads to compute with; all processors when left out. Results do not depend on it.
    #[arg(long, global = true, value_name = "N")]
    pub threads: Option<NonZeroUsize>,
    /// Print nothing but errors
    ///
    /// Print neither progress nor warnings nor the summary: only errors, and what `inspect` and `schema` are asked for.
    #[arg(long, global = true)]
    pub quiet: bool,
}

/// What to do.
#[derive(Debug, Clone, PartialEq, Eq, Subcommand)]
pub enum Command {
    /// Show what a job holds, solve nothing
    ///
    /// Show the layers, nets, areas, drills and shorts of the region, and what solving it would take. Solves nothing.
    Inspect {
        /// The job file (TOML)
        job: PathBuf,
        /// Print JSON
        ///
        /// Print the same as JSON, in SI units.
        #[arg(long)]
        json: bool,
    },
    /// Compute the capacitance matrix and the charges
    ///
    /// Compute the Maxwell capacitance matrix and the free and bound charges with their error bars. Prints a summary and
    /// writes result.json, capacitance.csv, neighbours.csv and capacitance.cir. Exit code 1 when a physical check failed
    /// or the accuracy target was not met, 2 when nothing was computed.
    Extract {
        /// The job file (TOML)
        job: PathBuf,
        /// Directory to write into
        ///
        /// Directory to write the result files into; made when it is not there. Files of an earlier run are replaced, all of
        /// them or none.
        #[arg(long, value_name = "DIR")]
        out: PathBuf,
    },
    /// Print the JSON Schema of an input file
    ///
    /// Print the JSON Schema of the job file or of the stackup file, for editors that complete and check TOML by schema.
    Schema {
        /// Which file
        kind: SchemaChoice,
    },
}

/// An input file that has a schema.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum SchemaChoice {
    /// The job file.
    Job,
    /// The stackup file.
    Stackup,
}
