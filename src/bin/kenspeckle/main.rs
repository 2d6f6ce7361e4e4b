//! The program `kenspeckle`: sort photos, notes or vectors by a few examples of each category.
//!
//! One file a command; [`material`] reads what is outside, through [`photos`], [`notes`], [`vectors`] and [`labelled`];
//! [`output`] writes, [`console`] speaks to the person.

mod ask;
mod assess;
mod console;
mod embed;
mod labelled;
mod learn;
mod material;
mod notes;
mod output;
mod parallel;
mod photos;
mod plot;
mod rehearse;
mod replay;
mod report;
mod sort;
mod spot_check;
mod vectors;

use std::process::ExitCode;

use clap::{Parser, Subcommand};

use console::Failure;

/// Sort a pile of photos or notes into your own categories, from a few examples of each. Nothing leaves this machine.
#[derive(Parser)]
#[command(
    version,
    after_help = "\
Start with:
  kenspeckle sort unsorted/ --examples sorted/ --out result.csv
where unsorted/ holds the photos of the pile and sorted/ holds one folder for each category with a few example photos in it. Or, for notes in a table:
  kenspeckle sort notes.csv --column note --examples known.csv --category tray --out result.csv

Exit codes: 0 done · 1 not done · 2 the command line can't be understood · 3 done, but some items could not be read · 130 stopped by Ctrl-C

Where a wrong sort could hurt someone (foraging, medicine, safety, decisions about people), use the result only as a
suggestion to a person who is qualified to decide, and follow the rules that apply where you are."
)]
struct Arguments {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    Sort(sort::Sort),
    Ask(ask::Ask),
    Assess(assess::Assess),
    Embed(embed::Embed),
    Rehearse(rehearse::Rehearse),
    Learn(learn::Learn),
    SpotCheck(spot_check::SpotCheckCommand),
}

fn main() -> ExitCode {
    let arguments = Arguments::parse();
    console::watch_for_stop();
    let done = match arguments.command {
        Command::Sort(sort) => sort.run(),
        Command::Ask(ask) => ask.run(),
        Command::Assess(assess) => assess.run(),
        Command::Embed(embed) => embed.run(),
        Command::Rehearse(rehearse) => rehearse.run(),
        Command::Learn(learn) => learn.run(),
        Command::SpotCheck(check) => check.run(),
    };
    match done {
        Ok(0) => ExitCode::SUCCESS,
        Ok(_) => ExitCode::from(3),
        Err(Failure::Stopped) => {
            console::say("stopped; nothing was written");
            ExitCode::from(130)
        }
        Err(Failure::Because(reason)) => {
            console::say(&reason);
            ExitCode::FAILURE
        }
    }
}
