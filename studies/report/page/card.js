// The card of one design.
let cards = null;

function fact(term, detail) {
  return [make("dt", term), make("dd", detail)];
}

function selectionChanged() {
  place = 0;
  drawTable();
  showCard();
}

function showCard() {
  const chosen = state.selected;
  element("card-back").disabled = place === 0;
  element("card-on").disabled = place >= chosen.length - 1;
  element("card-place").textContent =
    chosen.length > 1 ? `${place + 1} of ${chosen.length} selected` : "";
  drawRing();
  if (chosen.length) fillCard(chosen[place]);
}

function valueText(column, row) {
  return `${text(values[column][row])}${columns[column].unit ? ` ${columns[column].unit}` : ""}`;
}

function fillCard(row) {
  const family = families[familyOf[row]];
  const card = element("card");
  card.dataset.design = ids[row];
  element("card-title").replaceChildren(swatch(family), ` ${ids[row]}`);
  const verdict = [`Family ${family.label}, coil pitch ${family.pitch}, study ${family.study}. `];
  if (row === family.compromise) {
    verdict.push("Of its front it is nearest to the best value of all objectives together. ");
  }
  const checked = data.verified.find((item) => item.row === row);
  if (checked) verdict.push(`Verified by ${checked.evaluator}. `);
  element("card-verdict").replaceChildren(...verdict);
  element("card-key").replaceChildren(
    ...data.start.key.flatMap((c) => fact(columns[c].title, valueText(c, row))));
  fillLimits(row, family);
  fillLosses(row);
  const list = (kinds) => columns.map((_, c) => c).filter((c) => kinds.includes(columns[c].kind));
  const lines = (list_) => list_.map((c) => {
    const cells = [make("th", columns[c].title, { scope: "row", title: columns[c].definition }),
      make("td", valueText(c, row))];
    if (checked) {
      const found = checked.values[c];
      cells.push(make("td", found === null ? "" : `${text(found)} verified`));
    }
    return make("tr", cells);
  });
  element("card-variables").tBodies[0].replaceChildren(...lines(list(["variable"])));
  element("card-metrics").tBodies[0].replaceChildren(...lines(list(["metric", "objective"])));
  if (cards) fillDrawings(row);
}

function fillLimits(row, family) {
  element("card-limits").tBodies[0].replaceChildren(...family.limits.map((limit) => {
    const value = values[limit.column][row];
    const over = limit.kind === "at_most" ? limit.value - value : value - limit.value;
    const reserve = over / limit.scale;
    const share = limit.value ? percent(reserve) : text(reserve);
    return make("tr", [
      make("th", columns[limit.column].title, { scope: "row" }),
      make("td", valueText(limit.column, row)),
      make("td", `${limit.kind === "at_most" ? "≤" : "≥"} ${text(limit.value)}`),
      make("td", share, { class: reserve < data.binding ? "tight" : "" }),
    ]);
  }));
}

function fillLosses(row) {
  const total = values[data.losses.total]?.[row];
  element("card-losses").tBodies[0].replaceChildren(...data.losses.parts.map((c) => {
    const share = values[c][row] / total;
    const bar = make("td", percent(share), { class: "bar" });
    bar.style.setProperty("--share", `${100 * share}%`);
    return make("tr", [make("th", columns[c].title, { scope: "row" }),
      make("td", text(values[c][row])), bar]);
  }), ...(total === undefined ? [] : [make("tr", [make("th", "total", { scope: "row" }),
    make("td", text(total)), make("td", "")], { class: "sum" })]));
}

function fillDrawings(row) {
  const found = cards.designs[row];
  element("card-section").innerHTML = found.section;
  element("card-winding").innerHTML = cards.windings[familyOf[row]];
  const curves = found.curves;
  element("card-curves-note").textContent = curves
    ? `Whole stack, by the evaluator ${families[familyOf[row]].curvesBy}, at the temperatures ` +
      "the study states; where the heat network solves them, the metrics hold at its own."
    : "No curves: the evaluator gives none, or they would have taken too long.";
  element("card-linear").textContent = curves && curves.current.length
    ? "Taken as linear in the current, without saturation by the suspension current itself. The " +
      "angle is the largest between the force and its mean over the turn."
    : "Not available.";
  const wave = (name) => (curves && curves[name] ? Array.from(coarse(curves[name])) : []);
  const turn = wave("torque").map((_, k, all) => (360 * k) / all.length);
  const fill = (name, content) => { model(`curve-${name}`).data = content; };
  const cogging = wave("cogging");
  const less = (list) => {
    const mean = list.reduce((sum, value) => sum + value, 0) / list.length;
    return list.map((value) => value - mean);
  };
  for (const box of document.querySelectorAll("#card-curves .plot")) box.hidden = !curves;
  if (!curves) return;
  fill("torque", { x: turn, y0: less(wave("torque")), y1: turn.map((_, k) => cogging[k] ?? NaN) });
  fill("force", { x: turn, y0: less(wave("xx")), y1: less(wave("xy")) });
  fill("locus-x", locus(wave("xx"), wave("xy")));
  fill("locus-y", locus(wave("yx"), wave("yy")));
  fill("against", { x: curves.current, y0: curves.force });
  fill("error", { x: curves.current, y0: curves.angle, y1: curves.error.map((e) => 100 * e) });
}

// The closed path of a force about its mean, along and across the mean, in per cent of it.
function locus(along, across) {
  const n = along.length;
  const mean = (list) => list.reduce((sum, value) => sum + value, 0) / n;
  const [mx, my] = [mean(along), mean(across)];
  const square = (mx * mx + my * my) / 100;
  const x = along.map((v, k) => ((v - mx) * mx + (across[k] - my) * my) / square);
  const y = along.map((v, k) => ((across[k] - my) * mx - (v - mx) * my) / square);
  return n ? { x: [...x, x[0]], y: [...y, y[0]] } : { x: [], y: [] };
}

function connectCard() {
  for (const button of document.querySelectorAll("[data-design]")) {
    const row = rowOf.get(button.dataset.design);
    if (button.id === "card" || row === undefined) continue;
    button.addEventListener("click", () => {
      select([row]);
      element("card").scrollIntoView({ block: "nearest" });
      element("card-title").focus({ preventScroll: true });
    });
  }
  for (const [id, step] of [["card-back", -1], ["card-on", 1]]) {
    element(id).addEventListener("click", () => {
      place += step;
      showCard();
    });
  }
}
