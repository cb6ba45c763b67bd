//! A configuration's values under the stage file's keys.

use platewright_dsp::circuit::{Coupling, LeakReturn, Stage, Taper};

use super::{ValueFigure, ValuesFigures};

/// Everything that `stage` is made of.
pub fn of(stage: &Stage) -> ValuesFigures {
    let mut values = Values(ValuesFigures::new());
    values.number("supply.voltage", stage.supply.voltage);
    values.number("supply.resistance", stage.supply.resistance);
    values.number("supply.reservoir", stage.supply.reservoir);
    values.number("source.resistance", stage.source.resistance);
    values.number("source.full_scale", stage.source.full_scale);
    if let Some(pot) = &stage.input.pot {
        values.number("input.pot.resistance", pot.resistance);
        values.number("input.pot.position", pot.position);
        match pot.taper {
            Taper::Linear => values.word("input.pot.taper", "linear"),
        }
    }
    values.optional("input.grid_leak", stage.input.grid_leak);
    values.number("input.grid_stopper", stage.input.grid_stopper);
    values.gain(stage);
    values.follower(stage);
    values.number("output.capacitor", stage.output.capacitor);
    values.number("output.bleed", stage.output.bleed);
    values.number("output.load.resistance", stage.output.load_resistance);
    values.optional("output.load.capacitance", stage.output.load_capacitance);
    values.optional("output.full_scale", stage.output.full_scale);
    values.0
}

struct Values(ValuesFigures);

impl Values {
    fn put(&mut self, key: &str, value: ValueFigure) {
        self.0.insert(key.to_owned(), value);
    }

    fn number(&mut self, key: &str, value: f64) {
        self.put(key, ValueFigure::Number(value));
    }

    fn optional(&mut self, key: &str, value: Option<f64>) {
        if let Some(value) = value {
            self.number(key, value);
        }
    }

    fn word(&mut self, key: &str, value: &str) {
        self.put(key, ValueFigure::Word(value.to_owned()));
    }

    fn gain(&mut self, stage: &Stage) {
        let gain = &stage.gain;
        self.word("gain.tube", &gain.tube.name);
        self.number("gain.plate_resistor", gain.plate_resistor);
        self.number("gain.cathode_resistor", gain.cathode_resistor);
        if let Some(bypass) = &gain.bypass {
            self.number("gain.bypass.capacitance", bypass.capacitance);
            self.number("gain.bypass.esr", bypass.esr);
            self.put("gain.bypass.engaged", ValueFigure::Switch(bypass.engaged));
            self.optional("gain.bypass.trickle_resistor", bypass.trickle_resistor);
        }
    }

    fn follower(&mut self, stage: &Stage) {
        let Some(follower) = &stage.follower else { return };
        match follower.coupling {
            Coupling::Capacitor { capacitor, grid_stopper, grid_leak, returns_to } => {
                self.word("coupling.kind", "capacitor");
                self.number("coupling.capacitor", capacitor);
                self.number("coupling.grid_stopper", grid_stopper);
                self.number("coupling.grid_leak", grid_leak);
                let end = match returns_to {
                    LeakReturn::BiasJunction => "bias-junction",
                    LeakReturn::Ground => "ground",
                };
                self.word("coupling.returns_to", end);
            }
            Coupling::Direct { grid_stopper } => {
                self.word("coupling.kind", "direct");
                self.number("coupling.grid_stopper", grid_stopper);
            }
        }
        self.word("follower.tube", &follower.tube.name);
        self.optional("follower.bias_resistor", follower.bias_resistor);
        self.number("follower.tail_resistor", follower.tail_resistor);
    }
}
