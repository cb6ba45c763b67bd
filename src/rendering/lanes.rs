//! Every channel of every configuration in a lane of its own, four lanes to a chain.

use platewright_dsp::signal::Oversampling;
use platewright_dsp::wave::{Machine, RootCounts, Shape, WaveError};
use platewright_dsp::{Chain, F64x4, Kernel, LANES};
use rayon::prelude::*;

use crate::stage_file::Configuration;

/// What sounds in a lane.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
struct Place {
    configuration: usize,
    channel: usize,
}

/// A chain with the places of its lanes and room for a block.
struct Group {
    chain: Chain,
    places: Vec<Place>,
    input: Vec<F64x4>,
    output: Vec<F64x4>,
}

/// All channels of a recording through all configurations.
pub struct Lanes {
    groups: Vec<Group>,
    /// V at `in` of a sample of 1.0, a configuration each.
    volts_per_sample: Vec<f64>,
    latency: usize,
}

/// The machines of `configurations` at `rate` engine steps a second, in their order.
///
/// # Errors
/// The configuration's index and reason where one cannot be stepped.
pub fn machines(configurations: &[Configuration], rate: f64) -> Result<Vec<Machine>, (usize, WaveError)> {
    let make = |(index, c): (usize, &Configuration)| Machine::new(&c.stage, rate).map_err(|e| (index, e));
    configurations.par_iter().enumerate().map(make).collect()
}

impl Lanes {
    /// Lanes for `channels` channels through every machine. `drive` multiplies the level of every input.
    pub fn new(
        configurations: &[Configuration],
        machines: &[Machine],
        channels: usize,
        oversampling: Oversampling,
        kernel: Kernel,
        drive: f64,
    ) -> Lanes {
        let mut places: Vec<(Shape, Place)> = Vec::new();
        for (configuration, machine) in machines.iter().enumerate() {
            places.extend((0..channels).map(|channel| (machine.shape(), Place { configuration, channel })));
        }
        // Lanes stepped together share a shape; the sort is stable, so the order within one stays the file's.
        places.sort_by_key(|(shape, _)| *shape);
        let groups = places
            .chunk_by(|(a, _), (b, _)| a == b)
            .flat_map(|alike| alike.chunks(LANES))
            .filter_map(|four| Group::new(four, machines, oversampling, kernel))
            .collect();
        let peak = |c: &Configuration| drive * c.stage.source.full_scale * std::f64::consts::SQRT_2;
        Lanes {
            groups,
            volts_per_sample: configurations.iter().map(peak).collect(),
            latency: oversampling.latency_frames(),
        }
    }

    /// How far the output comes behind the input, in frames.
    pub fn latency(&self) -> usize {
        self.latency
    }

    /// Takes a block, one slice of samples a channel, to volts at `o`: `output[configuration][channel]` is filled.
    pub fn process(&mut self, input: &[Vec<f64>], frames: usize, output: &mut [Vec<Vec<f64>>]) {
        let volts = &self.volts_per_sample;
        self.groups.par_iter_mut().for_each(|group| group.process(input, frames, volts));
        for group in &self.groups {
            for (lane, place) in group.places.iter().enumerate() {
                let channel = &mut output[place.configuration][place.channel];
                channel.clear();
                channel.extend(group.output[..frames].iter().map(|four| four.0[lane]));
            }
        }
    }

    /// How the roots of a configuration's channels were found.
    pub fn counts(&self, configuration: usize) -> RootCounts {
        let mut total = RootCounts::default();
        for group in &self.groups {
            for (lane, place) in group.places.iter().enumerate() {
                if place.configuration == configuration {
                    total.add(group.chain.counts(lane));
                }
            }
        }
        total
    }
}

impl Group {
    fn new(
        four: &[(Shape, Place)],
        machines: &[Machine],
        oversampling: Oversampling,
        kernel: Kernel,
    ) -> Option<Group> {
        let places: Vec<Place> = four.iter().map(|(_, place)| *place).collect();
        let machines: Vec<Machine> = places.iter().map(|p| machines[p.configuration].clone()).collect();
        // Lanes of one shape, one to four of them: there is nothing an engine could refuse.
        let chain = Chain::new(&machines, oversampling, kernel).ok()?;
        Some(Group { chain, places, input: Vec::new(), output: Vec::new() })
    }

    fn process(&mut self, input: &[Vec<f64>], frames: usize, volts: &[f64]) {
        self.input.resize(frames, F64x4::default());
        self.output.resize(frames, F64x4::default());
        for (lane, place) in self.places.iter().enumerate() {
            let scale = volts[place.configuration];
            for (four, sample) in self.input.iter_mut().zip(&input[place.channel][..frames]) {
                four.0[lane] = scale * sample;
            }
        }
        self.chain.process(&self.input, &mut self.output);
    }
}
