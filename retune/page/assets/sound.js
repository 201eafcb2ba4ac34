// Sound: every note an oscillator with the spectrum of its part, at the tuned pitch itself.

const AHEAD = 0.35; // seconds of sound that are set up in advance
const TICK = 90; // milliseconds between looks at what comes next
const GLIDE = 0.04; // seconds in which a held note moves to another pitch
const NOTE_LEVEL = 0.09;
const BEHIND = 0.35; // gain of the others where one part is in front: about -9 dB
const BREATH = 1.2; // seconds between two passes of a loop
const RELEASE = 0.09;

// The graph from the parts to the ear: level and place of each part, volume, limiter.
function buildGraph(context, piece) {
  const volume = context.createGain();
  const limiter = context.createDynamicsCompressor();
  limiter.threshold.value = -12;
  limiter.knee.value = 6;
  limiter.ratio.value = 20;
  limiter.attack.value = 0.004;
  limiter.release.value = 0.15;
  const ear = context.createAnalyser();
  ear.fftSize = 32768;
  volume.connect(limiter).connect(ear).connect(context.destination);
  const parts = piece.parts.map((part) => {
    const level = context.createGain();
    const place = context.createStereoPanner();
    place.pan.value = part.pan;
    level.connect(place).connect(volume);
    const waves = part.waves.map(([hz, amplitudes]) => {
      const imag = new Float32Array([0, ...amplitudes]);
      const wave = context.createPeriodicWave(new Float32Array(imag.length), imag, {
        disableNormalization: true,
      });
      return { hz, wave };
    });
    return { level, waves };
  });
  const guide = context.createGain();
  guide.gain.value = 0.8;
  guide.connect(volume);
  return { context, volume, ear, parts, guide };
}

function waveFor(part, hz) {
  let best = part.waves[0];
  for (const one of part.waves) if (one.hz <= hz * 1.01) best = one;
  return best && best.wave;
}

// A click as soft as it can be and still be heard: a short damped sine.
function click(graph, when, strong) {
  const { context } = graph;
  const tone = context.createOscillator();
  const gain = context.createGain();
  tone.frequency.value = strong ? 1320 : 990;
  gain.gain.setValueAtTime(0, when);
  gain.gain.linearRampToValueAtTime(strong ? 0.22 : 0.14, when + 0.004);
  gain.gain.exponentialRampToValueAtTime(0.0005, when + 0.09);
  tone.connect(gain).connect(graph.guide);
  tone.start(when);
  tone.stop(when + 0.1);
  return { tone, gain };
}

// One sounding note; `segments` are [seconds from its start, just Hz, equal Hz].
class Voice {
  constructor(graph, part, segments, level, attack, when, seconds, equal) {
    const { context } = graph;
    this.context = context;
    this.segments = segments;
    this.when = when;
    this.end = when + seconds;
    this.tone = context.createOscillator();
    this.gain = context.createGain();
    const wave = waveFor(graph.parts[part], segments[0][1]);
    if (wave) this.tone.setPeriodicWave(wave);
    this.place(this.tone.frequency, equal, when);
    const rise = Math.min(attack, seconds / 2);
    this.gain.gain.setValueAtTime(0, when);
    this.gain.gain.linearRampToValueAtTime(level, when + rise);
    this.gain.gain.setValueAtTime(level, this.end);
    this.gain.gain.linearRampToValueAtTime(0, this.end + RELEASE);
    this.tone.connect(this.gain).connect(graph.parts[part].level);
    this.tone.start(when);
    this.tone.stop(this.end + RELEASE + 0.02);
  }

  at(time, equal) {
    let hz = this.segments[0];
    for (const one of this.segments) if (this.when + one[0] <= time) hz = one;
    return hz[equal ? 2 : 1];
  }

  place(frequency, equal, from) {
    let hz = this.at(from, equal);
    frequency.setValueAtTime(hz, from);
    for (const one of this.segments) {
      const time = this.when + one[0];
      const next = one[equal ? 2 : 1];
      if (time <= from || next === hz) continue;
      frequency.setValueAtTime(hz, time);
      frequency.linearRampToValueAtTime(next, time + GLIDE);
      hz = next;
    }
  }

  retune(equal) {
    const now = Math.max(this.context.currentTime, this.when);
    if (now > this.end + RELEASE) return;
    const { frequency } = this.tone;
    const before = this.at(now, !equal);
    frequency.cancelScheduledValues(now);
    frequency.setValueAtTime(before, now);
    frequency.linearRampToValueAtTime(this.at(now, equal), now + GLIDE);
    this.place(frequency, equal, now + GLIDE);
  }

