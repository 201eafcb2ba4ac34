// The score: systems of the engraving (or the grid), the cursor, and what a click on them means.

class ScoreView {
  constructor(root, piece, player) {
    this.root = root;
    this.piece = piece;
    this.player = player;
    this.cursor = document.createElement("div");
    this.cursor.className = "cursor";
    this.cursor.hidden = true;
    this.onchord = () => {};
    this.lit = new Set();
    root.addEventListener("click", (event) => this.clicked(event));
    root.addEventListener("keydown", (event) => {
      if ((event.key === "Enter" || event.key === " ") && event.target.closest("[data-chord]")) {
        event.preventDefault();
        event.stopPropagation();
        this.clicked(event);
      }
    });
  }

  // Shows other systems: SVG texts, one each.
  show(systems) {
    for (const box of this.root.querySelectorAll(".system")) box.remove();
    systems.forEach((text, index) => {
      const box = document.createElement("div");
      box.className = "system";
      box.innerHTML = text;
      box.dataset.system = index;
      this.root.append(box);
    });
    this.adopt();
  }

  // Finds every notehead and chord in what is shown, and where the cursor goes.
  adopt() {
    this.places = null;
    this.lit.clear();
    this.grid = this.root.querySelector("table.grid");
    this.heads = new Map();
    const suffix = new Map();
    for (const element of this.root.querySelectorAll("[data-note]")) suffix.set(element.dataset.note, element);
    this.piece.notes.forEach((note, index) => {
      const found = note.i.map((id) => suffix.get(id)).filter(Boolean);
      if (found.length) this.heads.set(index, found);
    });
    for (const chord of this.root.querySelectorAll("[data-chord]")) {
      chord.setAttribute("role", "button");
      chord.setAttribute("tabindex", "0");
      const card = this.piece.chords[chord.dataset.chord];
      if (card && card.symbol) {
        chord.setAttribute("aria-label", `Bar ${card.bar}, beat ${card.beat}: ${card.root} ${card.quality}${card.doubt ? ", in doubt" : ""}`);
      }
    }
  }

  clicked(event) {
    const chord = event.target.closest("[data-chord]");
    if (chord) {
      this.onchord(this.passOf(Number(chord.dataset.chord)));
      return;
    }
    const row = event.target.closest("tr[data-row]");
    if (row) {
      this.player.seek(this.piece.chords[row.dataset.row].t);
      return;
    }
    const box = event.target.closest(".system");
    if (box) this.pointed(box, event.clientX);
  }

  // Goes to what stands nearest to a place in a system.
  pointed(box, clientX) {
    if (!this.places) this.measure();
    const system = this.boxes.indexOf(box);
    const x = clientX - box.getBoundingClientRect().left;
    const here = this.places.filter((place) => place[1] === system);
    if (!here.length) return;
    const nearest = here.reduce((a, b) => (Math.abs(b[2] - x) < Math.abs(a[2] - x) ? b : a))[2];
    const times = here.filter((place) => Math.abs(place[2] - nearest) < 2).map(([time]) => time);
    this.player.seek(this.inPass(times));
  }

  // The same chord in the pass that is played now: what is printed is the first.
  passOf(index) {
    const { chords } = this.piece;
    const printed = chords[index];
    const passes = chords.filter((one) => one.symbol && one.w === printed.w && one.beat === printed.beat);
    const time = this.inPass(passes.map((one) => one.t));
    return chords.indexOf(passes.find((one) => one.t === time) || printed);
  }

  // Of the times that a place is played, the last one up to now, else the first.
  inPass(times) {
    const now = this.player.now();
    const behind = times.filter((time) => time <= now + 0.05);
    return behind.length ? behind[behind.length - 1] : times[0];
  }

