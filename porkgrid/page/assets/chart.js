// The chart: a Plotly heatmap of one measure over both dates, what forbids the rest, candidates, a crosshair.

const STATES = 0, VALUES = 1, BESTS = 2, EXACT = 3, CHOSEN = 4; // traces, from below
const CLICK_REACH_PX = 14;
const NARROW_PX = 560; // of a chart that has its colour key above it
const MODE_BAR = {
  displaylogo: false,
  responsive: true,
  scrollZoom: false,
  modeBarButtonsToRemove: ["lasso2d", "select2d", "autoScale2d"],
};

function css(name) {
  return getComputedStyle(document.documentElement).getPropertyValue(name).trim();
}

/** Best to worst, from the page's style: the ramp is ordered in grey and without red-green vision. */
function ramp() {
  const colours = css("--ramp").split(/\s+/);
  return colours.map((colour, n) => [n / (colours.length - 1), colour]);
}

/** Rows of a flat array, which they share. */
function rowsOf(flat, columns) {
  const rows = [];
  for (let at = 0; at < flat.length; at += columns) rows.push(flat.subarray(at, at + columns));
  return rows;
}

/** The values of a measure where the limits allow, and the range that colours are stretched over. */
function shownValues(model, by) {
  const values = valuesOf(model, by);
  const masked = new Float32Array(model.cells).fill(NaN);
  let least = Infinity, most = -Infinity;
  for (let cell = 0; cell < masked.length; cell++) {
    if (model.states[cell] !== ALLOWED) continue;
    const value = (masked[cell] = values[cell]);
    if (value < least) least = value;
    if (value > most) most = value;
  }
  return { masked, ...colourRange(model, by, sampled(masked, 40000).sort(), least, most) };
}

/** About so many of the finite values, evenly taken; typed, so that sorting is by number. */
function sampled(values, count) {
  const stride = Math.max(1, Math.floor(values.length / count));
  const taken = new Float64Array(Math.ceil(values.length / stride));
  let size = 0;
  for (let at = 0; at < values.length; at += stride) if (Number.isFinite(values[at])) taken[size++] = values[at];
  return taken.subarray(0, size);
}

/** From the best value to where one in twenty is worse, so that a few bad cells do not take the colours. */
function colourRange(model, by, sample, least, most) {
  if (least > most) return { low: 0, high: 1 };
  const tail = Math.floor(sample.length / 20);
  if (betterSign(model.survey, by) > 0) most = sample[sample.length - 1 - tail] ?? most;
  else least = sample[tail] ?? least;
  return { low: least, high: most > least ? most : least + 1 };
}

/**
 * What lies under the colours: a state per cell, and in greys how the measure runs where limits forbid it.
 * Allowed cells lie from 0 to 1, forbidden ones from 1 (best) to 2, cells without flight from 2, missing ones from 3.
 */
function groundOf(model, by) {
  const values = valuesOf(model, by);
  const ground = new Float32Array(model.cells);
  const sign = betterSign(model.survey, by);
  const costs = sampled(values, 20000).map((value) => sign * value).sort();
  const best = costs[0] ?? 0, spread = (costs[Math.floor(costs.length * 0.7)] ?? 1) - best || 1;
  for (let cell = 0; cell < model.cells; cell++) {
    const worse = (sign * values[cell] - best) / spread;
    const state = model.states[cell];
    ground[cell] = state === FORBIDDEN ? FORBIDDEN + 0.98 * (worse >= 0 ? Math.min(worse, 1) : worse < 0 ? 0 : 1) : state + 0.5;
  }
  return ground;
}

/** All traces for a measure and a list of candidates. */
function tracesOf(model, by, entries, chosen) {
  const { departure, arrival } = model.survey.grid;
  const { masked, low, high } = shownValues(model, by);
  const measure = model.measures.get(by);
  const common = { type: "heatmap", x: departure.iso, y: arrival.iso, zsmooth: false };
  return [
    {
      ...common,
      z: rowsOf(groundOf(model, by), model.departures),
      zmin: ALLOWED, zmax: NOT_SWEPT + 1, showscale: false, hoverinfo: "none",
      colorscale: groundColours(),
    },
    {
      ...common,
      z: rowsOf(masked, model.departures),
      zmin: low, zmax: high, hoverinfo: "skip",
      colorscale: ramp(), reversescale: betterSign(model.survey, by) < 0,
      colorbar: { ...colourBar(), title: { text: plain(labelOf(measure)), side: "right" } },
    },
    marks(entries.filter((entry) => !entry.exact), "circle-open", 9, css("--mark-thinned")),
    marks(entries.filter((entry) => entry.exact), "diamond", 10, css("--mark-exact")),
    {
      ...marks(chosen ? [chosen] : [], "circle-open", 22, css("--accent")),
      marker: { symbol: "circle-open", size: 22, color: css("--accent"), line: { width: 3 } },
    },
  ];
}

/** The key of the colours: at the side, or above where the chart is narrow. */
function colourBar() {
  const common = { thickness: 14, outlinewidth: 0, len: 1 };
  if (byId("chart").clientWidth > NARROW_PX) return common;
  return { ...common, thickness: 10, orientation: "h", x: 0.5, xanchor: "center", y: 1.02, yanchor: "bottom", nticks: 4 };
}

