// Sliders that tighten limits, and what passes them.
function startBounds() {
  state.bounds = data.bounds.map((item) => ({ ...item, value: item.start }));
}

function passes(row) {
  return state.bounds.every(({ column, kind, value, start }) => {
    if (value === start) return true; // every design shown meets the study's own limit
    const here = values[column][row];
    return kind === "at_most" ? here <= value : here >= value;
  });
}

function applyLimits() {
  const rows = shownRows();
  const passing = rows.filter(passes);
  const kept = new Set(passing);
  state.passing = passing;
  model("passing").indices = passing;
  model("failing").indices = rows.filter((i) => !kept.has(i));
  element("tally").textContent = `${passing.length} of ${rows.length} designs pass.`;
  drawTable();
}
const applySoon = once(applyLimits);

function slider(bound) {
  const column = columns[bound.column];
  const said = bound.kind === "at_most" ? "at most" : "at least";
  const [low, high] = range(values[bound.column]);
  const loose = bound.start;
  const from = Math.min(low, loose);
  const to = Math.max(high, loose);
  const name = `${named(column)}, ${said}`;
  const bar = make("input", [], {
    type: "range", min: 0, max: 1000, step: 1, "aria-label": name,
  });
  const box = make("input", [], { type: "number", step: "any", "aria-label": `${name}, number` });
  // The bar runs from tight to loose in the sense of its values, left small and right large.
  const span = to - from || 1;
  const show = (skip) => {
    if (skip !== bar) bar.value = Math.round(((bound.value - from) / span) * 1000);
    if (skip !== box) box.value = Number(bound.value.toPrecision(5));
    bar.setAttribute("aria-valuetext", `${text(bound.value)} ${column.unit}`);
  };
  bar.addEventListener("input", () => {
    const value = from + (bar.value / 1000) * span;
    const end = bound.kind === "at_most" ? Number(bar.value) === 1000 : Number(bar.value) === 0;
    bound.value = end ? loose : value;
    show(bar);
    applySoon();
  });
  box.addEventListener("change", () => {
    if (box.value !== "" && Number.isFinite(Number(box.value))) bound.value = Number(box.value);
    show(null);
    applySoon();
  });
  show(null);
  return make("div", [
    make("span", column.title, { class: "slider-name", title: column.definition }),
    make("span", said, { class: "quiet" }), bar, box, make("span", column.unit, { class: "unit" }),
  ], { class: "slider" });
}

function drawSliders() {
  element("sliders").replaceChildren(...state.bounds.map(slider));
}

function addBound() {
  const [column, kind] = element("pick-limit").value.split(" ");
  if (!kind) return;
  const [low, high] = range(values[Number(column)]);
  const start = kind === "at_most" ? high : low;
  state.bounds.push({ column: Number(column), kind, start, value: start });
  drawSliders();
  element("pick-limit").value = "";
  element("sliders").lastElementChild.querySelector("input").focus();
}

function connectLimits() {
  startBounds();
  drawSliders();
  const choice = element("pick-limit");
  choice.append(make("option", "choose", { value: "" }));
  columns.forEach((column, i) => {
    if (column.better !== -1) {
      choice.append(make("option", `${named(column)}: at least`, { value: `${i} at_least` }));
    }
    if (column.better !== 1) {
      choice.append(make("option", `${named(column)}: at most`, { value: `${i} at_most` }));
    }
  });
  choice.addEventListener("change", addBound);
  element("reset-limits").addEventListener("click", () => {
    startBounds();
    drawSliders();
    applyLimits();
  });
}
