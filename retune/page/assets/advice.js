// What singers are told of single bars: the places hardest to tune. A click goes to the bar.

class AdviceView {
  constructor(section, box, piece, go) {
    Object.assign(this, { section, box, piece, go });
  }

  // The chosen part's own first, then the hardest of the others; for nobody, the hardest of all.
  show(part) {
    const { advice, parts } = this.piece;
    const own = part === null ? [] : advice.filter((one) => !one.who.length || one.who.includes(part));
    const others = advice.filter((one) => one.main && !own.includes(one));
    this.section.hidden = !own.length && !others.length;
    if (part === null) this.box.replaceChildren(this.list(others, null));
    else {
      this.box.replaceChildren(
        ...this.group(parts[part].name, own, part),
        ...this.group(own.length ? "The others" : "", others, null),
      );
    }
  }

  group(title, notes, part) {
    if (!notes.length) return [];
    return [...(title ? [element("h3", {}, title)] : []), this.list(notes, part)];
  }

  list(notes, part) {
    return element("ul", { class: "advice" }, ...notes.map((note) => this.item(note, part)));
  }

  // One note; the part whose list it stands in is not named again.
  item(note, part) {
    const alone = note.who.length === 1 && note.who[0] === part;
    const who = note.who.map((part) => this.piece.parts[part].name).join(", ") || "Everybody";
    const places = note.at.map(([bar, time]) =>
      element("button", { type: "button", onclick: () => this.go(time), "aria-label": `Go to bar ${bar}` }, `bar ${bar}`));
    const what = note.what ? element("span", { class: "what" }, alone ? note.what : ` \u00b7 ${note.what}`) : "";
    return element("li", {},
      element("div", { class: "places" }, ...places, element("span", {}, alone ? "" : element("strong", {}, who), what)),
      element("p", {}, note.kind === "director" ? note.text : withSigns(note.text)),
      ...(note.listen ? [element("p", { class: "listen" }, withSigns(note.listen))] : []),
    );
  }
}

// Names of pitches and chords in a sentence as musicians write them.
function withSigns(text) {
  return text.replace(/\b([A-G])(##|bb|#|b)(?=[\dm\s,.:;?(]|dim|aug|maj|sus|add|$)/g, (_, letter, signs) => letter + pretty(signs));
}
