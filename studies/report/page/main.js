// Puts the parts together once the plots are there.
function fillChoices() {
  for (const [id, key] of [["pick-x", "x"], ["pick-y", "y"], ["pick-colour", "colour"]]) {
    const choice = element(id);
    choice.value = String(state[key]);
    choice.addEventListener("change", () => {
      state[key] = choice.value === "family" ? "family" : Number(choice.value);
      drawFront();
    });
  }
  element("show-context").addEventListener("change", drawContext);
  element("show-verified").addEventListener("change", drawVerified);
  element("verified-switch").hidden = !data.verified.length;
  for (const box of document.querySelectorAll("[data-family]")) {
    box.addEventListener("change", () => {
      const family = Number(box.dataset.family);
      if (box.checked) state.families.add(family);
      else state.families.delete(family);
      drawFront();
      drawAxes();
      applyLimits();
      select(state.selected.filter((i) => state.families.has(familyOf[i])));
    });
  }
  element("pick-axes").append(...columns.map((column, c) => {
    const box = make("input", [], { type: "checkbox" });
    box.checked = state.axes.includes(c);
    box.addEventListener("change", () => {
      state.axes = columns.map((_, k) => k)
        .filter((k) => (k === c ? box.checked : state.axes.includes(k)));
      drawFront();
      drawAxes();
    });
    return make("label", [box, ` ${named(column)}`], { title: column.definition });
  }));
}

function begin() {
  book = Bokeh.documents[0];
  connectTable();
  connectLimits();
  connectCard();
  fillChoices();
  connectPlots();
  connectPrinting();
  connectCertainty();
  drawFront();
  drawAxes();
  applyLimits();
  select([data.start.row]);
  document.documentElement.dataset.ready = "plots";
  performance.mark("plots");
  unpack("report-cards").then((found) => {
    cards = found;
    showCard();
    document.documentElement.dataset.ready = "cards";
  }, () => {
    const note = element("trouble");
    note.textContent = "This browser cannot unpack the drawings and curves of the cards; a newer " +
      "one can. Everything else works.";
    note.hidden = false;
  });
}

function wait() {
  if (window.Bokeh && Bokeh.documents.length) begin();
  else setTimeout(wait, 10);
}
wait();
