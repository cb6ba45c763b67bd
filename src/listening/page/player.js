// Takes that play all the time, of which one is heard. All start at one instant of the audio clock and repeat the same
// samples, so that switching, a short cross-fade between two gains that add up to one, keeps the place in the music.
class Player {
  static SWITCH = 0.010; // s of cross-fade
  static EDGE = 0.005; // s of fade at the ends of a repeated part
  static RISE = 12; // dB a second that the level may rise by

  #context;
  #volume;
  #takes = [];
  #parts = new Map();
  #voices = [];
  #gate = null;
  #chosen = 0;
  #from = 0;
  #to = 0;
  #place = 0;
  #began = 0;
  #playing = false;
  #level;

  constructor(context, decibels) {
    this.#context = context;
    this.#volume = context.createGain();
    const value = 10 ** (decibels / 20);
    this.#volume.gain.value = value;
    this.#level = { at: 0, until: 0, from: value, to: value };
    this.#volume.connect(context.destination);
  }

  get playing() { return this.#playing; }
  get chosen() { return this.#chosen; }
  get from() { return this.#from; }
  get to() { return this.#to; }

  // Takes of one length. The place, the repeated part and whether it plays stay as they are.
  load(takes, chosen) {
    this.#takes = takes;
    this.#chosen = chosen;
    if (this.#to === 0) this.#to = takes[0].duration;
    if (this.#playing) this.#start(this.position());
  }

  // Another piece of music: from its beginning, all of it.
  reset() {
    this.pause();
    this.#parts.clear();
    this.#from = this.#to = this.#place = 0;
  }

  play() { if (!this.#playing) this.#start(this.#place); }

  pause() {
    this.#place = this.position();
    this.#silence();
    this.#playing = false;
  }

  seek(place) {
    const inside = Math.min(Math.max(place, this.#from), this.#to - 0.001);
    if (this.#playing) this.#start(inside);
    else this.#place = inside;
  }

  repeat(from, to) {
    const place = this.position();
    this.#from = from;
    this.#to = to;
    this.seek(place >= from && place < to ? place : from);
  }

  choose(index) {
    this.#chosen = index;
    const now = this.#context.currentTime;
    this.#voices.forEach((voice, i) => Player.#fade(voice, i === index ? 1 : 0, now));
  }

  // Seconds into the take.
  position() {
    if (!this.#playing) return this.#place;
    const gone = Math.max(0, this.#context.currentTime - this.#began);
    return this.#from + ((this.#place - this.#from + gone) % (this.#to - this.#from));
  }

  // Rises slowly and falls at once.
  level(decibels) {
    const now = this.#context.currentTime, { at, until, from, to } = this.#level;
    const current = now >= until ? to : from * (to / from) ** ((now - at) / (until - at));
    const target = 10 ** (decibels / 20);
    const seconds = Math.max(0.03, (20 * Math.log10(target / current)) / Player.RISE);
    const gain = this.#volume.gain;
    gain.cancelScheduledValues(now);
    gain.setValueAtTime(current, now);
    gain.exponentialRampToValueAtTime(target, now + seconds);
    this.#level = { at: now, until: now + seconds, from: current, to: target };
  }

  #start(place) {
    this.#silence();
    const context = this.#context;
    // Far enough ahead that every source is ready; a rendering without a clock needs no lead.
    const at = context.currentTime + (context instanceof OfflineAudioContext ? 0 : 0.05);
    const gate = context.createGain();
    gate.gain.setValueAtTime(0, at);
    gate.gain.linearRampToValueAtTime(1, at + Player.SWITCH);
    gate.connect(this.#volume);
    this.#gate = gate;
    this.#voices = this.#takes.map((take, i) => {
      const source = context.createBufferSource(), gain = context.createGain();
      const value = i === this.#chosen ? 1 : 0;
      gain.gain.setValueAtTime(value, at);
      source.buffer = this.#part(take);
      source.loop = true;
      source.connect(gain).connect(gate);
      source.start(at, place - this.#from);
      return { source, gain: gain.gain, at, until: at, from: value, to: value };
    });
    this.#place = place;
    this.#began = at;
    this.#playing = true;
  }

  #silence() {
    if (!this.#gate) return;
    const now = this.#context.currentTime;
    this.#gate.gain.cancelScheduledValues(now);
    this.#gate.gain.setValueAtTime(1, now);
    this.#gate.gain.linearRampToValueAtTime(0, now + Player.SWITCH);
    this.#voices.forEach((voice) => voice.source.stop(now + 2 * Player.SWITCH));
    this.#voices = [];
    this.#gate = null;
  }

  static #fade(voice, to, now) {
    const gone = voice.until > voice.at ? (now - voice.at) / (voice.until - voice.at) : 1;
    const from = voice.from + (voice.to - voice.from) * Math.min(1, Math.max(0, gone));
    voice.gain.cancelScheduledValues(now);
    voice.gain.setValueAtTime(from, now);
    voice.gain.linearRampToValueAtTime(to, now + Player.SWITCH);
    Object.assign(voice, { at: now, until: now + Player.SWITCH, from, to });
  }

  // The repeated part of a take with soft ends, or the take itself.
  #part(take) {
    if (this.#from === 0 && this.#to === take.duration) return take;
    const rate = take.sampleRate;
    const begin = Math.round(this.#from * rate), frames = Math.round(this.#to * rate) - begin;
    const known = this.#parts.get(take);
    if (known && known.begin === begin && known.part.length === frames) return known.part;
    const part = new AudioBuffer({ length: frames, numberOfChannels: take.numberOfChannels, sampleRate: rate });
    const edge = Math.min(Math.round(Player.EDGE * rate), frames >> 1);
    for (let channel = 0; channel < take.numberOfChannels; channel += 1) {
      const samples = take.getChannelData(channel).slice(begin, begin + frames);
      for (let k = 0; k < edge; k += 1) {
        const weight = 0.5 - 0.5 * Math.cos((Math.PI * (k + 0.5)) / edge);
        samples[k] *= weight;
        samples[frames - 1 - k] *= weight;
      }
      part.copyToChannel(samples, channel);
    }
    this.#parts.set(take, { begin, part });
    return part;
  }
}
