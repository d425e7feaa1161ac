//! Runs a command: what is printed where, and what the exit code says.

use std::io::{IsTerminal as _, Write as _};
use std::path::Path;
use std::process::ExitCode;

use clap::Parser as _;

use crate::cli::args::{Args, Command, SchemaChoice};
use crate::cli::error::CliError;
use crate::cli::failure::Failure;
use crate::cli::pipeline::{build_model, read_plan, solve};
use crate::cli::progress::ProgressLine;
use crate::cli::render::Colour;
use crate::cli::sources::Sources;
use crate::cli::{inspection, memory, output};
use crate::extract::{self, ExtractOptions, Extraction};
use crate::job::{SchemaKind, Stackup, schema};
use crate::report::{self, Notes, StackupTolerance};

/// How a run that did something ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Outcome {
    /// All is well.
    Done,
    /// The answer is there, but a check failed or the target was not met.
    Doubtful,
}

/// Reads the words of the command line, does what they say, and turns the outcome into an exit code.
#[must_use]
pub fn main() -> ExitCode {
    let args = match Args::try_parse() {
        Ok(args) => args,
        Err(words) => {
            let code = if words.use_stderr() { 2 } else { 0 };
            // Nobody is left to tell when the terminal is gone.
            let _ = words.print();
            return ExitCode::from(code);
        }
    };
    let mut sources = Sources::default();
    match run(&args, &mut sources) {
        Ok(Outcome::Done) => ExitCode::SUCCESS,
        Ok(Outcome::Doubtful) => ExitCode::from(1),
        Err(failure) => {
            say(&failure.render(&sources, colour()));
            ExitCode::from(2)
        }
    }
}

fn run(args: &Args, sources: &mut Sources) -> Result<Outcome, Failure> {
    if let Some(threads) = args.threads {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads.get()).build_global();
        pool.map_err(|error| CliError::Threads { threads: threads.get(), reason: error.to_string() })?;
    }
    match &args.command {
        Command::Inspect { job, json } => {
            let model = build_model(read_plan(job, sources)?, sources)?;
            let found = inspection::inspect(&model, &options(), sources);
            let text = if *json { report::inspect::json(&found)? } else { report::inspect::text(&found) };
            print(&text)?;
            Ok(Outcome::Done)
        }
        Command::Extract { job, out } => run_extract(job, out, args.quiet, sources),
        Command::Schema { kind } => {
            let kind = match kind {
                SchemaChoice::Job => SchemaKind::Job,
                SchemaChoice::Stackup => SchemaKind::Stackup,
            };
            let mut text = schema(kind);
            if !text.ends_with('\n') {
                text.push('\n');
            }
            print(&text)?;
            Ok(Outcome::Done)
        }
    }
}

fn run_extract(job: &Path, out: &Path, quiet: bool, sources: &mut Sources) -> Result<Outcome, Failure> {
    let plan = read_plan(job, sources)?;
    output::prepare(out)?;
    let model = build_model(plan, sources)?;
    let options = options();
    let prepared = extract::prepare(&model.slabs, &options)?;
    if !quiet {
        let cost = inspection::cost(prepared.expectation(&options));
        say(&format!("to solve: {}\n", cost.line()));
    }
    let line = ProgressLine::new(!quiet);
    let solved = solve(&model, prepared, &options, &|progress| line.tell(progress));
    line.finish();
    let mut extraction = solved?;
    extraction.solver.peak_memory = memory::peak();
    for warning in &mut extraction.warnings {
        warning.text = sources.warning(warning);
    }
    let notes = Notes { stackup_tolerance: tolerance(&model.plan.stackup) };
    output::write_all(out, &report::files(&extraction, notes)?)?;
    if !quiet {
        print(&report::summary(&extraction, notes))?;
    }
    Ok(outcome(&extraction))
}

/// Exit code 1 when a physical check failed or the target was not met.
fn outcome(extraction: &Extraction) -> Outcome {
    let failed = extraction.results.checks.iter().any(|check| check.passed() == Some(false));
    if failed || !extraction.target_met { Outcome::Doubtful } else { Outcome::Done }
}

fn tolerance(stackup: &Stackup) -> StackupTolerance {
    if stackup.layers.iter().all(|layer| layer.tolerance.is_empty()) {
        StackupTolerance::NotGiven
    } else {
        StackupTolerance::NotUsedYet
    }
}

/// The defaults, within the memory that is free now.
fn options() -> ExtractOptions {
    let defaults = ExtractOptions::default();
    ExtractOptions {
        max_memory: memory::available().map_or(defaults.max_memory, |free| free.min(defaults.max_memory)),
        threads: rayon::current_num_threads(),
        ..defaults
    }
}

/// Results go to standard output.
fn print(text: &str) -> Result<(), CliError> {
    match std::io::stdout().lock().write_all(text.as_bytes()) {
        // Whoever reads has seen enough, as with `| head`.
        Err(error) if error.kind() == std::io::ErrorKind::BrokenPipe => Ok(()),
        written => written.map_err(|source| CliError::Write { path: "standard output".into(), source }),
    }
}

/// All else goes to standard error; when that is gone, nobody is left to tell.
fn say(text: &str) {
    let _ = std::io::stderr().lock().write_all(text.as_bytes());
}

fn colour() -> Colour {
    let refused = std::env::var_os("NO_COLOR").is_some_and(|value| !value.is_empty());
    if refused || !std::io::stderr().is_terminal() { Colour::Off } else { Colour::On }
}
