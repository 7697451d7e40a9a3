//! `epiloom gather`: one archive of the parts of a run.

use std::num::NonZeroUsize;
use std::path::PathBuf;

use crate::archive::{Archive, Parts, Writer};
use crate::diagnostics::{Diagnostic, SourceText, codes};
use crate::language::{self, RunOptions};

use super::archived::{archived_script, overrides};
use super::exit::Exit;
use super::holder::Holder;
use super::output::Output;
use super::recorder::{Recorder, header};
use super::run_script::{claim_error, end, ending, may_replace, stop_on_interrupt};
use super::show::open;

/// `epiloom gather PART... -o whole.epiloom`.
#[derive(clap::Args, Debug)]
#[command(after_help = "\
The parts must be of one script, with the same inputs, data files and version, each finished and each there once; what is
missing is named. Then the script runs with all points stored, so that what follows the sweeps is solved here, and the
archive is the same to the byte as that of a single run. Stopped and started again it goes on from what it has copied.

    for k in 1 2 3 4; do epiloom run map.rhai --part $k/4; done
    epiloom gather map.part-*-of-4.epiloom -o map.epiloom")]
pub struct Gather {
    /// The archives of the parts
    #[arg(required = true, value_hint = clap::ValueHint::FilePath)]
    pub parts: Vec<PathBuf>,
    /// The archive to write
    #[arg(short, long, value_name = "FILE.epiloom")]
    pub out: PathBuf,
    /// The folder of the script's data files, if it reads any [default: the folder of the first part]
    #[arg(long, value_name = "DIR", value_hint = clap::ValueHint::DirPath)]
    pub data: Option<PathBuf>,
    /// A folder outside it that data files lay in, as it was given to the run
    #[arg(long, value_name = "DIR", value_hint = clap::ValueHint::DirPath)]
    pub allow_read: Vec<PathBuf>,
    /// End with code 7 where a point of a sweep failed; the archive is whole all the same
    #[arg(long)]
    pub strict: bool,
    /// Threads to use; no result depends on it [default: all]
    #[arg(long, value_name = "N")]
    pub threads: Option<NonZeroUsize>,
    /// Print only what the script prints, and what is wrong
    #[arg(long)]
    pub quiet: bool,
}

impl Gather {
    /// Gathers them.
    pub fn run(&self, output: &mut Output) -> Exit {
        match self.gather(output) {
            Ok(exit) => exit,
            Err(fault) => {
                output.diagnostic(&fault, None);
                Exit::of(fault.code)
            }
        }
    }

    fn gather(&self, output: &mut Output) -> Result<Exit, Box<Diagnostic>> {
        let mut archives: Vec<(PathBuf, Archive)> = Vec::new();
        for path in &self.parts {
            let archive = match open(path, output) {
                Ok(archive) => archive,
                Err(exit) => return Ok(exit),
            };
            archives.push((path.clone(), archive));
        }
        let parts = Parts::of(archives).map_err(|fault| {
            let diagnostic = Diagnostic::new(codes::NOT_PARTS, fault.what);
            match fault.mend {
                Some(mend) => diagnostic.help(mend),
                None => diagnostic,
            }
        })?;
        let run = parts.run();
        may_replace(&self.out, &run.script_name)?;
        // the folder of the first part, where none is given: there is one
        let first = self.parts.first().map_or(self.out.as_path(), PathBuf::as_path);
        let script = archived_script(run, self.data.as_deref(), first, &self.allow_read)?;
        let source = SourceText::new(format!("{} in {}", script.name, first.display()), script.text.clone());
        let copied = parts.copy_into(&self.out).map_err(|error| claim_error(&error, &self.out))?;
        if !self.quiet {
            output.remark(&format!("{} parts hold together; {copied} points are copied", parts.count()));
        }
        let begun = header(&script);
        let writer = Writer::resume(&self.out, &begun, None).map_err(|e| claim_error(&e, &self.out))?;
        let _holder = Holder::name(&self.out);
        let options = RunOptions {
            set: overrides(run),
            allow_read: self.allow_read.clone(),
            threads: self.threads.map(NonZeroUsize::get),
            interrupt: stop_on_interrupt(output),
            ..RunOptions::default()
        };
        if !self.quiet {
            output.show_progress();
        }
        let mut recorder = Recorder::new(output, &source, self.quiet, writer, begun, None);
        let outcome = language::run(&script, options, &mut recorder);
        let (writer, header, failures) = recorder.into_parts();
        output.end_progress();
        for error in &outcome.errors {
            output.diagnostic(error, Some(&source));
        }
        end(output, writer, &header, &self.out, &outcome, self.quiet)?;
        Ok(ending(&outcome, failures, self.strict))
    }
}
