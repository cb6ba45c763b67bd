//! Headroom.

use platewright_dsp::analysis::{Bound, NotReached, OperatingPoint, Reached, headroom};
use platewright_dsp::circuit::{Network, Role};
use platewright_dsp::portable::decibels;

use super::{HeadroomFigures, LimitFigures, Why};

/// The headroom of a network over `full_scale` V rms, and over a recording's true peak (as a part of full scale).
pub fn of(network: &Network, point: &OperatingPoint, full_scale: f64, play_peak: Option<f64>) -> HeadroomFigures {
    let all = headroom(network, point, full_scale);
    let show = |reached: &Reached| limit(reached, full_scale, play_peak);
    let lowest = |choose: fn(&Bound) -> Option<Role>| {
        let level = |r: &&Reached| r.level.map_or(f64::INFINITY, |(input, _)| input);
        let of_kind = all.iter().filter(|r| choose(&r.bound).is_some());
        // At rest already is lower than any level.
        let at_rest = of_kind.clone().find(|r| r.level == Err(NotReached::AtRest));
        at_rest.or_else(|| of_kind.min_by(|a, b| level(a).total_cmp(&level(b)))).map(show)
    };
    let grid = |bound: &Bound| match bound {
        Bound::GridCurrent(role) => Some(*role),
        _ => None,
    };
    let cut = |bound: &Bound| match bound {
        Bound::CutOff(role) => Some(*role),
        _ => None,
    };
    let each = |choose: fn(&Bound) -> Option<Role>| {
        all.iter().filter(|r| choose(&r.bound).is_some()).map(|r| limit(r, full_scale, play_peak)).collect()
    };
    let compression = all.iter().find(|r| r.bound == Bound::Compression).map(show);
    HeadroomFigures {
        thd: all.iter().filter(|r| matches!(r.bound, Bound::Thd(_))).map(show).collect(),
        compression_1db: compression.unwrap_or_else(empty),
        grid_current: lowest(grid).unwrap_or_else(empty),
        cutoff: lowest(cut).unwrap_or_else(empty),
        grid_current_of: each(grid),
        cutoff_of: each(cut),
    }
}

fn limit(reached: &Reached, full_scale: f64, play_peak: Option<f64>) -> LimitFigures {
    let mut figures = empty();
    match reached.bound {
        Bound::Thd(part) => figures.percent = Some(100.0 * part),
        Bound::GridCurrent(role) | Bound::CutOff(role) => figures.tube = Some(role.name().to_owned()),
        Bound::Compression => {}
    }
    match reached.level {
        Ok((input, output)) => {
            let over = decibels(input / full_scale);
            figures.input_rms = Some(input);
            figures.output_rms = Some(output);
            figures.over_full_scale_db = Some(over);
            // The last bits of a true peak differ between machines, those of this figure must not.
            let hundredths = |db: f64| (100.0 * db).round() / 100.0;
            let peak = play_peak.filter(|&peak| peak > 0.0);
            figures.over_play_db = peak.map(|peak| hundredths(over - decibels(peak)));
        }
        Err(reason) => {
            for key in ["input_rms", "output_rms", "over_full_scale_dB"] {
                figures.why.insert(key.to_owned(), reason.to_string());
            }
        }
    }
    figures
}

fn empty() -> LimitFigures {
    LimitFigures {
        percent: None,
        input_rms: None,
        output_rms: None,
        over_full_scale_db: None,
        over_play_db: None,
        tube: None,
        why: Why::new(),
    }
}
