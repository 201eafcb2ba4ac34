// Puts the page together: reads the piece, wires the controls, runs the frames.

const byId = (id) => document.getElementById(id);

async function unpacked(text) {
  const bytes = Uint8Array.from(atob(text), (char) => char.charCodeAt(0));
  const stream = new Blob([bytes]).stream().pipeThrough(new DecompressionStream("gzip"));
  return JSON.parse(await new Response(stream).text());
}

// Engravings: {name: systems}; the plain one stands in the page, the others are packed.
class Engravings {
  constructor(score) {
    this.plain = [...score.querySelectorAll(".system")].map((box) => box.innerHTML);
    this.packed = {};
    for (const script of document.querySelectorAll("script[data-engraving]")) {
      this.packed[script.dataset.engraving] = script.textContent.trim();
    }
    this.made = new Map([["plain", this.plain]]);
  }

  has(name) {
    return this.made.has(name) || name in this.packed;
  }

  async get(name) {
    if (!this.made.has(name)) this.made.set(name, await unpacked(this.packed[name]));
    return this.made.get(name);
  }
}

class Page {
  constructor() {
    this.piece = JSON.parse(byId("piece").textContent);
    this.player = new Player(this.piece);
    this.view = new ScoreView(byId("score"), this.piece, this.player);
    this.card = new Card(byId("card"), this.piece, this.player);
    this.view.onchord = (index) => this.card.open(index);
    this.engravings = new Engravings(byId("score"));
    this.shown = "plain";
    this.part = null;
    this.ownLine = false;
    this.advice = new AdviceView(byId("advice"), byId("adviceview"), this.piece, (time) => this.goTo(time));
    this.view.adopt();
    new DriftView(byId("driftview"), this.piece, this.player);
    this.controls();
    this.mixer();
    this.player.onchange = () => this.refresh();
    this.choosePart(this.partInAddress());
    this.fit();
    addEventListener("resize", () => this.fit());
    addEventListener("hashchange", () => this.choosePart(this.partInAddress()));
    document.documentElement.classList.add("alive");
    this.refresh();
    const frame = () => {
      this.frame();
      requestAnimationFrame(frame);
    };
    requestAnimationFrame(frame);
  }

  partInAddress() {
    const wish = decodeURIComponent((location.hash.match(/part=([^&]*)/) || [])[1] || "").toLowerCase();
    const chosen = wish || (document.documentElement.dataset.part || "").toLowerCase();
    const index = this.piece.parts.findIndex((part) => part.name.toLowerCase() === chosen);
    return index < 0 ? null : index;
  }

  // The engraving that suits the width, or the chosen part's own line.
  async fit() {
    const width = byId("score").clientWidth;
    let name = width < 560 ? "narrow" : width > 1350 ? "wide" : "plain";
    if (this.ownLine && this.part !== null && this.engravings.has(`part${this.part}`)) name = `part${this.part}`;
    if (!this.engravings.has(name)) name = "plain";
    if (this.shown !== name && !this.view.grid) {
      this.shown = name;
      this.view.show(await this.engravings.get(name));
    }
    this.view.places = null;
    this.mark();
  }

  choosePart(index) {
    this.part = index;
    this.player.front = index;
    this.player.balance();
    const name = index === null ? "" : this.piece.parts[index].name;
    byId("mypart").value = index === null ? "" : String(index);
    const hash = index === null ? "" : `#part=${encodeURIComponent(name)}`;
    if (location.hash !== hash && (hash || location.hash)) history.replaceState(null, "", hash || location.pathname + location.search);
    byId("ownline").disabled = index === null || !this.engravings.has(`part${index}`);
    if (byId("ownline").disabled) byId("ownline").checked = false;
    this.ownLine = byId("ownline").checked;
    this.entries();
    this.advice.show(index);
    this.fit();
    this.refresh();
  }

  // Goes to a place and brings it into sight.
  goTo(time) {
    this.player.seek(time);
    this.view.reveal(time);
  }

