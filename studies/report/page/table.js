// The table of designs: sorts by any column, marks the selection, opens cards.
const PAGE = 25;
const sorting = { column: -1, falling: false, page: 0 };

function tableRows() {
  const which = element("pick-rows").value;
  let rows = which === "all" ? shownRows() : state.passing.slice();
  if (which === "selected") rows = state.selected.slice();
  const key = sorting.column < 0 ? null : values[sorting.column];
  rows.sort((a, b) => {
    const order = key ? key[a] - key[b] : a - b;
    return (sorting.falling ? -order : order) || a - b;
  });
  return rows;
}

function drawHead() {
  const heads = [["design", -1], ...data.start.table.map((c) => [named(columns[c]), c])];
  const cells = heads.map(([said, column]) => {
    const here = sorting.column === column;
    const arrow = here ? (sorting.falling ? " ▼" : " ▲") : "";
    const button = make("button", said + arrow, { type: "button" });
    button.addEventListener("click", () => {
      sorting.falling = here ? !sorting.falling : false;
      sorting.column = column;
      sorting.page = 0;
      drawHead();
      drawTable();
      element("table").tHead.querySelectorAll("button")[heads.findIndex((h) => h[1] === column)]
        .focus();
    });
    return make("th", button, {
      scope: "col",
      "aria-sort": here ? (sorting.falling ? "descending" : "ascending") : "none",
    });
  });
  element("table").tHead.replaceChildren(make("tr", cells));
}

function drawTable() {
  const rows = tableRows();
  const last = Math.max(0, Math.ceil(rows.length / PAGE) - 1);
  sorting.page = Math.min(sorting.page, last);
  const start = sorting.page * PAGE;
  const chosen = new Set(state.selected);
  const passing = new Set(state.passing);
  const lines = rows.slice(start, start + PAGE).map((row) => {
    const family = families[familyOf[row]];
    const button = make("button", ids[row], { type: "button", class: "design" });
    button.dataset.row = row;
    button.addEventListener("click", () => select([row]));
    const mark = swatch(family);
    const cells = data.start.table.map((c) => make("td", text(values[c][row])));
    const line = make("tr", [make("th", [mark, button], { scope: "row" }), ...cells], {
      "aria-selected": chosen.has(row),
    });
    if (!passing.has(row)) line.className = "failing";
    return line;
  });
  element("table").tBodies[0].replaceChildren(...lines);
  element("table-range").textContent = rows.length
    ? `${start + 1} to ${Math.min(start + PAGE, rows.length)} of ${rows.length}`
    : "none";
  element("earlier").disabled = sorting.page === 0;
  element("later").disabled = sorting.page === last;
}

function swatch(family) {
  const space = "http://www.w3.org/2000/svg";
  const svg = document.createElementNS(space, "svg");
  for (const [key, value] of [["viewBox", "-7 -7 14 14"], ["class", "swatch"],
    ["role", "img"], ["aria-label", family.label]]) svg.setAttribute(key, value);
  const path = document.createElementNS(space, "path");
  path.setAttribute("d", family.path);
  path.setAttribute("fill", family.colour);
  svg.append(path);
  return svg;
}

function connectTable() {
  sorting.column = data.objectives[0];
  drawHead();
  element("pick-rows").addEventListener("change", () => {
    sorting.page = 0;
    drawTable();
  });
  for (const [id, step] of [["earlier", -1], ["later", 1]]) {
    element(id).addEventListener("click", () => {
      sorting.page += step;
      drawTable();
    });
  }
}
