// The transfer matrix as a grid: rows are weft, columns are warp, a knot is an element that is not zero.

const STEP = { ArrowUp: [-1, 0], ArrowDown: [1, 0], ArrowLeft: [0, -1], ArrowRight: [0, 1] };

function node(tag, attributes = {}, ...children) {
  const made = document.createElement(tag);
  for (const [name, value] of Object.entries(attributes)) made.setAttribute(name, value);
  made.append(...children);
  return made;
}

function bytes(model, name, Type) {
  const view = model.get(name);
  if (!view || view.byteLength === 0) return null;
  return new Type(view.buffer.slice(view.byteOffset, view.byteOffset + view.byteLength));
}

export function cellSize(n) {
  return [[6, 62], [10, 52], [15, 34], [21, 27], [28, 21], [36, 18]].find(([most]) => n <= most)?.[1] ?? 15;
}

function numbered(n) {
  return cellSize(n) >= 50;
}

export function shortNumber(x) {
  if (x === 0) return "0";
  const size = Math.abs(x);
  if (size >= 1000 || size < 0.01) return x.toExponential(1).replaceAll("-", "−");
  return x.toPrecision(3).replace("-", "−");
}

export function complexNumber(re, im) {
  if (!im) return shortNumber(re);
  return `${shortNumber(re)} ${im < 0 ? "−" : "+"} ${shortNumber(Math.abs(im))} i`;
}

// Side of a knot, 0.3 … 1 on a logarithmic scale over at most six decades below the largest element.
export function knotSizes(magnitudes) {
  const largest = Math.max(...magnitudes);
  const seen = magnitudes.filter((m) => m > 0);
  if (!seen.length) return magnitudes.map(() => 0);
  const floor = Math.max(Math.min(...seen), largest * 1e-6);
  const span = Math.log(largest / floor) || 1;
  return magnitudes.map((m) => (m > 0 ? 0.3 + 0.7 * Math.max(0, 1 - Math.log(largest / m) / span) : 0));
}

// Everything the page shows, read from the synced traits.
function read(model) {
  const rows = model.get("rows");
  const n = rows.length;
  const pattern = bytes(model, "pattern", Uint8Array) ?? new Uint8Array(n * n);
  const re = bytes(model, "re", Float64Array);
  const im = bytes(model, "im", Float64Array);
  const known = re && re.length === n * n;
  const magnitudes = known ? Array.from(re, (x, i) => (pattern[i] ? Math.hypot(x, im ? im[i] : 0) : 0)) : null;
  return { rows, n, order: model.get("order"), pattern, re: known ? re : null, im, magnitudes };
}

function stepOf(data, i, j) {
  const k = data.rows[i].nality - data.rows[j].nality;
  return ((k % data.order) + data.order) % data.order;
}

function describe(data, i, j) {
  const at = i * data.n + j;
  const place = `row ${data.rows[i].name}, column ${data.rows[j].name}`;
  if (!data.pattern[at]) return `${place}: exactly zero`;
  const value = data.re ? `, value ${complexNumber(data.re[at], data.im ? data.im[at] : 0)}` : "";
  return `${place}: N-ality step ${stepOf(data, i, j)}${value}`;
}

function header(role, row) {
  const made = node("div", { role, class: `hl-k${row.nality}`, title: `${row.name}: labels (${row.labels.join(", ")}), dimension ${row.dimension}, N-ality ${row.nality}` });
  const barred = row.name.endsWith("bar");
  const label = node("span", { class: barred ? "hl-bar" : "" });
  label.textContent = row.name.replace(/bar$/, "").replaceAll("'", "′");
  made.append(label);
  return made;
}

function buildCells(data, frame) {
  const cells = [];
  const top = node("div", { role: "row", class: "hl-first" }, node("div", { class: "hl-corner", role: "columnheader", "aria-label": "row \\ column" }, "r \\ s"));
  const columns = data.rows.map((row) => header("columnheader", row));
  top.append(...columns);
  const rowHeads = data.rows.map((row) => header("rowheader", row));
  const body = data.rows.map((_, i) => {
    const line = node("div", { role: "row" }, rowHeads[i]);
    for (let j = 0; j < data.n; j++) {
      const cell = node("div", { role: "gridcell", tabindex: "-1", "data-lm-suppress-shortcuts": "true" });
      cell.dataset.row = i;
      cell.dataset.column = j;
      if (data.pattern[i * data.n + j]) cell.className = `hl-knot hl-k${stepOf(data, i, j)}`;
      cells.push(cell);
      line.append(cell);
    }
    return line;
  });
  frame.replaceChildren(top, ...body);
  return { cells, columns, rowHeads };
}

function paintValues(data, cells, withNumbers) {
  const sizes = data.magnitudes ? knotSizes(data.magnitudes) : null;
  cells.forEach((cell, at) => {
    if (!data.pattern[at]) return;
    cell.style.setProperty("--size", sizes ? sizes[at].toFixed(3) : "0.8");
    cell.classList.toggle("hl-vanishing", Boolean(sizes) && data.magnitudes[at] === 0);
    cell.classList.toggle("hl-negative", Boolean(data.re) && data.re[at] < 0);
    if (!withNumbers) return;
    const number = cell.firstChild ?? cell.appendChild(node("div", { class: "hl-number", "aria-hidden": "true" }));
    number.textContent = data.re ? shortNumber(data.re[at]) : "";
  });
}

