//! What can be typed.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand};

const EXIT_CODES: &str = "\
Exit codes:
  0  the answer was found, needs met or not
  1  a need is unmet, and --fail-unmet was given
  2  bad input, or a run that broke";

/// Finds what several centrifugal pumps in one system really do, in parallel and in series.
#[derive(Parser)]
#[command(name = "dutybank", version, after_help = EXIT_CODES, max_term_width = 100)]
pub(crate) struct Arguments {
    #[command(subcommand)]
    pub command: Command,
}

#[derive(Subcommand)]
pub(crate) enum Command {
    /// Read a system file, report all its problems, and describe the network in words
    #[command(after_help = "Example:\n  dutybank check networks/starter.yaml")]
    Check(CheckOptions),
    /// Solve the system as it stands: what every pump, line and node does, and whether the needs are met
    #[command(after_help = SOLVE_EXAMPLES)]
    Solve(SolveOptions),
    /// Solve every distinct set of running pumps in every case, and say what each further pump really adds
    #[command(after_help = DUTY_EXAMPLES)]
    Duty(DutyOptions),
    /// Run one staging plan over the shift: what becomes of tanks and pumps, with exact times
    #[command(after_help = SHIFT_EXAMPLES)]
    Shift(ShiftOptions),
    /// Run several staging plans over the same shift and put them in order
    #[command(after_help = COMPARE_EXAMPLES)]
    Compare(CompareOptions),
    /// Write a calculation note as one HTML page that a reviewer can check
    #[command(after_help = REPORT_EXAMPLES)]
    Report(ReportOptions),
    /// Draw what is not known exactly (`tolerances` of the file) many times: bands, shares of cases, what matters most
    #[command(after_help = TOLERANCE_EXAMPLES)]
    Tolerance(ToleranceOptions),
    /// Draw what the pumps give against what the system asks for: head, efficiency, power and NPSH over flow
    #[command(after_help = CURVES_EXAMPLES)]
    Curves(CurvesOptions),
    /// Print the completions for a shell
    #[command(
        after_help = "Example:\n  dutybank completions bash > ~/.local/share/bash-completion/completions/dutybank"
    )]
    Completions(CompletionsOptions),
    /// Print the manual page
    #[command(after_help = "Example:\n  dutybank man | man -l -")]
    Man,
}

const SOLVE_EXAMPLES: &str = "\
Examples:
  dutybank solve networks/starter.yaml
  dutybank solve networks/starter.yaml --running duty.1 --level pond=2.5m
  dutybank solve networks/starter.yaml --speed duty.2=90% --json

Exit codes:
  0  the answer was found, needs met or not
  1  a need is unmet, and --fail-unmet was given
  2  bad input, or a run that broke";

const DUTY_EXAMPLES: &str = "\
Examples:
  dutybank duty networks/mill_pond_transfer.yaml
  dutybank duty networks/mill_pond_transfer.yaml --worst-first --csv sets.csv
  dutybank duty networks/plant_cooling_loop.yaml --pumps P1,P3

Exit codes:
  0  the table was made, needs met or not
  1  a need is unmet in every set of some case, and --fail-unmet was given
  2  bad input, or a run that broke";

const SHIFT_EXAMPLES: &str = "\
Examples:
  dutybank shift networks/meadow_lift_station.yaml --plan wide_common_stop
  dutybank shift networks/meadow_lift_station.yaml --plan wide_common_stop --case storm --csv run.csv --events log.csv

Exit codes: 0 the run was made; 2 bad input, or a run that broke";

const COMPARE_EXAMPLES: &str = "\
Examples:
  dutybank compare networks/meadow_lift_station.yaml
  dutybank compare networks/meadow_lift_station.yaml --case storm --csv runs.csv --scores scores.csv
  dutybank compare networks/meadow_lift_station.yaml --weights spilled=1000,starts=0.2,energy=0.1

Exit codes: 0 the runs were made; 2 bad input, or a run that broke";

const REPORT_EXAMPLES: &str = "\
Examples:
  dutybank report networks/mill_pond_transfer.yaml --out note.html
  dutybank report networks/meadow_lift_station.yaml --out note.html --job \"Second duty pump, for review\" --cases as-is,storm

