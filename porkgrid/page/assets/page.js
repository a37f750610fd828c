// What the page shows now, and how it answers: one survey at a time, one measure, one crosshair, one candidate.

const DATA = JSON.parse(byId("data").textContent);
const MODELS = DATA.surveys.map(modelOf);
const DARK = "(prefers-color-scheme: dark)";
const NOT_CHARTED = /_epoch_jd_tdb$|_branch$/;

const now = { model: null, by: null, entries: [], chosen: null, cell: null, held: false, order: { id: "place", descending: false } };
let due = false; // a redraw is asked for

/** Show a survey, with the measure shown before where it has that one too. */
async function showSurvey(number) {
  const model = MODELS[number];
  const { survey } = model;
  Object.assign(now, { model, chosen: null, cell: null, held: false, order: { id: "place", descending: false } });
  tellAbout(survey);
  const names = survey.grid.measures.map((measure) => measure.name).filter((name) => !NOT_CHARTED.test(name));
  const wanted = names.includes(now.by) ? now.by : survey.rank.by;
  await Promise.all([loadCells(model), loadMeasures(model, [wanted, ...model.limits.map((limit) => limit.measure)])]);
  if (now.model !== model) return; // another survey was asked for meanwhile
  now.by = wanted;
  byId("measure").replaceChildren(...names.map((name) => element("option", { value: name }, labelOf(model.measures.get(name)))));
  byId("measure").value = wanted;
  layReadings(model);
  layLimits(model, redrawSoon);
  settle();
  takeFirst();
  await draw();
  requestAnimationFrame(() => performance.mark("first-chart"));
  document.documentElement.dataset.shown = String(number);
  await loadMeasures(model, survey.grid.measures.map((measure) => measure.name));
  if (now.model !== model) return;
  layTableNow();
  readCell(model, now.cell);
  readChosen(model, now.chosen);
  await showFigures(model, now.chosen);
  await showBeside(survey, DATA.comparisons);
  document.documentElement.dataset.ready = String(number);
}

function tellAbout(survey) {
  tell("title", survey.name);
  tell("route", survey.route);
  tell("description", survey.description);
  tell("thinning", survey.grid.thinning);
  tell("caution", survey.caution);
  tell("facts", `${survey.folder} · ${survey.kernel} · porkgrid ${survey.version} · swept ${survey.swept} · ${survey.conventions}`);
  const { missing } = survey;
  tell("missing", missing === null ? "" :
    `Half swept: ${(100 * missing.share).toFixed(1)} % of the cells are missing (${missing.tiles} of ${missing.of} tiles). ` +
    "What is here is ranked as far as it is; porkgrid sweep with the same scenario goes on.");
  byId("key-missing").hidden = missing === null;
  tell("searched", survey.grid.flybys.length === 0 ? "" :
    "Each cell holds the flyby dates that were best under the limits of the sweep. Limits moved here judge those dates; they do not search for others, and cells in which the sweep kept none stay forbidden.");
}

/** Settle what limits and measure decide: which cells are allowed, and the candidates. */
function settle() {
  applyLimits(now.model);
  now.entries = ranked(now.model, now.by);
}

/** Begin with the best candidate. */
function takeFirst() {
  now.chosen = now.entries[0] ?? null;
  now.cell = now.chosen?.cell ?? null;
}

/** Draw what is settled. */
async function draw() {
  const { model } = now;
  now.chosen = now.entries.find((entry) => entry.key === now.chosen?.key) ?? null;
  await drawChart(model, now.by, now.entries, now.chosen, now.cell);
  layTableNow();
  tellCounts(model);
  if (now.cell !== null) readCell(model, now.cell);
}

async function redraw() {
  settle();
  await draw();
}

/** Redraw before the next frame, once however many limits have moved. */
function redrawSoon() {
  if (due) return;
  due = true;
  requestAnimationFrame(async () => {
    due = false;
    await redraw();
  });
}

function layTableNow() {
  layTable(now.model, now.by, now.entries, now.chosen, now.order, (entry) => choose(entry, false), sortBy);
}

