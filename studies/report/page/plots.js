// The linked plots: marks, parallel axes, selection.
let book;
const model = (name) => book.get_model_by_name(name);

const contextCache = new Map();
function context(column) {
  if (!contextCache.has(column)) contextCache.set(column, coarse(data.context.columns[column]));
  return contextCache.get(column);
}

function palette(share) {
  const colours = model("colours").palette;
  const index = Math.round(Math.min(Math.max(share, 0), 1) * (colours.length - 1));
  const number = Number.isFinite(index) ? colours[index] : 0x808080ff;
  return typeof number === "string" ? number : `#${(number >>> 8).toString(16).padStart(6, "0")}`;
}

function shownRows() {
  const rows = [];
  for (let i = 0; i < count; i += 1) if (state.families.has(familyOf[i])) rows.push(i);
  return rows;
}

function drawFront() {
  const x = values[state.x];
  const y = values[state.y];
  const line = familyOf.map((f) => families[f].colour);
  let fill = line;
  const bar = model("colour-bar");
  bar.visible = state.colour !== "family";
  if (state.colour !== "family") {
    const c = values[state.colour];
    const [low, high] = range(shownRows().map((i) => c[i]));
    const span = high - low || 1;
    fill = Array.from(c, (value) => palette((value - low) / span));
    const mapper = model("colours");
    mapper.low = low;
    mapper.high = low + span;
    bar.title = named(columns[state.colour]);
  }
  const about = new Set([state.x, state.y, ...(state.colour === "family" ? [] : [state.colour])]);
  const says = ids.map((id, i) =>
    [id, ...[...about].map((c) => `${columns[c].title} ${text(values[c][i])} ${columns[c].unit}`)]
      .join(" · "));
  const { xs, ys } = axesLines();
  model("front").data = {
    x: Array.from(x), y: Array.from(y), fill, line, design: ids, says, xs, ys,
    family: familyOf.map((f) => `f${f}`),
  };
  model("front-x-axis").axis_label = named(columns[state.x]);
  model("front-y-axis").axis_label = named(columns[state.y]);
  drawContext();
  drawVerified();
  drawRing();
  element("front-caption").textContent =
    `${columns[state.y].title} against ${columns[state.x].title}; the table of designs lists the ` +
    "same marks.";
}

// A ring about the design whose card is shown.
function drawRing() {
  const row = state.selected[place];
  const on = row !== undefined;
  model("ring").data = {
    x: on ? [values[state.x][row]] : [], y: on ? [values[state.y][row]] : [],
  };
}

function drawContext() {
  const on = element("show-context").checked && data.context.count;
  const wanted = on ? [] : null;
  if (on) {
    const owner = data.context.owner;
    for (let f = 0, start = 0; f < owner.length; start += owner[f], f += 1) {
      if (state.families.has(f)) wanted.push([start, start + owner[f]]);
    }
  }
  const take = (column) =>
    on ? wanted.flatMap(([a, b]) => Array.from(context(column).subarray(a, b))) : [];
  model("context").data = { x: take(state.x), y: take(state.y) };
}

function drawVerified() {
  const found = { x: [], y: [], x0: [], y0: [], design: [] };
  if (element("show-verified").checked) {
    for (const item of data.verified) {
      const x = item.values[state.x];
      const y = item.values[state.y];
      if (x === null || y === null || !state.families.has(familyOf[item.row])) continue;
      found.x.push(x);
      found.y.push(y);
      found.x0.push(values[state.x][item.row]);
      found.y0.push(values[state.y][item.row]);
      found.design.push(ids[item.row]);
    }
  }
  model("verified").data = found;
}

// -- parallel axes --

let ends = [];
function axesLines() {
  const rows = shownRows();
  ends = state.axes.map((c) => {
    const [low, high] = range(rows.map((i) => values[c][i]));
    return [low, high > low ? high : low + 1];
  });
  const places = state.axes.map((_, k) => k);
  const xs = ids.map(() => places);
  const ys = ids.map((_, i) =>
    state.axes.map((c, k) => (values[c][i] - ends[k][0]) / (ends[k][1] - ends[k][0])));
  return { xs, ys };
}

function drawAxes() {
  const last = state.axes.length - 1;
  const span = model("axes-x");
  span.start = -0.5;
  span.end = last + 0.5;
  const axis = model("axes-axis");
  model("axes-ticks").ticks = state.axes.map((_, k) => k);
  axis.major_label_overrides = new Map(state.axes.map((c, k) => [k, named(columns[c])]));
  model("axes-ends").data = {
    x: state.axes.flatMap((_, k) => [k, k]),
    y: state.axes.flatMap(() => [-0.05, 1.05]),
    text: ends.flatMap(([low, high]) => [text(low), text(high)]),
  };
}

function brush(geometry) {
  if (geometry.type !== "rect") return;
  const [x0, x1] = [geometry.x0, geometry.x1].sort((a, b) => a - b);
  const [y0, y1] = [geometry.y0, geometry.y1].sort((a, b) => a - b);
  const hit = state.axes.map((_, k) => k).filter((k) => k >= x0 && k <= x1);
  if (!hit.length) return;
  const share = (k, i) => (values[state.axes[k]][i] - ends[k][0]) / (ends[k][1] - ends[k][0]);
  select(state.passing.filter((i) => hit.every((k) => share(k, i) >= y0 && share(k, i) <= y1)));
}

// -- selection --

function select(rows) {
  model("front").selected.indices = rows;
}

function connectPlots() {
  const front = model("front");
  front.selected.properties.indices.change.connect(() => {
    state.selected = front.selected.indices.filter((i) => state.families.has(familyOf[i]));
    selectionChanged();
  });
  model("axes-plot").on_event("selectiongeometry", (event) => {
    if (event.final !== false) brush(event.geometry);
  });
}
