//! The words of the command line.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand};

const ABOUT: &str = "\
kolk turns recordings of seeded, sheet-lit flow into vectors, each with its standard uncertainty,
and into eddy sizes, circulations and flow statistics. (How certain the numbers of an eddy are is
not worked out yet; they print it as missing, \"± ?\".) It is for people who measure flow with a
camera and a light sheet and have to defend the numbers: a small language over fast compiled
kernels, at a prompt or in scripts that rebuild the same tables and figures later.";

const AFTER: &str = "\
An example, eddies.rhai:
  let rec  = recording(\"basin/*.tif\", #{ order: \"pairs\", dt_s: 0.004, mm_per_px: 0.05 });
  let flow = rec.pair(0).interrogate(plan(#{ windows_px: [64, 32, 32], overlap: 0.75 }));
  flow.eddies().table().save(\"eddies.csv\");

  kolk run eddies.rhai --out results

Exit codes: 0 done, 1 the script failed, 2 wrong command line, 130 interrupted.";

/// The command line.
#[derive(Debug, Parser)]
#[command(
    name = "kolk",
    version,
    about = ABOUT,
    after_help = AFTER,
    override_usage = "kolk [OPTIONS]            start the prompt\n       kolk COMMAND ...          see below; kolk help COMMAND says more",
    max_term_width = 98,
    help_template = "{about}\n\nUsage: {usage}\n\nCommands:\n{subcommands}\n\nOptions:\n{options}{after-help}\n"
)]
pub(super) struct Arguments {
    #[command(flatten)]
    pub places: Places,
    #[command(subcommand)]
    pub command: Option<Command>,
}

/// Where a script may read and write, and on how many threads it computes.
#[derive(Args, Clone, Debug)]
pub(super) struct Places {
    /// Folder that everything is written below; made when it is needed.
    #[arg(long, value_name = "DIR", default_value = "out", global = true)]
    pub out: PathBuf,
    /// Another folder to read from, besides the one kolk is started in and the script's own.
    #[arg(long, value_name = "DIR", global = true)]
    pub read: Vec<PathBuf>,
    /// Threads to compute on; all cores when left out. Results do not depend on it.
    #[arg(
        long,
        value_name = "N",
        global = true,
        allow_negative_numbers = true,
        value_parser = clap::builder::RangedU64ValueParser::<usize>::new().range(1..=1024)
    )]
    pub threads: Option<usize>,
}

/// What to do.
#[derive(Debug, Subcommand)]
pub(super) enum Command {
    /// Run a script; `kolk run FILE --help` lists its settings.
    Run(Run),
    /// Make a recording of a tidal-inlet basin, analyse it, and leave a table and figures.
    Demo(Demo),
    /// Print the documentation of a built-in, of a kind of value, or what is found by a word.
    Docs(Docs),
}

/// `kolk run`.
#[derive(Args, Debug)]
#[command(disable_help_flag = true, override_usage = "kolk run FILE [OPTIONS]")]
pub(super) struct Run {
    /// The script.
    #[arg(value_name = "FILE", required_unless_present = "help")]
    pub file: Option<PathBuf>,
    /// A value for one of the script's settings; may be given several times.
    #[arg(long, value_name = "NAME=VALUE")]
    pub set: Vec<String>,
    /// Print help, with the settings of the script where one is named.
    #[arg(short, long)]
    pub help: bool,
    #[command(flatten)]
    pub places: Places,
}

/// `kolk demo`.
#[derive(Args, Debug)]
pub(super) struct Demo {
    #[command(flatten)]
    pub places: Places,
}

/// `kolk docs`.
#[derive(Args, Debug)]
pub(super) struct Docs {
    /// A name, a kind of value such as "vector field", or words to search; everything when left
    /// out.
    #[arg(value_name = "NAME")]
    pub about: Vec<String>,
}
