//! To be written.

use super::Failure;

#[derive(clap::Args)]
pub struct Args {}

pub fn run(_args: Args) -> Result<(), Failure> {
    todo!()
}