Exit codes: 0 the page was written; 2 bad input, or a run that broke";
const TOLERANCE_EXAMPLES: &str = "\
Examples:
  dutybank tolerance networks/mill_pond_transfer.yaml
  dutybank tolerance networks/mill_pond_transfer.yaml --running transfer.1 --samples 100000
  dutybank tolerance networks/mill_pond_transfer.yaml --case 'full tank' --seed 7 --csv drawn.csv

Exit codes: 0 the cases were drawn, needs met or not; 2 bad input, or a run that broke";
const CURVES_EXAMPLES: &str = "\
Examples:
  dutybank curves networks/mill_pond_transfer.yaml --svg curves.svg
  dutybank curves networks/mill_pond_transfer.yaml --cases 'as-is,low level,old pipe' --svg curves.svg --csv curves.csv
  dutybank curves networks/two_lift_high_reservoir.yaml --bank upper_lift > upper.svg

Without --svg and --csv the SVG goes to standard output where that is a file or a pipe; a terminal gets the operating points.

Exit codes: 0 the curves were drawn; 2 bad input, or a run that broke";

#[derive(Args)]
pub(crate) struct FileOption {
    /// The system file (YAML); `-` reads standard input
    #[arg(value_name = "FILE")]
    pub file: PathBuf,
}

#[derive(Args)]
pub(crate) struct CheckOptions {
    #[command(flatten)]
    pub input: FileOption,
}

/// Changes from the command line, checked like the file.
#[derive(Args)]
pub(crate) struct ChangeOptions {
    /// Run just these pumps, stop all others
    #[arg(long, value_name = "PUMP,..", value_delimiter = ',')]
    pub running: Option<Vec<String>>,
    /// Speed of a pump or bank, in rpm or per cent of its model's: `duty.1=90%`
    #[arg(long, value_name = "PUMP=SPEED")]
    pub speed: Vec<String>,
    /// Level of a tank above its floor, or surface of a reservoir: `pond=2.5m`
    #[arg(long, value_name = "NODE=LEVEL")]
    pub level: Vec<String>,
    /// Any other value of the file by its path: `rising_main.roughness=1mm`
    #[arg(long, value_name = "PATH=VALUE")]
    pub set: Vec<String>,
    /// One of the file's cases
    #[arg(long, value_name = "NAME")]
    pub case: Option<String>,
}

#[derive(Args)]
pub(crate) struct SolveOptions {
    #[command(flatten)]
    pub input: FileOption,
    #[command(flatten)]
    pub changes: ChangeOptions,
    /// Print one JSON object instead of tables
    #[arg(long)]
    pub json: bool,
    /// Also write one CSV file per table into this folder
    #[arg(long, value_name = "DIR")]
    pub csv: Option<PathBuf>,
    /// Exit with 1 if a need is unmet
    #[arg(long)]
    pub fail_unmet: bool,
}

#[derive(Args)]
pub(crate) struct DutyOptions {
    #[command(flatten)]
    pub input: FileOption,
    /// Switch only these pumps or banks; the others stay as the file has them
    #[arg(long, value_name = "PUMP,..", value_delimiter = ',')]
    pub pumps: Option<Vec<String>>,
    /// Only these cases; `as-is` is the file as it stands
    #[arg(long, value_name = "NAME,..", value_delimiter = ',')]
    pub cases: Option<Vec<String>>,
    /// Unmet needs and tightest limits first
    #[arg(long)]
    pub worst_first: bool,
    /// Print one JSON object instead of tables
    #[arg(long)]
    pub json: bool,
    /// Also write the table to this CSV file
    #[arg(long, value_name = "FILE")]
    pub csv: Option<PathBuf>,
    /// Exit with 1 if in some case no set meets all needs
    #[arg(long)]
    pub fail_unmet: bool,
}

#[derive(Args)]
pub(crate) struct ShiftOptions {
    #[command(flatten)]
    pub input: FileOption,
    #[command(flatten)]
    pub changes: ChangeOptions,
    /// Which plan of the file's `staging`
    #[arg(long, value_name = "NAME")]
    pub plan: Option<String>,
    /// Write the time series to this CSV file: a row at each report time and at the exact time of every event
    #[arg(long, value_name = "FILE")]
    pub csv: Option<PathBuf>,
    /// Write what happened, in plain words with its cause, to this CSV file
    #[arg(long, value_name = "FILE")]
    pub events: Option<PathBuf>,
    /// Write a picture of levels, flows and running pumps to this SVG file
    #[arg(long, value_name = "FILE")]
    pub svg: Option<PathBuf>,
    /// Print one JSON object instead of tables
    #[arg(long)]
    pub json: bool,
}

