//! The program `coneproof`; see [`coneproof::command`].

use std::io;
use std::process::ExitCode;

fn main() -> ExitCode {
    ExitCode::from(coneproof::command::run(std::env::args_os(), &mut io::stdout(), &mut io::stderr()))
}