  stop(now, fade = 0.05) {
    const { gain } = this.gain;
    if (now >= this.end + RELEASE) return;
    if (gain.cancelAndHoldAtTime) gain.cancelAndHoldAtTime(now);
    else gain.cancelScheduledValues(now);
    gain.setTargetAtTime(0, now, fade / 3);
    this.tone.stop(Math.max(now, this.when) + fade * 2);
  }
}

const ATTACKS = [0.03, 0.045, 0.07]; // slurred on, new syllable, from silence

// Sets up one note of the piece at `when`, entered `late` seconds after its start.
function sing(graph, note, when, late, rate, equal) {
  const seconds = (note.d - late) / rate;
  if (seconds <= 0.005) return null;
  const segments = note.g
    .map(([time, just, tempered]) => [(time - note.t - late) / rate, just, tempered])
    .filter((one, index, all) => index === all.length - 1 || all[index + 1][0] > 0);
  const attack = late > 0 ? 0.05 : ATTACKS[note.a];
  return new Voice(graph, note.p, segments, NOTE_LEVEL * note.v, attack, when, seconds, equal);
}

class Player {
  constructor(piece) {
    this.piece = piece;
    this.position = 0;
    this.rate = 1;
    this.equal = false;
    this.playing = false;
    this.volume = 0.5;
    this.muted = piece.parts.map(() => false);
    this.levels = piece.parts.map(() => 1);
    this.front = null;
    this.loop = null; // [from, to] in seconds of the piece
    this.startingNotes = false;
    this.countIn = false;
    this.voices = new Set();
    this.onchange = () => {};
  }

  async wake() {
    if (!this.graph) {
      const context = new AudioContext({ latencyHint: "playback" });
      this.graph = buildGraph(context, this.piece);
      this.balance(0);
    }
    await this.graph.context.resume();
  }

  gainOf(part) {
    if (this.muted[part]) return 0;
    const behind = this.front !== null && this.front !== part;
    return this.levels[part] * (behind ? BEHIND : 1);
  }

  balance(fade = 0.06) {
    if (!this.graph) return;
    const { context, volume, parts } = this.graph;
    const now = context.currentTime;
    volume.gain.setTargetAtTime(this.volume, now, fade / 3 + 0.001);
    parts.forEach((part, index) => {
      part.level.gain.setTargetAtTime(this.gainOf(index), now, fade / 3 + 0.001);
    });
  }

  // Where the piece is now, in its own seconds.
  now() {
    if (!this.playing) return this.position;
    const passed = this.graph.context.currentTime - this.started;
    return Math.max(this.from, this.from + passed * this.rate);
  }

  async play() {
    await this.wake();
    if (this.playing) return;
    if (this.position >= this.piece.length - 0.01) this.position = 0;
    if (this.loop && (this.position < this.loop[0] || this.position >= this.loop[1])) {
      this.position = this.loop[0];
    }
    this.playing = true;
    this.begin(this.position, this.introduce(this.position));
    this.timer = setInterval(() => this.look(), TICK);
    this.onchange();
  }

  // Starting notes and count-in; returns how many seconds they take.
  introduce(position) {
    const { start } = this.piece;
    const base = this.graph.context.currentTime + 0.08;
    let at = 0;
    if (this.startingNotes && position < 0.01 && start.chord.length) {
      const own = this.front === null ? null : start.own[this.front];
      const notes = own ? [...start.chord, own] : start.chord;
      notes.forEach(([, just, equal], index) => {
        const long = own && index === notes.length - 1 ? 2 : 1;
        const part = this.front ?? 0;
        const voice = new Voice(
          { ...this.graph, parts: this.graph.parts.map((p) => ({ ...p, level: this.graph.guide })) },
          part, [[0, just, equal]], NOTE_LEVEL, 0.06, base + at, start.slot * long * 0.9, this.equal,
        );
        this.voices.add(voice);
        at += start.slot * long;
      });
      at += start.beat / this.rate;
    }
    if (this.countIn) {
      const beats = position < 0.01 ? start.count : this.countBefore(position);
      const beat = (position < 0.01 ? start.beat : this.beatAt(position)) / this.rate;
      beats.forEach((strong, index) => {
        const made = click(this.graph, base + at + index * beat, strong);
        this.voices.add({ end: base + at + (index + 1) * beat, stop: (now) => made.gain.gain.setTargetAtTime(0, now, 0.01), retune() {} });
      });
      at += beats.length * beat;
    }
    return at;
  }

  barAt(position) {
    const { bars } = this.piece;
    let found = bars[0];
    for (const bar of bars) if (bar.t <= position + 0.001) found = bar;
    return found;
  }