function groundColours() {
  const ends = [["--paper", "--paper"], ["--forbidden-best", "--forbidden"], ["--no-flight", "--no-flight"], ["--not-swept", "--not-swept"]];
  return ends.flatMap(([first, last], n) => [[n / ends.length, css(first)], [(n + 1) / ends.length, css(last)]]);
}

function marks(entries, symbol, size, colour) {
  return {
    type: "scatter", mode: "markers", hoverinfo: "skip", showlegend: false,
    x: entries.map((entry) => entry.dates[0]),
    y: entries.map((entry) => entry.dates[entry.dates.length - 1]),
    marker: { symbol, size, color: colour, line: { width: 1.5, color: css("--mark-edge") } },
  };
}

function layoutOf(model) {
  const axis = {
    type: "date", gridcolor: "rgba(128,128,128,.25)", zeroline: false, tickformat: "%Y-%m-%d",
    tickfont: { size: 11 }, automargin: false, linecolor: css("--line"), showline: true, mirror: true,
  };
  const stops = model.survey.route.split(" → ");
  const wide = byId("chart").clientWidth;
  return {
    uirevision: model.survey.folder,
    margin: { l: 92, r: wide > NARROW_PX ? 96 : 14, t: wide > NARROW_PX ? 34 : 70, b: 52 }, // above, room for the mode bar
    paper_bgcolor: "rgba(0,0,0,0)", plot_bgcolor: css("--paper"),
    font: { family: css("--font"), size: 12, color: css("--ink") },
    xaxis: { ...axis, nticks: Math.max(3, Math.floor(wide / 130)), title: { text: `Departure from ${plain(stops[0])}`, standoff: 8 }, ...reach(model, "departure") },
    yaxis: { ...axis, nticks: 7, title: { text: `Arrival at ${plain(stops[stops.length - 1])}`, standoff: 8 }, ...reach(model, "arrival") },
    hovermode: "closest",
    dragmode: "zoom",
    shapes: [],
  };
}

/** A name without the signs that Plotly reads as markup. */
function plain(name) {
  return name.replace(/[<>&]/g, " ");
}

/** The range of an axis, from the outer edge of its first cell to that of its last. */
function reach(model, side) {
  const { iso } = model.survey.grid[side];
  if (iso.length < 2) return {};
  const times = iso.map(milliseconds), last = times.length - 1;
  const edges = [1.5 * times[0] - 0.5 * times[1], 1.5 * times[last] - 0.5 * times[last - 1]];
  return { range: edges.map((time) => new Date(time).toISOString().replace("T", " ").replace("Z", "")) };
}

/** Two lines through a cell. */
function crossOf(model, cell) {
  if (cell === null) return [];
  const dates = datesAt(model, cell);
  const line = { color: css("--accent"), width: 1, dash: "dot" };
  const x = dates[0], y = dates[dates.length - 1];
  return [
    { type: "line", xref: "x", yref: "paper", x0: x, x1: x, y0: 0, y1: 1, line },
    { type: "line", xref: "paper", yref: "y", x0: 0, x1: 1, y0: y, y1: y, line },
  ];
}

/** Draw, or draw again. Zoom stays as it is while the survey is the same. */
async function drawChart(model, by, entries, chosen, cell) {
  const layout = { ...layoutOf(model), shapes: crossOf(model, cell) };
  await Plotly.react(byId("chart"), tracesOf(model, by, entries, chosen), layout, MODE_BAR);
}

function moveCross(model, cell) {
  Plotly.relayout(byId("chart"), { shapes: crossOf(model, cell) });
}

function ringChosen(chosen) {
  const { x, y } = marks(chosen ? [chosen] : [], "circle-open", 22, "");
  Plotly.restyle(byId("chart"), { x: [x], y: [y] }, [CHOSEN]);
}

/** The cell that a point event of Plotly is about; null where it is about none. */
function cellOfEvent(model, event) {
  const point = event.points.find((each) => each.curveNumber === STATES);
  if (point === undefined) return null;
  const [row, column] = point.pointIndex ?? point.pointNumber;
  return row * model.departures + column;
}

/** The candidate whose mark lies within reach of a cell on the screen; null where there is none. */
function entryBeside(model, entries, cell) {
  const { xaxis, yaxis } = byId("chart").layout;
  const plot = byId("chart").querySelector(".nsewdrag").getBoundingClientRect();
  const place = (dates) => [
    across(xaxis.range, dates[0]) * plot.width,
    across(yaxis.range, dates[dates.length - 1]) * plot.height,
  ];
  const [x, y] = place(datesAt(model, cell));
  let found = null, reachPx = CLICK_REACH_PX;
  for (const entry of entries) {
    const [ex, ey] = place(entry.dates);
    const distance = Math.hypot(ex - x, ey - y);
    if (distance <= reachPx) [found, reachPx] = [entry, distance];
  }
  return found;
}

function across(range, date) {
  const [first, last] = range.map(milliseconds);
  return (milliseconds(date) - first) / (last - first);
}

/** Dates as Plotly and as the survey write them; both without a zone. */
function milliseconds(date) {
  const text = String(date).replace(" ", "T");
  return Date.parse(text.includes("T") ? `${text}Z` : text);
}
