//! Owns where results go: standard output, files replaced whole, and talk on standard error.

use std::io::{ErrorKind, IsTerminal, Write};
use std::path::{Path, PathBuf};

use super::{Colour, Common, Failure, Format, call_fault};
use crate::fault::Fault;
use crate::report::table::Page;
use crate::report::{json, printable};

/// What a command leaves.
pub(super) struct Answer {
    /// The result, in the asked form.
    text: String,
    /// Exit code.
    code: u8,
    /// Said on standard error unless quiet.
    talk: Vec<String>,
    /// Said on standard error when asked for more.
    work: Vec<String>,
    /// A second file to write.
    save: Option<(PathBuf, String)>,
}

impl Answer {
    pub(super) fn new(text: String, code: u8) -> Answer {
        Answer {
            text,
            code,
            talk: Vec::new(),
            work: Vec::new(),
            save: None,
        }
    }

    pub(super) fn with_talk(mut self, talk: impl IntoIterator<Item = String>) -> Answer {
        self.talk.extend(talk);
        self
    }

    pub(super) fn with_work(mut self, work: String) -> Answer {
        self.work.push(work);
        self
    }

    /// A CSV file has no room for cautions, but no build goes without them.
    pub(super) fn with_cautions(self, cautions: &[String], common: &Common) -> Answer {
        let said = cautions.iter().filter(|_| common.format == Format::Csv);
        self.with_talk(said.cloned())
    }

    pub(super) fn with_save(mut self, save: Option<(PathBuf, String)>) -> Answer {
        self.save = save;
        self
    }
}

/// How tables are set: wrapped and coloured on a terminal only.
pub(super) fn page(common: &Common) -> Page {
    let terminal = common.output.is_none() && std::io::stdout().is_terminal();
    let columns = || {
        let said = std::env::var("COLUMNS")
            .ok()
            .and_then(|c| c.parse::<u16>().ok())
            .filter(|&c| c > 0);
        said.or_else(|| terminal_size::terminal_size().map(|(width, _)| width.0))
    };
    let width = common.width.or_else(|| if terminal { columns() } else { None });
    let plain = std::env::var_os("NO_COLOR").is_some_and(|v| !v.is_empty())
        || std::env::var_os("TERM").is_some_and(|term| term == "dumb");
    let colour = match common.color {
        Colour::Auto => terminal && !plain,
        Colour::Always => true,
        Colour::Never => false,
    };
    Page {
        width: width.map(|w| w.max(20)),
        colour,
    }
}

/// Writes everything; returns the exit code.
pub(super) fn finish(answer: Result<Answer, Failure>, common: &Common) -> u8 {
    let answer = match answer {
        Ok(answer) => answer,
        Err(Failure::Input(faults)) => {
            say_faults(&faults, common);
            return 2;
        }
        Err(Failure::Bug(bug)) => {
            say("search and audit disagree; this is a bug in binrail. Please report it with these data:");
            say(&printable(&bug.build));
            bug.verdict.iter().for_each(|line| say(&printable(line)));
            return 4;
        }
    };
    // Files first: a result on the screen whose file could not be written would be half an answer.
    let mut faults = Vec::new();
    if let Some((path, text)) = &answer.save {
        faults.extend(replace(path, text, "--save").err().map(|fault| *fault));
    }
    if let Some(path) = &common.output {
        faults.extend(replace(path, &answer.text, "--output").err().map(|fault| *fault));
    }
    if !faults.is_empty() {
        say_faults(&faults, common);
        return 2;
    }
    if !common.quiet {
        answer.talk.iter().for_each(|line| say(&printable(line)));
    }
    if common.verbose {
        answer.work.iter().for_each(|line| say(&printable(line)));
    }
    if common.output.is_none() {
        let mut out = std::io::stdout().lock();
        if let Err(error) = out.write_all(answer.text.as_bytes()).and_then(|()| out.flush())
            && error.kind() != ErrorKind::BrokenPipe
        {
            say(&format!("standard output: {error}"));
            return 2;
        }
    }
    answer.code
}

fn say_faults(faults: &[Fault], common: &Common) {
    match common.format {
        Format::Json => say(json::text(&json::errors(faults)).trim_end()),
        Format::Table | Format::Csv => {
            faults.iter().for_each(|fault| say(&printable(&fault.to_string())));
        }
    }
}

/// One line on standard error; nobody is left to tell when that fails.
fn say(line: &str) {
    let _ = writeln!(std::io::stderr(), "{line}");
}

/// Replaces a regular file whole or leaves it as it was; a symlink keeps pointing at its target.
fn replace(path: &Path, text: &str, flag: &str) -> Result<(), Box<Fault>> {
    let fault = |problem: String| {
        Box::new(call_fault(
            flag,
            &path.display().to_string(),
            &problem,
            "name a file in a folder that you may write to",
        ))
    };
    let target = match path.canonicalize() {
        Ok(target) => target,
        Err(e) if e.kind() == ErrorKind::NotFound => path.to_owned(),
        Err(e) => return Err(fault(format!("cannot be written: {e}"))),
    };
    if target.exists() && !target.is_file() {
        return Err(fault("is not a regular file".into()));
    }
    let folder = target
        .parent()
        .filter(|p| !p.as_os_str().is_empty())
        .unwrap_or(Path::new("."));
    let write = || -> std::io::Result<()> {
        let mut builder = tempfile::Builder::new();
        builder.prefix(".binrail-");
        #[cfg(unix)]
        {
            use std::os::unix::fs::PermissionsExt;
            // As any new file, less the umask; a replaced file keeps its mode.
            let mode = target.metadata().map_or(0o666, |m| m.permissions().mode());
            builder.permissions(std::fs::Permissions::from_mode(mode));
        }
        let mut file = builder.tempfile_in(folder)?;
        file.write_all(text.as_bytes())?;
        file.as_file().sync_all()?;
        file.persist(&target)?;
        Ok(())
    };
    write().map_err(|e| fault(format!("cannot be written: {e}")))
}