  // Marks the staves and rows of the chosen part.
  mark() {
    for (const one of document.querySelectorAll("#score .mine")) one.classList.remove("mine");
    if (this.part === null) return;
    for (const one of document.querySelectorAll(`#score [data-part="${this.part}"]`)) one.classList.add("mine");
    this.view.heads.forEach((heads, index) => {
      if (this.piece.notes[index].p === this.part) for (const head of heads) head.classList.add("mine");
    });
  }

  // What a singer of the part needs first: the first note, the range, where the part comes in.
  entries() {
    const box = byId("entries");
    if (this.part === null) {
      box.hidden = true;
      return;
    }
    const notes = this.piece.notes.filter((note) => note.p === this.part);
    const first = this.piece.start.own[this.part];
    const entries = notes.filter((note, index) => index === 0 || note.t - (notes[index - 1].t + notes[index - 1].d) > 1.5);
    const go = (note) => {
      const bar = this.player.barAt(note.t);
      return element("li", {}, element("button", { type: "button", onclick: () => this.player.seek(note.t) }, `bar ${bar.n}: ${pretty(note.n)}`));
    };
    box.replaceChildren(
      element("h2", {}, this.piece.parts[this.part].name),
      element("p", {}, first ? `First note ${pretty(first[0])} at ${first[1].toFixed(1)} Hz. ` : "",
        first ? element("button", { type: "button", onclick: () => this.player.hold([{ p: this.part, hz: first[1], eq: first[2] }], this.player.equal) }, "Hear it") : ""),
      element("p", { id: "entrieslabel" }, "Comes in at"),
      element("ul", { class: "chips", "aria-labelledby": "entrieslabel" }, ...entries.map(go)),
    );
    box.hidden = false;
  }

  controls() {
    const { player } = this;
    const select = byId("mypart");
    this.piece.parts.forEach((part, index) => select.append(element("option", { value: index }, part.name)));
    select.addEventListener("change", () => this.choosePart(select.value === "" ? null : Number(select.value)));
    byId("ownline").addEventListener("change", (event) => {
      this.ownLine = event.target.checked;
      this.fit();
    });
    byId("play").addEventListener("click", () => (player.playing ? player.pause() : player.play()));
    byId("home").addEventListener("click", () => player.seek(player.loop ? player.loop[0] : 0));
    for (const one of document.querySelectorAll("input[name=tuning]")) {
      one.addEventListener("change", () => player.setEqual(one.value === "equal"));
    }
    byId("tempo").addEventListener("input", (event) => {
      player.setRate(Number(event.target.value) / 100);
      byId("tempoout").textContent = `${event.target.value} %`;
    });
    byId("volume").addEventListener("input", (event) => {
      player.volume = Number(event.target.value) / 100;
      player.balance();
    });
    byId("starting").addEventListener("change", (event) => { player.startingNotes = event.target.checked; });
    byId("countin").addEventListener("change", (event) => { player.countIn = event.target.checked; });
    byId("place").max = String(this.piece.bars.length - 1);
    byId("place").addEventListener("input", (event) => player.seek(this.piece.bars[Number(event.target.value)].t));
    byId("loopon").addEventListener("change", () => this.loop());
    byId("loopfrom").addEventListener("change", () => this.loop());
    byId("loopto").addEventListener("change", () => this.loop());
    const numbers = this.piece.bars.map((bar) => bar.n);
    byId("loopfrom").value = numbers[0];
    byId("loopto").value = numbers[Math.min(3, numbers.length - 1)];
    byId("cents").addEventListener("change", (event) => {
      byId("score").dataset.cents = event.target.value;
    });
    byId("chords").addEventListener("change", (event) => {
      byId("score").dataset.chords = event.target.checked ? "on" : "off";
    });
    byId("theme").addEventListener("click", () => {
      const dark = getComputedStyle(document.documentElement).colorScheme.includes("dark");
      document.documentElement.dataset.theme = dark ? "light" : "dark";
    });
    byId("print").addEventListener("click", () => print());
    addEventListener("keydown", (event) => this.key(event));
  }

