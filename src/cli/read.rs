//! `counterfoil read`.

use std::io::Write;

use anyhow::{Context, bail};

use super::args::ReadArguments;
use super::exit::Exit;
use super::for_terminal;
use crate::intake::{Contents, read_file};
use crate::plan::{Plan, read_plan};
use crate::report::{ControlPointDetail, plan_text};

/// Shows what was read from each plan.
pub(super) fn run(arguments: ReadArguments, out: &mut dyn Write) -> anyhow::Result<Exit> {
    let detail = if arguments.control_points {
        ControlPointDetail::All
    } else {
        ControlPointDetail::First
    };
    for path in &arguments.paths {
        let name = path.display().to_string();
        if path.is_dir() {
            bail!("{name} is a folder: name the plan files, such as {name}/*.dcm");
        }
        let file = read_file(path).with_context(|| name.clone())?;
        let Contents::Whole(bytes) = &file.contents else {
            bail!("{name}: too large for an RT Plan");
        };
        let plan: Plan = read_plan(bytes).with_context(|| name.clone())?;
        if arguments.json {
            serde_json::to_writer_pretty(&mut *out, &plan)?;
            writeln!(out)?;
        } else {
            writeln!(out, "{}", for_terminal(&name))?;
            write!(out, "{}", plan_text(&plan, detail))?;
        }
    }
    Ok(Exit::Within)
}