function tellCounts(model) {
  let allowed = 0;
  for (const state of model.states) if (state === ALLOWED) allowed++;
  const share = (100 * allowed) / model.cells;
  tell("counted", `${shown(allowed, 0)} of ${shown(model.cells, 0)} cells allowed (${share.toFixed(1)} %)`);
  const exact = now.entries.filter((entry) => entry.exact).length;
  tell("ranked", `by ${model.measures.get(now.by).symbol}: ${exact} exact of the survey's ${model.survey.candidates.length}, ${now.entries.length - exact} from this page's dates`);
}

function sortBy(id) {
  const again = now.order.id === id;
  now.order = { id, descending: again && !now.order.descending };
  layTableNow();
  byId("table").querySelector(`th[data-column="${id}"] button`).focus();
}

/** Choose a candidate: its row, its ring, its numbers, its figures. */
function choose(entry, fromChart) {
  now.chosen = entry;
  markRow(entry, fromChart);
  ringChosen(entry);
  readChosen(now.model, entry);
  showFigures(now.model, entry);
  if (entry !== null && !fromChart) pointAt(entry.cell, false);
}

/** Put the crosshair on a cell and read it; one that is held does not follow the pointer. */
function pointAt(cell, held) {
  hold(held);
  if (cell === now.cell) return;
  now.cell = cell;
  moveCross(now.model, cell);
  readCell(now.model, cell);
}

function hold(held) {
  now.held = held;
  tell("held", held ? "held" : "");
}

/** Hold the crosshair at a cell and take the candidate beside it, if any. */
function take(cell) {
  pointAt(cell, true);
  const entry = entryBeside(now.model, now.entries, cell);
  if (entry !== null) choose(entry, true);
}

function onChartKey(event) {
  const step = event.shiftKey ? 10 : 1;
  const moves = { ArrowLeft: [-step, 0], ArrowRight: [step, 0], ArrowUp: [0, step], ArrowDown: [0, -step] };
  const { model } = now;
  const cell = now.cell ?? Math.floor(model.arrivals / 2) * model.departures + Math.floor(model.departures / 2);
  if (moves[event.key]) {
    const clamp = (value, count) => Math.min(Math.max(value, 0), count - 1);
    const i = clamp((cell % model.departures) + moves[event.key][0], model.departures);
    const j = clamp(Math.floor(cell / model.departures) + moves[event.key][1], model.arrivals);
    pointAt(j * model.departures + i, true);
  } else if (event.key === "Enter") take(cell);
  else if (event.key === "Escape") hold(false);
  else return;
  event.preventDefault();
}

function listen() {
  const chart = byId("chart");
  chart.on("plotly_hover", (event) => {
    const cell = cellOfEvent(now.model, event);
    if (cell !== null && !now.held) pointAt(cell, false);
  });
  chart.on("plotly_click", (event) => {
    const cell = cellOfEvent(now.model, event);
    if (cell === null) return;
    if (now.held && entryBeside(now.model, now.entries, cell) === null) pointAt(cell, false);
    else take(cell);
  });
  dressForPaper(redraw);
}

/** Colours as chosen, or as the system has them. */
function applyTheme() {
  const wanted = byId("theme").value;
  document.documentElement.dataset.theme = wanted !== "auto" ? wanted : matchMedia(DARK).matches ? "dark" : "light";
  redrawSoon();
}

function start() {
  const names = DATA.surveys.map((survey, number) => element("option", { value: number }, survey.name));
  byId("survey").replaceChildren(...names);
  byId("chooser").hidden = names.length < 2;
  byId("survey").addEventListener("change", (event) => showSurvey(Number(event.target.value)));
  byId("measure").addEventListener("change", async (event) => {
    await loadMeasures(now.model, [event.target.value]);
    now.by = event.target.value;
    redrawSoon();
  });
  byId("reset").addEventListener("click", () => {
    now.model.limits = limitsOf(now.model.survey.grid.flags);
    layLimits(now.model, redrawSoon);
    redrawSoon();
  });
  byId("more").addEventListener("change", async (event) => {
    const name = event.target.value;
    if (name === "") return;
    await loadMeasures(now.model, [name]);
    now.model.limits.push(addedLimit(name));
    layLimits(now.model, redrawSoon);
    redrawSoon();
  });
  byId("theme").addEventListener("change", applyTheme);
  matchMedia(DARK).addEventListener("change", applyTheme);
  byId("print").addEventListener("click", () => print());
  byId("chart").addEventListener("keydown", onChartKey);
}

start();
showSurvey(0).then(listen);
