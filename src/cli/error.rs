//! What can stop the command besides the stages: files that cannot be read or written.

use std::path::PathBuf;

/// Why the command could not do what it was asked.
#[derive(Debug, thiserror::Error, miette::Diagnostic)]
#[non_exhaustive]
pub enum CliError {
    /// An input file cannot be read.
    #[error("cannot read {role} `{}`: {source}", path.display())]
    #[diagnostic(code("cli::read"), help("{}", read_help(*from_job)))]
    Read {
        /// What the file is for.
        role: &'static str,
        /// Its path, as it was looked for.
        path: PathBuf,
        /// Whether the path was taken relative to the job file.
        from_job: PathOrigin,
        /// What the system says.
        source: std::io::Error,
    },
    /// A text file is not UTF-8.
    #[error("{role} `{}` is not UTF-8 text: byte {offset} cannot be read", path.display())]
    #[diagnostic(code("cli::not_utf8"), help("save the file as UTF-8, or check that it is the right file"))]
    NotUtf8 {
        /// What the file is for.
        role: &'static str,
        /// Its path.
        path: PathBuf,
        /// Offset of the first byte that is no text.
        offset: usize,
    },
    /// The output cannot be written.
    #[error("cannot write `{}`: {source}", path.display())]
    #[diagnostic(code("cli::write"), help("give `--out` a directory that can be written to"))]
    Write {
        /// The file or directory.
        path: PathBuf,
        /// What the system says.
        source: std::io::Error,
    },
    /// The thread pool cannot be started.
    #[error("cannot start {threads} threads: {reason}")]
    #[diagnostic(code("cli::threads"), help("give `--threads` a smaller number"))]
    Threads {
        /// How many were asked for.
        threads: usize,
        /// What the pool says.
        reason: String,
    },
}

/// Where a path came from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PathOrigin {
    /// Given on the command line.
    CommandLine,
    /// Written in the job file, and relative to it.
    Job,
}

fn read_help(origin: PathOrigin) -> &'static str {
    match origin {
        PathOrigin::CommandLine => "check the path; it is taken relative to the current directory",
        PathOrigin::Job => {
            "check the path in the job file; it is taken relative to the folder of the job file"
        }
    }
}
