// Labels of the figures on chance, and switching families off in them.
function connectCertainty() {
  const found = data.certainty;
  if (!found) return;
  model("order-axis").major_label_overrides =
    new Map(found.order.map((f, row) => [row, families[f].label]));
  found.pairs.forEach(([across, up], place) => {
    model(`attainment-x-${place}`).axis_label = named(columns[across]);
    model(`attainment-y-${place}`).axis_label = named(columns[up]);
  });
  for (const box of document.querySelectorAll("[data-attained]")) {
    box.addEventListener("change", () => {
      found.pairs.forEach((_, place) => {
        for (const part of ["band", "line", "marks"]) {
          model(`attained-${place}-${box.dataset.attained}-${part}`).visible = box.checked;
        }
      });
    });
  }
}