#[derive(Args)]
pub(crate) struct CompareOptions {
    #[command(flatten)]
    pub input: FileOption,
    #[command(flatten)]
    pub changes: ChangeOptions,
    /// Which plans; all if not given
    #[arg(long, value_name = "NAME,..", value_delimiter = ',')]
    pub plans: Option<Vec<String>>,
    /// Write all time series to this CSV file, with a column `plan`
    #[arg(long, value_name = "FILE")]
    pub csv: Option<PathBuf>,
    /// Write what happened in each run to this CSV file
    #[arg(long, value_name = "FILE")]
    pub events: Option<PathBuf>,
    /// Write the scorecard to this CSV file
    #[arg(long, value_name = "FILE")]
    pub scores: Option<PathBuf>,
    /// Rank by a weighted sum instead: `spilled=1000,starts=0.2,cost=1`
    #[arg(long, value_name = "MEASURE=NUMBER,..", value_delimiter = ',')]
    pub weights: Vec<String>,
    /// Print a JSON list of runs instead of tables
    #[arg(long)]
    pub json: bool,
}

#[derive(Args)]
pub(crate) struct ReportOptions {
    #[command(flatten)]
    pub input: FileOption,
    /// The page to write: one file that needs no other and opens from disk
    #[arg(long, value_name = "FILE")]
    pub out: PathBuf,
    /// Words on the job, under the title
    #[arg(long, value_name = "TEXT")]
    pub job: Option<String>,
    /// Only these cases in the combination tables; `as-is` is the file as it stands
    #[arg(long, value_name = "NAME,..", value_delimiter = ',')]
    pub cases: Option<Vec<String>>,
}

impl ReportOptions {
    /// What the curves of the page are asked for.
    pub fn curves(&self) -> CurvesOptions {
        CurvesOptions {
            input: FileOption {
                file: self.input.file.clone(),
            },
            bank: None,
            cases: self.cases.clone(),
            pumps: None,
            svg: None,
            csv: None,
        }
    }

    /// What the combination tables of the page are asked for.
    pub fn duty(&self) -> DutyOptions {
        DutyOptions {
            input: FileOption {
                file: self.input.file.clone(),
            },
            pumps: None,
            cases: self.cases.clone(),
            worst_first: false,
            json: false,
            csv: None,
            fail_unmet: false,
        }
    }
}

#[derive(Args)]
pub(crate) struct ToleranceOptions {
    #[command(flatten)]
    pub input: FileOption,
    #[command(flatten)]
    pub changes: ChangeOptions,
    /// How many cases to draw; else what the file says, or 10000
    #[arg(long, value_name = "NUMBER")]
    pub samples: Option<usize>,
    /// What the draws start from: the same seed draws the same cases; else what the file says, or 1
    #[arg(long, value_name = "NUMBER")]
    pub seed: Option<u64>,
    /// Threads to work with; the figures are the same for any number
    #[arg(long, value_name = "NUMBER")]
    pub threads: Option<usize>,
    /// Print one JSON object instead of tables
    #[arg(long)]
    pub json: bool,
    /// Write every case to this CSV file: what was drawn, and what came of it
    #[arg(long, value_name = "FILE")]
    pub csv: Option<PathBuf>,
}

#[derive(Args)]
pub(crate) struct CurvesOptions {
    #[command(flatten)]
    pub input: FileOption,
    /// Look from the headers of this bank, line or pump; if not given, those of most pumps, and what is in series with them
    #[arg(long, value_name = "NAME")]
    pub bank: Option<String>,
    /// Only these cases; `as-is` is the file as it stands
    #[arg(long, value_name = "NAME,..", value_delimiter = ',')]
    pub cases: Option<Vec<String>>,
    /// Switch only these pumps or banks; the others stay as the file has them
    #[arg(long, value_name = "PUMP,..", value_delimiter = ',')]
    pub pumps: Option<Vec<String>>,
    /// Write the picture to this SVG file; `-` is standard output
    #[arg(long, value_name = "FILE")]
    pub svg: Option<PathBuf>,
    /// Write all plotted points to this CSV file; `-` is standard output
    #[arg(long, value_name = "FILE")]
    pub csv: Option<PathBuf>,
}

#[derive(Args)]
pub(crate) struct CompletionsOptions {
    /// Which shell
    pub shell: clap_complete::Shell,
}