  // Places of the cursor: [second, system, x], in order of time.
  measure() {
    const places = [];
    const boxes = [...this.root.querySelectorAll(".system")];
    const known = new Map();
    this.heads.forEach((elements, index) => {
      const element = elements[0];
      const box = element.closest(".system");
      if (!box) return;
      const frame = box.getBoundingClientRect();
      const here = element.getBoundingClientRect();
      const time = this.piece.notes[index].t;
      const x = here.left + here.width / 2 - frame.left;
      const before = known.get(time);
      if (before === undefined || x < before[2]) known.set(time, [time, boxes.indexOf(box), x]);
    });
    for (const place of known.values()) places.push(place);
    places.sort((a, b) => a[0] - b[0]);
    this.boxes = boxes;
    this.places = places;
  }

  // Moves the cursor to a time in seconds; called once a frame.
  follow(time, moving) {
    if (this.grid) return this.followGrid(time, moving);
    if (!this.places) this.measure();
    const { places } = this;
    if (!places.length) return;
    let low = 0;
    let high = places.length - 1;
    while (low < high) {
      const middle = (low + high + 1) >> 1;
      if (places[middle][0] <= time + 1e-4) low = middle;
      else high = middle - 1;
    }
    const [start, system, x] = places[low];
    const next = places[low + 1];
    const box = this.boxes[system];
    let at = x;
    if (next && next[1] === system && next[2] > x && next[0] > start) {
      at = x + (next[2] - x) * Math.min(1, Math.max(0, (time - start) / (next[0] - start)));
    }
    if (this.cursor.parentNode !== box) {
      box.append(this.cursor);
      if (moving) box.scrollIntoView({ block: "center", behavior: calm() ? "auto" : "smooth" });
    }
    this.cursor.hidden = false;
    this.cursor.style.transform = `translateX(${at.toFixed(1)}px)`;
    if (moving) this.light(time);
  }

  // Brings the place of a time into sight, whether it plays or not.
  reveal(time) {
    this.row = null;
    this.follow(time, false);
    const place = this.grid ? this.grid.querySelector("tr.now") : this.cursor.parentNode;
    if (place) place.scrollIntoView({ block: "center", behavior: calm() ? "auto" : "smooth" });
  }

  followGrid(time, moving) {
    const index = chordAt(this.piece, time);
    if (this.row === index) return;
    this.row = index;
    for (const row of this.grid.querySelectorAll("tr.now")) row.classList.remove("now");
    const row = this.grid.querySelector(`tr[data-row="${index}"]`);
    if (!row) return;
    row.classList.add("now");
    if (moving) row.scrollIntoView({ block: "center", behavior: calm() ? "auto" : "smooth" });
  }

  // Marks the notes that sound.
  light(time) {
    const { notes } = this.piece;
    const sounding = new Set();
    for (let index = this.firstAfter(time - 30); index < notes.length && notes[index].t <= time; index++) {
      if (notes[index].t + notes[index].d > time && this.heads.has(index)) sounding.add(index);
    }
    for (const index of this.lit) {
      if (!sounding.has(index)) for (const head of this.heads.get(index)) head.classList.remove("sounding");
    }
    for (const index of sounding) {
      if (!this.lit.has(index)) for (const head of this.heads.get(index)) head.classList.add("sounding");
    }
    this.lit = sounding;
  }

  firstAfter(time) {
    const { notes } = this.piece;
    let low = 0;
    let high = notes.length;
    while (low < high) {
      const middle = (low + high) >> 1;
      if (notes[middle].t < time) low = middle + 1;
      else high = middle;
    }
    return low;
  }

  dark() {
    for (const index of this.lit) for (const head of this.heads.get(index) || []) head.classList.remove("sounding");
    this.lit = new Set();
  }
}

function chordAt(piece, time) {
  let found = 0;
  piece.chords.forEach((chord, index) => {
    if (chord.t <= time + 0.001) found = index;
  });
  return found;
}

function calm() {
  return matchMedia("(prefers-reduced-motion: reduce)").matches;
}
