// Lines for the choices file, for a root or a ratio that was settled by ear on the chord card.

class Chooser {
  constructor(piece, player) {
    Object.assign(this, { piece, player });
  }

  // The part of a card that offers them; nothing where the choices could not be given back.
  view(chord) {
    if (!chord.choose) return [];
    const lines = element("pre", { tabindex: "0", "aria-label": "Lines for the choices" });
    const said = element("span", { role: "status" });
    const show = (text) => {
      lines.textContent = text;
      said.textContent = "";
    };
    const root = this.menu("chooseroot", "Root", this.roots(chord), chord.root);
    const quality = this.menu("choosequality", "Quality", this.piece.qualities, chord.quality);
    const byRoot = () => show(this.chordLines(chord, root.menu.value, quality.menu.value));
    const notes = chord.tones.flatMap((tone, index) => tone.sizes.map((size) => [tone, index, size]));
    const note = this.menu("chooseratio", "Note and ratio",
      notes.map(([tone, , [ratio]]) => `${this.piece.parts[tone.p].name} ${pretty(tone.n)} as ${ratio}`), null);
    const chosen = () => notes[note.menu.selectedIndex];
    const byRatio = () => {
      const [tone, , [ratio]] = chosen();
      show(this.ratioLines(chord, tone, ratio));
    };
    const hear = () => {
      const [tone, index, [, times]] = chosen();
      const tones = chord.tones.map((one, i) => (i === index ? { ...one, hz: tone.hz * times } : one));
      this.player.hold(tones, false);
      byRatio();
    };
    for (const one of [root, quality]) one.menu.addEventListener("change", byRoot);
    note.menu.addEventListener("change", byRatio);
    byRoot();
    const copy = async () => {
      const selection = getSelection();
      selection.selectAllChildren(lines);
      try {
        await navigator.clipboard.writeText(lines.textContent);
        said.textContent = "Copied";
      } catch {
        said.textContent = "Selected; copy it with the keys for copying";
      }
    };
    return [element("details", { class: "choose" },
      element("summary", {}, "Decide it otherwise"),
      element("p", {}, "Choose, copy the lines, and put them at the end of ",
        element("code", {}, this.piece.choices), " beside the score."),
      element("div", { class: "sounds" }, root.box, quality.box),
      ...(notes.length ? [element("div", { class: "sounds" }, note.box,
        element("button", { type: "button", onclick: hear }, "Hear it so"))] : []),
      lines,
      element("div", { class: "sounds" },
        element("button", { type: "button", onclick: copy }, "Copy the lines"), said),
    )];
  }

  menu(id, label, words, chosen) {
    const menu = element("select", { id },
      ...words.map((word) => element("option", { value: word, selected: word === chosen }, id === "chooseroot" ? pretty(word) : word)));
    return { menu, box: element("span", { class: "field" }, element("label", { for: id }, label), menu) };
  }

  // The chord's own root first, then what sounds, then the rest.
  roots(chord) {
    const sounding = chord.tones.map((tone) => tone.n.replace(/-?\d+$/, ""));
    const rest = ["C", "C#", "Db", "D", "Eb", "E", "F", "F#", "Gb", "G", "Ab", "A", "Bb", "B"];
    return [...new Set([chord.root, ...sounding, ...rest])];
  }

  chordLines(chord, root, quality) {
    return ["[[chord]]", `at = "${chord.choose.at}"`, `root = "${root}"`, `quality = "${quality}"`,
      `sounds = "${chord.choose.sounds}"`].join("\n");
  }

  ratioLines(chord, tone, ratio) {
    return ["[[ratio]]", `at = "${chord.choose.at}"`, `part = ${JSON.stringify(this.piece.parts[tone.p].name)}`,
      `ratio = "${ratio}"`, `sounds = "${chord.choose.sounds}"`].join("\n");
  }
}
