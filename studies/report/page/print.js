// On paper a plot is a picture as wide as its place, whatever the width of the window was.
function connectPrinting() {
  window.addEventListener("beforeprint", () => {
    for (const plot of document.querySelectorAll(".plot")) {
      const root = plot.querySelector("[data-root-id]");
      const view = root && Bokeh.index.find_one(book.get_model_by_id(root.dataset.rootId));
      if (!view || plot.hidden || !plot.checkVisibility()) continue;
      const { canvas } = view.export("png");
      canvas.className = "printed";
      canvas.removeAttribute("style");
      plot.append(canvas);
    }
  });
  window.addEventListener("afterprint", () => {
    for (const canvas of document.querySelectorAll("canvas.printed")) canvas.remove();
  });
}
