// The chord card: what a chord is made of, how fast it beats, and the chord alone.

function element(name, attributes = {}, ...children) {
  const made = document.createElement(name);
  for (const [key, value] of Object.entries(attributes)) {
    if (key === "class") made.className = value ?? "";
    else if (key.startsWith("on")) made.addEventListener(key.slice(2), value);
    else if (value !== false && value !== null) made.setAttribute(key, value === true ? "" : value);
  }
  made.append(...children);
  return made;
}

function signed(cents, digits = 1) {
  const text = Math.abs(cents).toFixed(digits);
  if (Number(text) === 0) return "0";
  return (cents < 0 ? "\u2212" : "+") + text;
}

// A name as musicians write it.
function pretty(name) {
  return name.replaceAll("#", "\u266f").replaceAll("b", "\u266d");
}

function beats(hz) {
  if (hz < 0.05) return "still";
  if (hz < 20) return `${hz.toFixed(1)} a second`;
  return `${hz.toFixed(0)} a second (rough)`;
}

class Card {
  constructor(box, piece, player) {
    Object.assign(this, { box, piece, player });
    this.index = null;
    this.chooser = new Chooser(piece, player);
    box.addEventListener("keydown", (event) => {
      if (event.key === "Escape") this.close();
    });
  }

  open(index) {
    const chord = this.piece.chords[index];
    if (!chord || !chord.symbol) return;
    if (this.index === null) this.back = document.activeElement;
    this.index = index;
    this.slid = null;
    const { box } = this;
    box.replaceChildren(
      element("div", { class: "cardhead" },
        element("h2", { tabindex: "-1", id: "cardtitle" }, pretty(chord.symbol)),
        element("p", {}, `${pretty(chord.root)} ${chord.quality} \u00b7 bar ${chord.bar}, beat ${chord.beat}`),
        element("button", { type: "button", class: "close", "aria-label": "Close the chord card", onclick: () => this.close() }, "Close"),
      ),
      ...this.doubt(chord),
      this.sounds(chord),
      this.tones(chord),
      this.pairs(chord),
      ...this.whole(chord),
      ...this.hint(chord),
      ...this.chooser.view(chord),
      this.steps(),
    );
    box.hidden = false;
    box.querySelector("h2").focus();
  }

  close() {
    if (this.index === null) return;
    this.box.hidden = true;
    this.index = null;
    if (this.back && this.back.isConnected) this.back.focus();
  }

  doubt(chord) {
    if (chord.decided) return [element("p", { class: "doubt" }, "The director decided this chord.")];
    if (!chord.doubt) return [];
    const other = chord.other ? ` It may also be ${pretty(chord.other)}.` : "";
    return [element("p", { class: "doubt" }, `? The root is in doubt.${other}`)];
  }

  sounds(chord) {
    const play = (equal) => this.player.hold(chord.tones, equal);
    const who = element("select", { id: "slidewho" },
      ...chord.tones.map((tone, index) => element("option", { value: index }, this.piece.parts[tone.p].name)));
    const slide = () => this.player.hold(chord.tones, false, [Number(who.value), 25, 14]);
    return element("div", { class: "sounds" },
      element("button", { type: "button", onclick: () => play(false) }, "Hold it just"),
      element("button", { type: "button", onclick: () => play(true) }, "Hold it equal"),
      element("span", { class: "slide" },
        element("label", { for: "slidewho" }, "Let one voice slide: "), who,
        element("button", { type: "button", onclick: slide, title: "Up by a quarter of a semitone and back" }, "Slide"),
      ),
    );
  }

  table(caption, heads, rows) {
    return element("div", { class: "scroll", tabindex: "0", role: "region", "aria-label": caption },
      element("table", {},
        element("caption", {}, caption),
        element("thead", {}, element("tr", {}, ...heads.map((head) => element("th", { scope: "col", class: head.endsWith("cents") || head === "Hz" ? "number" : null }, head)))),
        element("tbody", {}, ...rows),
      ));
  }

  tones(chord) {
    const rows = [...chord.tones].map((tone) => element("tr", {},
      element("th", { scope: "row" }, this.piece.parts[tone.p].name),
      element("td", {}, pretty(tone.n)),
      element("td", {}, tone.ratio || tone.role || "\u2013"),
      element("td", { class: "number" }, signed(tone.rel)),
      element("td", { class: "number" }, signed(tone.cents)),
      element("td", { class: "number" }, tone.hz.toFixed(2)),
    ));
    return this.table("Where each part sings it",
      ["Part", "Pitch", "Ratio", "Above root, cents", "Absolute, cents", "Hz"], rows);
  }

  pairs(chord) {
    if (!chord.pairs.length) return element("p", {}, "No two tones of this chord share an audible partial.");
    const name = (index) => this.piece.parts[chord.tones[index].p].name;
    const rows = chord.pairs.map((pair) => element("tr", {},
      element("th", { scope: "row" }, `${name(pair.a)} and ${name(pair.b)}`),
      element("td", {}, `${pair.name} ${pair.ratio}`),
      element("td", {}, beats(pair.here)),
      element("td", {}, beats(pair.equal)),
      element("td", {}, pair.shared.map(([low, high, hz]) => `${low}\u2013${high} at ${hz.toFixed(0)} Hz`).join(", ")),
    ));
    return this.table("How fast pairs beat, and the partials that meet",
      ["Pair, lower first", "Interval", "Here", "In equal temperament", "Partials that meet, lower\u2013higher"], rows);
  }

  whole(chord) {
    if (!chord.whole) return [];
    return [element("p", {}, `All tones share a partial at ${chord.whole.toFixed(0)} Hz.`)];
  }

  hint(chord) {
    if (!chord.hint) return [];
    return [element("p", { class: "hint" }, chord.hint, " An acoustic hint only: your director and your teacher decide about your vowel.")];
  }

  steps() {
    const go = (step) => {
      let index = this.index + step;
      while (this.piece.chords[index] && !this.piece.chords[index].symbol) index += step;
      if (this.piece.chords[index]) this.open(index);
    };
    return element("div", { class: "sounds" },
      element("button", { type: "button", onclick: () => go(-1) }, "Chord before"),
      element("button", { type: "button", onclick: () => this.player.seek(this.piece.chords[this.index].t) }, "Play from here"),
      element("button", { type: "button", onclick: () => go(1) }, "Next chord"),
    );
  }
}
