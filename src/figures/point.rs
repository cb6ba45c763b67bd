//! The operating point's figures, warnings and meter readings.

use std::collections::BTreeMap;

use platewright_dsp::analysis::{
    BeyondLaw, Meter, OperatingPoint, TubePoint, TubeStress, beyond_law_at_rest, cold_volts, tube_stresses,
    tube_type,
};
use platewright_dsp::circuit::{Coupling, Network, Node, Role, Stage};

use super::{
    MeterFigures, OperatingPointFigures, PartFigures, RatingFigures, ReadingFigures, TubeFigures, WarningFigures,
    Why,
};
use crate::stage_file::{Configuration, PartRating};

/// Part of a limit beyond which it is exceeded, %. A published typical operation may stand exactly at a limit; rounding
/// in its figures is not an excess.
const EXCEEDED_PERCENT: f64 = 100.05;
/// A meter that moves a node by more than this part of its voltage, and by more than a tenth of a volt, misleads.
const METER_DISTURBS: f64 = 0.01;

/// The figures of `configuration` at `point`, with a meter of `meter_ohms` at every node where one is asked.
pub fn operating_point(
    configuration: &Configuration,
    network: &Network,
    point: &OperatingPoint,
    meter_ohms: Option<f64>,
) -> OperatingPointFigures {
    let stage = &configuration.stage;
    let parts = parts(stage, point);
    let ratings = ratings(stage, point, &parts, &configuration.ratings);
    let mut tubes = point.tubes.iter().map(|tube| tube_figures(stage, point, tube));
    // A stage always has its gain tube.
    let gain = tubes.next().unwrap_or_else(|| unreachable!("a stage has a gain tube"));
    OperatingPointFigures {
        supply_node: point.volts(Node::B).unwrap_or(stage.supply.voltage),
        gain,
        follower: tubes.next(),
        warnings: warnings(stage, point, &ratings),
        parts,
        ratings,
        meter: meter_ohms.map(|ohms| meter(stage, network, point, ohms)),
    }
}

fn tube_figures(stage: &Stage, point: &OperatingPoint, tube: &TubePoint) -> TubeFigures {
    let conducts = tube.currents.plate_by_vpk > 0.0;
    let mut why = Why::new();
    if !conducts {
        why.extend(["mu", "rp"].map(|key| (key.to_owned(), "the tube is cut off".to_owned())));
    }
    TubeFigures {
        tube: tube_type(stage, tube.role).map_or_else(String::new, |kind| kind.name.clone()),
        plate_to_ground: tube.plate,
        cathode_to_ground: tube.cathode,
        grid_to_ground: tube.grid,
        grid_to_cathode: tube.vgk,
        plate_to_cathode: tube.vpk,
        plate_current: tube.currents.plate,
        grid_current: tube.currents.grid,
        plate_dissipation: tube.plate_dissipation(),
        gm: tube.gm(),
        mu: conducts.then(|| tube.mu()),
        rp: conducts.then(|| tube.rp()),
        junction_to_ground: match tube.role {
            Role::Gain => None,
            Role::Follower => point.volts(Node::J),
        },
        why,
    }
}

fn parts(stage: &Stage, point: &OperatingPoint) -> Vec<PartFigures> {
    let figures = |part: &platewright_dsp::analysis::PartStress| PartFigures {
        part: part.key.to_owned(),
        watts: part.watts,
        volts: part.volts,
        volts_cold: cold_volts(stage, part.key),
    };
    point.parts.iter().map(figures).collect()
}

fn ratings(
    stage: &Stage,
    point: &OperatingPoint,
    parts: &[PartFigures],
    stated: &BTreeMap<String, PartRating>,
) -> Vec<RatingFigures> {
    let tubes = tube_stresses(stage, point).into_iter().map(|stress| tube_rating(&stress));
    let of_part = |part: &PartFigures| {
        let rating = stated.get(&part.part)?;
        let watts = rating.watts.map(|allowed| part_rating(&part.part, "watts", "W", part.watts, allowed));
        let most = part.volts.max(part.volts_cold.unwrap_or(0.0));
        let volts = rating.volts.map(|allowed| part_rating(&part.part, "volts", "V", most, allowed));
        Some(watts.into_iter().chain(volts))
    };
    tubes.chain(parts.iter().filter_map(of_part).flatten()).collect()
}

fn tube_rating(stress: &TubeStress) -> RatingFigures {
    let mut why = Why::new();
    if stress.allowed.is_none() {
        why.extend(["allowed", "used_percent"].map(|key| (key.to_owned(), "not stated".to_owned())));
    }
    RatingFigures {
        part: stress.role.name().to_owned(),
        limit: stress.limit.key().to_owned(),
        asked: stress.asked,
        allowed: stress.allowed,
        unit: stress.limit.unit().to_owned(),
        used_percent: stress.used_percent(),
        why,
    }
}

