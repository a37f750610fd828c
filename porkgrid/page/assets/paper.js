// On paper the page is light, whatever it is on the screen, and the chart has a size that fits.

const PAPER_CHART = { width: 980, height: 600 }; // px: an A4 sheet across, within its margins

function dressForPaper(draw) {
  const chart = byId("chart");
  let theme = null;
  addEventListener("beforeprint", () => {
    theme ??= document.documentElement.dataset.theme;
    document.documentElement.dataset.theme = "light";
    chart.style.height = `${PAPER_CHART.height}px`;
    draw();
    Plotly.relayout(chart, PAPER_CHART);
  });
  addEventListener("afterprint", () => {
    document.documentElement.dataset.theme = theme ?? "light";
    theme = null;
    chart.style.height = "";
    Plotly.relayout(chart, { width: null, height: null, autosize: true });
    draw();
  });
}