  countBefore(position) {
    const count = this.barAt(position).beats.length || 1;
    return Array.from({ length: count }, (_, index) => index === 0);
  }

  beatAt(position) {
    const { beats } = this.barAt(position);
    return beats.length > 1 ? beats[1] - beats[0] : this.piece.start.beat;
  }

  begin(position, delay = 0) {
    const { context } = this.graph;
    this.from = position;
    this.started = context.currentTime + 0.08 + delay;
    this.next = 0;
    const { notes } = this.piece;
    while (this.next < notes.length && notes[this.next].t < position) {
      const note = notes[this.next++];
      if (note.t + note.d > position + 0.02) this.add(note, this.started, position - note.t);
    }
    this.look();
  }

  add(note, when, late) {
    const voice = sing(this.graph, note, when, late, this.rate, this.equal);
    if (voice) this.voices.add(voice);
  }

  look() {
    const { context } = this.graph;
    const now = context.currentTime;
    for (const voice of this.voices) if (voice.end + 0.5 < now) this.voices.delete(voice);
    const stop = this.loop ? this.loop[1] : this.piece.length;
    const reach = Math.min(this.from + (now + AHEAD - this.started) * this.rate, stop);
    const { notes } = this.piece;
    while (this.next < notes.length && notes[this.next].t < reach) {
      const note = notes[this.next++];
      const cut = Math.min(note.d, stop - note.t);
      this.add(cut < note.d ? { ...note, d: cut } : note, this.started + (note.t - this.from) / this.rate, 0);
    }
    if (this.now() < stop) return;
    if (this.loop) {
      this.silence();
      this.begin(this.loop[0], BREATH + (this.countIn ? this.introduceLater(BREATH) : 0));
    } else {
      this.pause();
      this.position = 0;
      this.onchange();
    }
  }

  introduceLater(delay) {
    const beats = this.countBefore(this.loop[0]);
    const beat = this.beatAt(this.loop[0]) / this.rate;
    const base = this.graph.context.currentTime + 0.08 + delay;
    beats.forEach((strong, index) => click(this.graph, base + index * beat, strong));
    return beats.length * beat;
  }

  silence() {
    const now = this.graph.context.currentTime;
    for (const voice of this.voices) voice.stop(now);
    this.voices.clear();
  }

  pause() {
    if (!this.playing) return;
    this.position = Math.min(this.now(), this.piece.length);
    this.playing = false;
    clearInterval(this.timer);
    this.silence();
    this.onchange();
  }

  seek(position) {
    this.position = Math.max(0, Math.min(position, this.piece.length));
    if (this.playing) {
      this.silence();
      this.begin(this.position);
    }
    this.onchange();
  }

  setRate(rate) {
    const position = this.now();
    this.rate = rate;
    if (this.playing) this.seek(position);
  }

  setEqual(equal) {
    this.equal = equal;
    for (const voice of this.voices) voice.retune(equal);
    this.onchange();
  }

  // Sounds the tones of a chord, held; `slide` is [index, cents, seconds] of one that moves away
  // and comes back. Returns the seconds it takes.
  async hold(tones, equal, slide) {
    await this.wake();
    if (this.playing) this.pause();
    else this.silence();
    const when = this.graph.context.currentTime + 0.08;
    const seconds = slide ? slide[2] : 6;
    tones.forEach((tone, index) => {
      const hz = equal ? tone.eq : tone.hz;
      const voice = new Voice(this.graph, tone.p, [[0, hz, hz]], NOTE_LEVEL, 0.15, when, seconds, false);
      if (slide && slide[0] === index) {
        const { detune } = voice.tone;
        detune.setValueAtTime(0, when + seconds * 0.2);
        detune.linearRampToValueAtTime(slide[1], when + seconds * 0.5);
        detune.setValueAtTime(slide[1], when + seconds * 0.6);
        detune.linearRampToValueAtTime(0, when + seconds * 0.85);
      }
      this.voices.add(voice);
    });
    return seconds;
  }

  // The sound of a stretch, made faster than it plays: two channels of samples.
  async render(from, to, equal, rate = 44100) {
    const length = Math.ceil((to - from + 0.5) * rate);
    const context = new OfflineAudioContext(2, length, rate);
    const graph = buildGraph(context, this.piece);
    graph.volume.gain.value = this.volume;
    graph.parts.forEach((part, index) => { part.level.gain.value = this.gainOf(index); });
    for (const note of this.piece.notes) {
      if (note.t >= to || note.t + note.d <= from) continue;
      const late = Math.max(0, from - note.t);
      sing(graph, note, Math.max(0, note.t - from), late, 1, equal);
    }
    return context.startRendering();
  }
}
