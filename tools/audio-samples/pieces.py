"""The notes of the recordings, written for this project.

A note is (beat, length in beats, key, velocity); keys and programs as in General MIDI, programs counted from 0.
"""

from dataclasses import dataclass, field

DRUMS = 9  # the channel that General MIDI keeps for drums
KICK, SNARE, CLOSED_HAT, OPEN_HAT, CRASH = 36, 38, 42, 46, 49


@dataclass
class Part:
    """One instrument's notes; pan 0 (left) to 127 (right)."""

    program: int
    notes: list
    channel: int = 0
    pan: int = 64
    volume: int = 100


@dataclass
class Piece:
    """What becomes one recording: `seconds` long, in mono or stereo, its highest sample at `peak` dBFS."""

    name: str
    tempo: float  # beats a minute
    seconds: float
    channels: int
    peak: float
    parts: list = field(default_factory=list)


def chord(beat, length, keys, velocity, spread=0.015):
    """Keys struck together, as a hand does it: a little one after the other, the top note a little louder."""
    return [(beat + spread * i, length - spread * i, key, velocity + 3 * (i == len(keys) - 1))
            for i, key in enumerate(keys)]


def stage_piano():
    """A phrase that begins with single soft notes, grows to full hard chords, and falls back to two quiet ones."""
    left = [
        *chord(0, 3.4, [50, 57], 56), *chord(4, 3.4, [46, 53], 66),
        *chord(8, 1.4, [43, 50], 98), *chord(9.5, 0.4, [43], 104), *chord(10, 1.9, [45, 52, 57], 112),
        *chord(12, 3.9, [38, 50], 66),
    ]
    right = [
        (0.5, 0.9, 65, 48), (1.5, 0.4, 69, 52), (2, 1.4, 72, 60), (3.5, 0.4, 69, 50),
        (4.5, 0.9, 67, 62), (5.5, 0.4, 70, 68), (6, 0.9, 74, 80), (7, 0.4, 77, 92), (7.5, 0.4, 79, 102),
        *chord(8, 1.3, [70, 74, 77, 82], 112), *chord(9.5, 0.4, [69, 74, 81], 118),
        *chord(10, 1.2, [69, 73, 76, 81], 124), (11.25, 0.2, 79, 100), (11.5, 0.4, 76, 90),
        *chord(12, 2.4, [65, 69, 76], 70), (14.5, 0.9, 74, 48), *chord(15.5, 1.3, [62, 69], 38),
    ]
    return Piece("stage-piano", 92, 11.0, 1, -1.5, [Part(4, left + right)])


def plucked_bass():
    """A finger-style line: an even walk, accents that stand well above it, a run to the low E and a quiet tail."""
    line = [
        (0, 0.9, 33, 72), (1, 0.4, 40, 58), (1.5, 0.4, 43, 64), (2, 0.9, 45, 76), (3, 0.4, 43, 55), (3.5, 0.4, 40, 60),
        (4, 0.7, 38, 80), (4.75, 0.2, 38, 45), (5, 0.4, 45, 62), (5.5, 0.4, 48, 68), (6, 0.4, 50, 112),
        (6.75, 0.2, 48, 60), (7, 0.4, 45, 66), (7.5, 0.4, 41, 60),
        (8, 0.7, 40, 118), (8.75, 0.2, 40, 50), (9, 0.4, 52, 96), (9.5, 0.4, 50, 78), (10, 0.4, 47, 70),
        (10.5, 0.4, 43, 66), (11, 0.4, 41, 72), (11.5, 0.4, 40, 84),
        (12, 1.9, 28, 124), (14, 0.9, 33, 36), (15, 1.6, 40, 28),
    ]
    return Piece("plucked-bass", 112, 9.0, 1, -1.0, [Part(33, line)])


def organ_and_drums():
    """Two bars of organ alone, soft; then the drums come in and both play hard; the last chord rings alone."""
    organ = [
        *chord(0, 3.9, [52, 59, 64, 67], 60), *chord(4, 1.9, [50, 57, 62, 66], 64), *chord(6, 1.7, [48, 55, 64, 67], 70),
        *chord(8, 1.4, [52, 59, 64, 71], 104), *chord(9.5, 0.4, [52, 62, 66, 71], 110),
        *chord(10, 1.8, [50, 57, 66, 74], 112), *chord(12, 0.4, [48, 60, 64, 72], 116),
        *chord(12.75, 0.4, [48, 60, 64, 72], 108), *chord(13.5, 1.3, [47, 59, 63, 69], 118),
        *chord(15, 2.2, [52, 59, 64, 68], 90),
    ]
    pedal = [(8, 1.4, 28, 100), (9.5, 0.4, 28, 90), (10, 1.8, 26, 100), (12, 1.3, 36, 104), (13.5, 1.3, 35, 110),
             (15, 2.2, 28, 84)]
    drums = [(7, 0.2, SNARE, 50), (7.5, 0.2, SNARE, 74), (7.75, 0.2, SNARE, 90), (8, 0.5, CRASH, 96)]
    for bar in (8, 12):
        drums += [(bar, 0.3, KICK, 118), (bar + 1, 0.3, SNARE, 112), (bar + 1.5, 0.3, KICK, 96),
                  (bar + 2.25, 0.3, KICK, 104), (bar + 3, 0.3, SNARE, 116)]
        drums += [(bar + 0.5 * i, 0.2, CLOSED_HAT, 84 if i % 2 == 0 else 56) for i in range(1, 6)]
        drums += [(bar + 3.5, 0.4, OPEN_HAT, 80)]
    return Piece("organ-and-drums", 116, 9.2, 2, -1.0, [
        Part(16, organ, channel=0, pan=40, volume=78),
        Part(33, pedal, channel=1, pan=64, volume=96),
        Part(0, drums, channel=DRUMS, pan=64, volume=110),
    ])


PIECES = [stage_piano(), plucked_bass(), organ_and_drums()]
