// Two pictures: where the home note lies, and how pure each bar is. Both lead to a bar by a click.

const SVG = "http://www.w3.org/2000/svg";

function draw(name, attributes, ...children) {
  const made = document.createElementNS(SVG, name);
  for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
  made.append(...children);
  return made;
}

function stairs(points, end, x, y) {
  let path = "";
  points.forEach(([time, cents], index) => {
    const next = index + 1 < points.length ? points[index + 1][0] : end;
    path += `${index ? "L" : "M"}${x(time)} ${y(cents)}L${x(next)} ${y(cents)}`;
  });
  return path;
}

class DriftView {
  constructor(box, piece, player) {
    Object.assign(this, { box, piece, player });
    box.append(this.paths(), this.purity());
  }

  barEnd(index) {
    const { bars, length } = this.piece;
    return index + 1 < bars.length ? bars[index + 1].t : length;
  }

  frame(words, height, low, high, label) {
    const { length } = this.piece;
    const [left, right, top, bottom] = [56, 990, 12, height - 28];
    const x = (time) => (left + (right - left) * (time / length)).toFixed(1);
    const y = (value) => (bottom - (bottom - top) * ((value - low) / (high - low))).toFixed(1);
    const picture = draw("svg", { viewBox: `0 0 1000 ${height}`, role: "img", "aria-label": words });
    const step = [1, 2, 5, 10, 20, 50, 100, 200, 500].find((one) => (high - low) / one <= 6) || 1000;
    for (let value = Math.ceil(low / step) * step; value <= high; value += step) {
      picture.append(
        draw("line", { x1: left, x2: right, y1: y(value), y2: y(value), class: value === 0 ? "zero" : "rule" }),
        draw("text", { x: left - 6, y: Number(y(value)) + 4, "text-anchor": "end", class: "tick" }, label(value)),
      );
    }
    return { picture, x, y, bottom, top };
  }

  // Numbers of bars below, as many as there is room for, and an area a bar to click on.
  barLine(view, words) {
    const { bars } = this.piece;
    let last = -1e9;
    bars.forEach((bar, index) => {
      const from = Number(view.x(bar.t));
      const to = Number(view.x(this.barEnd(index)));
      if (bar.n && from - last > 34) {
        last = from;
        view.picture.append(draw("text", { x: from, y: view.bottom + 18, class: "tick" }, bar.n));
      }
      const area = draw("rect", {
        x: from, y: view.top, width: Math.max(to - from, 1), height: view.bottom - view.top, class: "bararea",
      }, draw("title", {}, words(bar, index)));
      area.addEventListener("click", () => this.player.seek(bar.t));
      view.picture.append(area);
    });
  }

  paths() {
    const { drift, length } = this.piece;
    const values = [...drift.here, ...drift.follow].map(([, cents]) => cents);
    const low = Math.min(-12, ...values) - 4;
    const high = Math.max(12, ...values) + 4;
    const end = drift.follow[drift.follow.length - 1][1];
    const most = drift.here.reduce((a, b) => (Math.abs(b[1]) > Math.abs(a[1]) ? b : a))[1];
    const words = `The home note ${pretty(drift.tonic)} stays within ${Math.abs(most).toFixed(0)} cents as tuned here; pure steps alone would lead it to ${signed(end, 0)} cents at the end.`;
    const view = this.frame(words, 240, low, high, (value) => signed(value, 0));
    view.picture.append(
      draw("path", { d: stairs(drift.follow, length, view.x, view.y), class: "pathfollow" }),
      draw("path", { d: stairs(drift.here, length, view.x, view.y), class: "pathhere" }),
    );
    this.barLine(view, (bar) => `Bar ${bar.n}`);
    return element("figure", {},
      element("figcaption", {},
        element("strong", {}, `Where ${pretty(drift.tonic)} lies, in cents`), " ",
        element("span", { class: "key keyhere" }, "as tuned here"), " ",
        element("span", { class: "key keyfollow" }, "where pure steps from chord to chord would lead (dashed)"),
      ),
      view.picture,
      element("p", {}, words, " This is what the steps imply, not a forecast of what a choir does."),
    );
  }

  purity() {
    const { drift, bars } = this.piece;
    const known = drift.purity.filter(Boolean);
    const high = Math.max(10, ...known.map(([, equal]) => equal)) + 1;
    const view = this.frame("Mean distance from just of the intervals in each bar, here and in equal temperament.", 180, 0, high, String);
    bars.forEach((bar, index) => {
      const value = drift.purity[index];
      if (!value) return;
      const from = Number(view.x(bar.t));
      const width = Math.max(Number(view.x(this.barEnd(index))) - from - 1.5, 0.8);
      const column = (cents, name) => draw("rect", {
        x: from, width, y: view.y(cents), height: (view.bottom - Number(view.y(cents))).toFixed(1), class: name,
      });
      view.picture.append(column(value[1], "columnequal"), column(value[0], "columnhere"));
    });
    this.barLine(view, (bar, index) => {
      const value = drift.purity[index];
      return value ? `Bar ${bar.n}: ${value[0].toFixed(1)} cents here, ${value[1].toFixed(1)} equal` : `Bar ${bar.n}`;
    });
    return element("figure", {},
      element("figcaption", {},
        element("strong", {}, "How far thirds, fifths and sixths lie from just, bar by bar, in cents"), " ",
        element("span", { class: "key keycolumn" }, "as tuned here (filled)"), " ",
        element("span", { class: "key keyoutline" }, "in equal temperament (outline)"),
      ),
      view.picture,
    );
  }
}