function legend(data, box) {
  const used = new Set();
  for (let i = 0; i < data.n; i++)
    for (let j = 0; j < data.n; j++) if (data.pattern[i * data.n + j]) used.add(stepOf(data, i, j));
  const swatches = [...used].sort().map((k) =>
    node("span", {}, node("i", { class: `hl-swatch hl-knot hl-k${k}` }), `N-ality of r − s ≡ ${k} (mod ${data.order})`));
  const sizes = data.magnitudes?.filter((m) => m > 0) ?? [];
  const range = sizes.length && !numbered(data.n) ? `size: |T| on a log scale, ${shortNumber(Math.min(...sizes))} … ${shortNumber(Math.max(...sizes))}` : "";
  const vanishing = data.magnitudes?.some((m, at) => data.pattern[at] && m === 0) ? "small ring: zero at these values only" : "";
  const negative = data.re?.some((x, at) => data.pattern[at] && x < 0) ? "open: negative" : "";
  box.replaceChildren(...swatches, node("span", {}, "no knot: exactly zero"), ...[vanishing, range, negative].filter(Boolean).map((words) => node("span", {}, words)));
}

export default {
  render({ model, el }) {
    const root = node("div", { class: "haarloom hl-grid" });
    const frame = node("div", { class: "hl-frame", role: "grid", "aria-label": "Transfer matrix elements" });
    const readout = node("div", { class: "hl-readout" });
    const legendBox = node("div", { class: "hl-legend" });
    root.append(frame, readout, legendBox);
    el.append(root);
    let data, parts, focus = [0, 0];

    const at = (i, j) => parts.cells[i * data.n + j];
    const tell = (i, j) => (readout.textContent = describe(data, i, j));
    const settle = () => {
      const [row, column] = model.get("selected");
      const valid = row >= 0 && row < data.n && column >= 0 && column < data.n;
      parts.cells.forEach((cell) => cell.setAttribute("aria-selected", "false"));
      for (const heads of [parts.rowHeads, parts.columns]) heads.forEach((head) => head.classList.remove("hl-lit"));
      if (!valid) return;
      at(row, column).setAttribute("aria-selected", "true");
      parts.rowHeads[row].classList.add("hl-lit");
      parts.columns[column].classList.add("hl-lit");
      tell(row, column);
    };
    const moveTo = (i, j, grab) => {
      at(...focus)?.setAttribute("tabindex", "-1");
      focus = [Math.min(data.n - 1, Math.max(0, i)), Math.min(data.n - 1, Math.max(0, j))];
      const cell = at(...focus);
      cell.setAttribute("tabindex", "0");
      if (grab) cell.focus();
    };
    const choose = (i, j) => {
      moveTo(i, j, false);
      model.set("selected", [i, j]);
      model.save_changes();
    };
    const rebuild = () => {
      data = read(model);
      const size = cellSize(data.n);
      const longest = Math.max(1, ...data.rows.map((row) => row.name.replace(/bar$/, "").length));
      root.style.setProperty("--cell", `${size}px`);
      root.style.setProperty("--headroom", `${Math.max(40, 18 + 7.5 * longest)}px`);
      root.classList.toggle("hl-dense", size < 40);
      root.classList.toggle("hl-numbered", numbered(data.n));
      frame.setAttribute("aria-rowcount", data.n);
      frame.setAttribute("aria-colcount", data.n);
      parts = buildCells(data, frame);
      focus = [0, 0];
      repaint();
      const [row, column] = model.get("selected");
      if (data.n) moveTo(row, column, false);
    };
    const repaint = () => {
      data = read(model);
      paintValues(data, parts.cells, numbered(data.n));
      parts.cells.forEach((cell, k) => cell.setAttribute("aria-label", describe(data, Math.floor(k / data.n), k % data.n)));
      legend(data, legendBox);
      settle();
    };
    // Several traits arrive in one message: one drawing answers them all.
    let waiting = 0, wholly = false;
    const later = (whole) => () => {
      wholly ||= whole;
      waiting ||= requestAnimationFrame(() => {
        waiting = 0;
        (wholly ? rebuild : repaint)();
        wholly = false;
      });
    };

    frame.addEventListener("click", (event) => {
      const cell = event.target.closest('[role="gridcell"]');
      if (cell) choose(Number(cell.dataset.row), Number(cell.dataset.column));
    });
    for (const kind of ["pointerover", "focusin"])
      frame.addEventListener(kind, (event) => {
        const cell = event.target.closest('[role="gridcell"]');
        if (cell) tell(Number(cell.dataset.row), Number(cell.dataset.column));
      });
    frame.addEventListener("pointerleave", settle);
    frame.addEventListener("keydown", (event) => {
      const [i, j] = focus;
      const last = data.n - 1;
      const target = STEP[event.key] ? [i + STEP[event.key][0], j + STEP[event.key][1]]
        : event.key === "Home" ? [event.ctrlKey ? 0 : i, 0]
        : event.key === "End" ? [event.ctrlKey ? last : i, last]
        : event.key === "PageUp" ? [i - 5, j]
        : event.key === "PageDown" ? [i + 5, j]
        : null;
      const opens = event.key === "Enter" || event.key === " ";
      if (!target && !opens) return;
      event.preventDefault();
      event.stopPropagation();
      if (opens) choose(i, j);
      else moveTo(...target, true);
    });

    const whole = later(true), light = later(false);
    for (const name of ["rows", "pattern", "order"]) model.on(`change:${name}`, whole);
    for (const name of ["re", "im", "selected"]) model.on(`change:${name}`, light);
    rebuild();
    return () => {
      cancelAnimationFrame(waiting);
      for (const name of ["rows", "pattern", "order"]) model.off(`change:${name}`, whole);
      for (const name of ["re", "im", "selected"]) model.off(`change:${name}`, light);
    };
  },
};
