//! `platewright bias`: where every configuration biases, and the bench sheet.

use crate::failure::{Failure, Outcome};
use crate::figures::{Asked, gather};
use crate::plan::BiasPlan;
use crate::{show, terminal};

/// The meter of a bench sheet when none is named, Ω: what most digital meters have.
const USUAL_METER: f64 = 10e6;

/// Runs the command.
///
/// # Errors
/// [`Failure`] where the stage file is wrong or a configuration settles nowhere.
pub fn run(plan: &BiasPlan) -> Result<Outcome, Failure> {
    let file = super::stage(&plan.stage)?;
    let meter_ohms = plan.meter.or(plan.sheet.then_some(USUAL_METER));
    let figures = gather(&file, &Asked { meter_ohms, ..Asked::default() })?;
    if plan.sheet {
        terminal::print(&show::bench_sheet(figures.title.as_deref(), &figures.configurations))?;
    } else {
        let table = show::operating_points(&figures.configurations).render(show::WIDTH);
        let advice = show::meter_advice(&figures.configurations);
        super::print_figures(&figures, plan.figures.json, &[table, advice])?;
    }
    Ok(Outcome::of(plan.figures.strict, figures.warn()))
}
