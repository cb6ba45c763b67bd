//! Whatever happens to a stage file.

use super::*;

/// Small steps of a 64-bit linear congruential generator (Knuth's MMIX constants, from memory).
struct Dice(u64);

impl Dice {
    fn roll(&mut self, sides: usize) -> usize {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 33) as usize % sides.max(1)
    }
}

/// Whatever happens to the text, it is read or refused, and the message is plain.
#[test]
fn no_mutation_of_the_example_is_a_surprise() {
    const PIECES: [&str; 24] = [
        "\"",
        "[",
        "]",
        "{",
        "}",
        "=",
        "#",
        "nan",
        "-",
        "1e400",
        "0",
        "\n",
        "[[tube]]\n",
        "[compare]\n",
        "+",
        ".",
        "'''",
        "\u{202e}",
        "é",
        "\u{1b}",
        "[[configuration]]\nname=\"x\"\n",
        "gain.bypass = 5\n",
        "inf",
        ",",
    ];
    let own_tube = DEMO_STAGE.to_owned() + OWN;
    let sources = [EXAMPLE_STAGE, &own_tube, SMALL];
    let mut dice = Dice(20_240_229);
    let (mut read, mut refused) = (0, 0);
    for round in 0..3000 {
        let source = sources[round % sources.len()];
        let mut lines: Vec<String> = source.lines().map(str::to_owned).collect();
        for _ in 0..=dice.roll(4) {
            let at = dice.roll(lines.len());
            match dice.roll(5) {
                0 => drop(lines.remove(at)),
                1 => lines.insert(at, lines[dice.roll(lines.len())].clone()),
                2 => lines[at] = lines[dice.roll(lines.len())].clone(),
                mutation => {
                    let characters: Vec<char> = lines[at].chars().collect();
                    let cut = dice.roll(characters.len() + 1);
                    let skip = if mutation == 3 { dice.roll(4) } else { 0 };
                    let (head, tail) = (&characters[..cut], characters.get(cut + skip..).unwrap_or(&[]));
                    let piece = PIECES[dice.roll(PIECES.len())];
                    lines[at] = head.iter().collect::<String>() + piece + &tail.iter().collect::<String>();
                }
            }
        }
        match parse(&lines.join("\n")) {
            Ok(file) => {
                assert!(!file.configurations.is_empty());
                read += 1;
            }
            Err(failure) => {
                assert_eq!(failure.exit_code(), 2);
                let message = failure.message(false).expect("a message");
                assert!(!message.contains(['\u{202e}', '\u{1b}']), "{message:?}");
                assert!(message.lines().count() < 200, "a flood:\n{message}");
                refused += 1;
            }
        }
    }
    assert!(
        read > 100 && refused > 1000,
        "{read} read and {refused} refused: the mutations are too mild or too wild"
    );
}