  key(event) {
    if (event.ctrlKey || event.metaKey || event.altKey) return;
    if (event.target.matches("input:not([type=checkbox], [type=radio]), select, textarea, summary")) return;
    const onButton = event.target.matches("button, [role=button], input");
    const { player } = this;
    const bars = this.piece.bars;
    const index = bars.indexOf(player.barAt(player.now()));
    const act = {
      " ": () => !onButton && (player.playing ? player.pause() : player.play()),
      ArrowLeft: () => player.seek(bars[Math.max(0, player.now() - bars[index].t > 0.6 ? index : index - 1)].t),
      ArrowRight: () => player.seek(bars[Math.min(bars.length - 1, index + 1)].t),
      Home: () => player.seek(0),
      e: () => this.setTuning(!player.equal),
      l: () => { byId("loopon").checked = !byId("loopon").checked; this.loop(); },
      Escape: () => this.card.close(),
    }[event.key.length === 1 ? event.key.toLowerCase() : event.key];
    if (!act || (event.key.startsWith("Arrow") && event.target.matches("input"))) return;
    if (act() !== false) event.preventDefault();
  }

  setTuning(equal) {
    for (const one of document.querySelectorAll("input[name=tuning]")) one.checked = (one.value === "equal") === equal;
    this.player.setEqual(equal);
  }

  loop() {
    const { bars, length } = this.piece;
    const on = byId("loopon").checked;
    const find = (id, after) => bars.findIndex((bar, index) => index >= after && [bar.n, bar.mark].some((name) => name && name.toLowerCase() === byId(id).value.trim().toLowerCase()));
    const from = find("loopfrom", 0);
    const to = from < 0 ? -1 : find("loopto", from);
    const bad = on && (from < 0 || to < 0);
    byId("loopbad").hidden = !bad;
    this.player.loop = on && !bad ? [bars[from].t, to + 1 < bars.length ? bars[to + 1].t : length] : null;
    if (this.player.loop && this.player.playing) this.player.seek(this.player.loop[0]);
  }

  mixer() {
    const box = byId("mixer");
    this.piece.parts.forEach((part, index) => {
      const mute = element("input", { type: "checkbox", id: `on${index}`, checked: true });
      mute.addEventListener("change", () => {
        this.player.muted[index] = !mute.checked;
        this.player.balance();
      });
      const level = element("input", { type: "range", min: 0, max: 150, value: 100, id: `level${index}`, "aria-label": `Loudness of ${part.name}` });
      level.addEventListener("input", () => {
        this.player.levels[index] = Number(level.value) / 100;
        this.player.balance();
      });
      box.append(element("div", { class: "strip" }, mute, element("label", { for: `on${index}` }, part.name), level));
    });
  }

  refresh() {
    const { player } = this;
    byId("play").textContent = player.playing ? "Pause" : "Play";
    byId("play").setAttribute("aria-pressed", String(player.playing));
    this.setText("tuningnow", player.equal ? "Equal temperament" : "Just intonation");
    if (!player.playing) this.view.dark();
  }

  setText(id, text) {
    const box = byId(id);
    if (box.textContent !== text) box.textContent = text;
  }

  frame() {
    const { player, piece } = this;
    const now = player.now();
    const bar = player.barAt(now);
    if (this.bar !== bar) {
      this.bar = bar;
      this.setText("where", `Bar ${bar.n || "\u2013"}${bar.mark ? ` (${bar.mark})` : ""}`);
      if (document.activeElement !== byId("place")) byId("place").value = String(piece.bars.indexOf(bar));
      byId("place").setAttribute("aria-valuetext", `bar ${bar.n}`);
    }
    if (player.playing || this.at !== now) this.view.follow(now, player.playing);
    this.at = now;
  }
}

globalThis.rehearsal = new Page();
