"""Renders pieces.py with fluidsynth and writes 48 kHz, 24-bit WAV files: render.py SOUND_FONT INTO."""

import subprocess
import sys
import tempfile
import wave
from pathlib import Path

import mido
import numpy as np

from pieces import PIECES

SAMPLE_RATE = 48_000  # Hz
TICKS = 960  # a beat
FADE = 0.25  # s, raised cosine, at the end
FULL_SCALE = 2**23
DITHER_SEED = 20_240


def midi_file(piece):
    """The piece as a MIDI file, one track a part."""
    midi = mido.MidiFile(ticks_per_beat=TICKS)
    for part in piece.parts:
        track = mido.MidiTrack()
        midi.tracks.append(track)
        track.append(mido.MetaMessage("set_tempo", tempo=mido.bpm2tempo(piece.tempo)))
        track.append(mido.Message("program_change", channel=part.channel, program=part.program))
        track.append(mido.Message("control_change", channel=part.channel, control=7, value=part.volume))
        track.append(mido.Message("control_change", channel=part.channel, control=10, value=part.pan))
        events = []
        for beat, length, key, velocity in part.notes:
            events.append((round(beat * TICKS), 1, key, velocity))
            events.append((round((beat + length) * TICKS), 0, key, 0))
        now = 0
        for tick, on, key, velocity in sorted(events):
            kind = "note_on" if on else "note_off"
            track.append(mido.Message(kind, channel=part.channel, note=key, velocity=velocity, time=tick - now))
            now = tick
    return midi


def play(piece, font, folder):
    """What fluidsynth makes of the piece: float samples, a row a frame, two columns."""
    notes, sound = folder / f"{piece.name}.mid", folder / f"{piece.name}.raw"
    midi_file(piece).save(notes)
    room = ["-R", "1"] if piece.channels == 2 else ["-R", "0"]
    command = ["fluidsynth", "-n", "-i", "-q", "-r", str(SAMPLE_RATE), "-g", "0.3", "-C", "0", *room,
               "-T", "raw", "-O", "float", "-F", str(sound), font, str(notes)]
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL)
    return np.fromfile(sound, "<f4").reshape(-1, 2).astype(float)


def finish(piece, samples):
    """Cut to length, without the silence before the first note, faded, with the peak where the piece wants it."""
    first = int(np.argmax(np.abs(samples).max(axis=1) > 1e-4))
    length = round(piece.seconds * SAMPLE_RATE)
    samples = samples[max(first - 48, 0) :][:length]
    samples = np.vstack([samples, np.zeros((length - len(samples), 2))])
    if piece.channels == 1:
        samples = samples.mean(axis=1, keepdims=True)
    samples = samples - samples.mean(axis=0)
    fade = round(FADE * SAMPLE_RATE)
    samples[:48] *= np.linspace(0, 1, 48)[:, None]
    samples[-fade:] *= (0.5 + 0.5 * np.cos(np.pi * np.arange(1, fade + 1) / fade))[:, None]
    return samples * 10 ** (piece.peak / 20) / np.abs(samples).max()


def write(path, samples):
    """24-bit WAV with triangular dither of two steps, peak to peak."""
    random = np.random.Generator(np.random.PCG64(DITHER_SEED))
    dither = random.random(samples.shape) - random.random(samples.shape)
    whole = np.clip(np.rint(samples * FULL_SCALE + dither), -FULL_SCALE, FULL_SCALE - 1).astype("<i4")
    with wave.open(str(path), "wb") as file:
        file.setnchannels(samples.shape[1])
        file.setsampwidth(3)
        file.setframerate(SAMPLE_RATE)
        file.writeframes(whole.reshape(-1, 1).view(np.uint8).reshape(-1, 4)[:, :3].tobytes())


def main(font, into):
    with tempfile.TemporaryDirectory() as folder:
        for piece in PIECES:
            write(Path(into) / f"{piece.name}.wav", finish(piece, play(piece, font, Path(folder))))


if __name__ == "__main__":
    main(*sys.argv[1:])
