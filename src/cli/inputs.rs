//! Which artwork files a job means: those it lists, those in its folder, the patterns of its stackup.

use std::path::{Path, PathBuf};

use crate::artwork::InputFile;
use crate::cli::error::{CliError, PathOrigin};
use crate::cli::failure::Failure;
use crate::cli::pipeline::Plan;
use crate::cli::sources::Sources;
use crate::job::{FileContent, LayerKind, Named};

/// Reads every artwork file of the plan: listed files first, in their order, then the folder's, by name.
///
/// # Errors
/// [`Failure::Command`] when one cannot be read.
pub(crate) fn gather(plan: &Plan, sources: &mut Sources) -> Result<Vec<InputFile>, Failure> {
    let mut inputs = Inputs { files: Vec::new(), seen: vec![canonical(&plan.job_path)] };
    let folder = plan.folder();
    for file in &plan.job.artwork.files {
        inputs.named(&folder, &file.path, file.content.clone(), sources)?;
    }
    for layer in &plan.stackup.layers {
        if let LayerKind::Dielectric { pattern: Some(pattern), .. } = &layer.kind {
            let content = FileContent::Layer(Named { name: layer.name.clone(), origin: pattern.origin });
            inputs.named(&folder, pattern, content, sources)?;
        }
    }
    if plan.stackup_is_job_file {
        // It says which file is which layer.
        inputs.named(&folder, &plan.job.stackup, FileContent::Unsaid, sources)?;
    }
    if let Some(named) = &plan.job.artwork.folder {
        let path = folder.join(&named.name);
        let failed = |source| {
            let error = CliError::Read {
                role: "the artwork folder",
                path: path.clone(),
                from_job: PathOrigin::Job,
                source,
            };
            Failure::Command(error, named.origin)
        };
        let mut found = Vec::new();
        for entry in std::fs::read_dir(&path).map_err(failed)? {
            found.push(entry.map_err(failed)?.path());
        }
        found.sort();
        for path in found.into_iter().filter(|path| path.is_file() && !is_hidden(path)) {
            inputs.add(&path, FileContent::Unsaid, sources)?;
        }
    }
    Ok(inputs.files)
}

struct Inputs {
    files: Vec<InputFile>,
    /// What is not to be read again.
    seen: Vec<PathBuf>,
}

impl Inputs {
    /// A file that the job names; a failure points at that line.
    fn named(
        &mut self,
        folder: &Path,
        named: &Named,
        content: FileContent,
        sources: &mut Sources,
    ) -> Result<(), Failure> {
        self.add(&folder.join(&named.name), content, sources)
            .map_err(|error| Failure::Command(error, named.origin))
    }

    fn add(&mut self, path: &Path, content: FileContent, sources: &mut Sources) -> Result<(), CliError> {
        let own = canonical(path);
        // A drill file may be listed more than once, each time with another span.
        if matches!(content, FileContent::Unsaid) && self.seen.contains(&own) {
            return Ok(());
        }
        let file = sources.read(path, "the artwork file", PathOrigin::Job)?;
        let (name, bytes) = (sources.name(file), sources.bytes(file).to_vec());
        self.files.push(InputFile { file, name, bytes, content });
        self.seen.push(own);
        Ok(())
    }
}

/// The path by which a file is known again; as given when the system cannot say.
fn canonical(path: &Path) -> PathBuf {
    std::fs::canonicalize(path).unwrap_or_else(|_| path.to_owned())
}

fn is_hidden(path: &Path) -> bool {
    path.file_name().is_some_and(|name| name.to_string_lossy().starts_with('.'))
}