fn part_rating(part: &str, limit: &str, unit: &str, asked: f64, allowed: f64) -> RatingFigures {
    RatingFigures {
        part: part.to_owned(),
        limit: limit.to_owned(),
        asked,
        allowed: Some(allowed),
        unit: unit.to_owned(),
        used_percent: Some(100.0 * asked / allowed),
        why: Why::new(),
    }
}

/// Exceeded limits first, the worst at the top, then what else a builder must know.
fn warnings(stage: &Stage, point: &OperatingPoint, ratings: &[RatingFigures]) -> Vec<WarningFigures> {
    let mut exceeded: Vec<WarningFigures> = ratings.iter().filter_map(exceeded).collect();
    exceeded.sort_by(|a, b| b.used_percent.unwrap_or(0.0).total_cmp(&a.used_percent.unwrap_or(0.0)));
    exceeded.extend(cold_grid(stage));
    exceeded.extend(beyond_law_at_rest(stage, point).iter().map(beyond_law));
    exceeded
}

fn exceeded(rating: &RatingFigures) -> Option<WarningFigures> {
    let used = rating.used_percent.filter(|&used| used > EXCEEDED_PERCENT)?;
    let allowed = rating.allowed?;
    let limit = rating.limit.replace('_', " ");
    Some(WarningFigures {
        part: rating.part.clone(),
        limit: rating.limit.clone(),
        used_percent: Some(used),
        text: format!(
            "{}: {limit} {} exceeds the stated {} ({used:.0} %){}",
            rating.part,
            with_unit(rating.asked, &rating.unit),
            with_unit(allowed, &rating.unit),
            // The heater's own supply may be lifted, which the stage file cannot say yet.
            if rating.limit == "heater_cathode_voltage" { ", with the heater at ground" } else { "" },
        ),
        why: Why::new(),
    })
}

fn with_unit(value: f64, unit: &str) -> String {
    match unit {
        "A" => format!("{:.2} mA", 1e3 * value),
        "W" => format!("{value:.2} W"),
        _ => format!("{value:.1} {unit}"),
    }
}

/// The warning of a law used beyond its reach.
/// A direct-coupled follower's grid rises with the gain tube's plate to the whole supply before its cathode emits.
/// Common practice, no source.
fn cold_grid(stage: &Stage) -> Option<WarningFigures> {
    let follower = stage.follower.as_ref()?;
    let text = format!(
        "follower: while the tubes are cold its grid stands {:.0} V over its cathode (no limit stated) and may arc: clamp \
         grid to cathode, or bring the supply up after the heaters",
        stage.supply.voltage
    );
    let direct = matches!(follower.coupling, Coupling::Direct { .. });
    direct.then(|| WarningFigures::note(Role::Follower.name(), "grid_cathode_cold", text))
}

fn beyond_law(beyond: &BeyondLaw) -> WarningFigures {
    let part = beyond.role.name();
    WarningFigures::note(part, "law", format!("{part}: {beyond}"))
}

/// Nodes that a builder can reach with a probe.
const PROBED: [Node; 9] = [Node::B, Node::P1, Node::K1, Node::G1, Node::X, Node::G2, Node::K2, Node::J, Node::O];

fn meter(stage: &Stage, network: &Network, point: &OperatingPoint, ohms: f64) -> MeterFigures {
    let reading = |node: Node| {
        let volts = point.volts(node)?;
        // A node that is ground, or another node under a second name, needs no line of its own.
        let place = network.place(node)??;
        let first = PROBED.into_iter().find(|&other| network.place(other) == Some(Some(place)))?;
        (first == node).then(|| metered(stage, network, node, volts, ohms))
    };
    MeterFigures { resistance: ohms, readings: PROBED.into_iter().filter_map(reading).collect() }
}

fn metered(stage: &Stage, network: &Network, node: Node, volts: f64, ohms: f64) -> ReadingFigures {
    let with = OperatingPoint::solve(network, Some(Meter { node, resistance: ohms })).and_then(|p| p.volts(node));
    let mut why = Why::new();
    if with.is_none() {
        why.insert("metered".to_owned(), "no operating point with the meter attached".to_owned());
    }
    let disturbed = with.filter(|with| {
        let moved = (with - volts).abs();
        moved > 0.1 && moved > METER_DISTURBS * volts.abs()
    });
    ReadingFigures {
        node: node.name().to_owned(),
        volts,
        metered: with,
        advice: disturbed
            .map(|with| format!("do not probe here: it would read {with:.1} V{}", instead(stage, node))),
        why,
    }
}

/// Where to put the probes instead.
fn instead(stage: &Stage, node: Node) -> &'static str {
    let biased = stage.follower.as_ref().is_some_and(|f| f.bias_resistor.is_some());
    match node {
        Node::X | Node::G2 if biased => ", measure across the bias resistor",
        Node::X | Node::G2 => ", measure at the follower's cathode",
        Node::G1 => ", measure across the cathode resistor",
        _ => ", measure across the resistor that feeds it",
    }
}
