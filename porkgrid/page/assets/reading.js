// The reading: every measure of the cell under the crosshair, beside those of the chosen candidate.

/** Lay out a row per measure that the page knows of the survey. */
function layReadings(model) {
  const stops = ["Departure", ...model.survey.grid.flybys.map((_, n) => `Flyby ${n + 1}`), "Arrival"];
  byId("readings").replaceChildren(
    ...stops.map((title) =>
      element("tr", { class: "stop" }, element("th", { scope: "row" }, title),
        element("td", { class: "here" }), element("td", { class: "chosen" }), element("td", { class: "unit" }, "TDB"))),
    ...model.survey.columns.measures
      .filter((measure) => !measure.name.endsWith("_epoch_jd_tdb"))
      .map((measure) =>
        element("tr", { "data-measure": measure.name },
          element("th", { scope: "row", title: `${measure.meaning} (${measure.name})` }, measure.symbol),
          element("td", { class: "here" }), element("td", { class: "chosen" }),
          element("td", { class: "unit" }, unitText(measure.unit))),
      ),
  );
}

/** Fill one column of the readings; `value` gives a measure's number by name. */
function fillReadings(model, column, value) {
  for (const measure of model.survey.columns.measures) {
    const cell = byId("readings").querySelector(`[data-measure="${measure.name}"] .${column}`);
    if (cell === null) continue;
    const number = value(measure.name);
    cell.textContent = shown(number, measure.digits);
    cell.dataset.value = Number.isFinite(number) ? String(number) : "";
    cell.title = cell.dataset.value;
  }
}

function fillDates(column, dates) {
  const cells = byId("readings").querySelectorAll(`.stop .${column}`);
  cells.forEach((cell, n) => (cell.textContent = dates?.[n] ?? NOTHING));
}

/** Read a cell out. */
function readCell(model, cell) {
  fillDates("here", cell === null ? null : datesAt(model, cell));
  fillReadings(model, "here", (name) => (cell === null ? NaN : valueAt(model, name, cell)));
  const reasons = cell === null ? [] : whyNot(model, cell);
  const status = byId("status");
  status.textContent =
    cell === null ? "No cell under the crosshair."
    : reasons.length === 0 ? `${datesAt(model, cell).join(" → ")}: allowed.`
    : `${datesAt(model, cell).join(" → ")}: ${reasons.join("; ")}.`;
  status.className = cell === null ? "" : reasons.length === 0 ? "allowed" : "stopped";
}

/** Read the chosen candidate out. */
function readChosen(model, entry) {
  byId("chosen").textContent = entry === null ? "Candidate" : entry.exact ? `Exact ${entry.rank}` : "From page";
  fillDates("chosen", entry?.dates);
  tell("refined", refinedText(model.survey, entry?.refined ?? null, entry));
  fillReadings(model, "chosen", (name) => (entry === null ? NaN : entry.value(name)));
}

/** What the chosen candidate becomes when its dates are let off the grid, as the sweep found. */
function refinedText(survey, refined, entry) {
  if (refined === null) return "";
  const measure = survey.columns.measures.find((each) => each.name === survey.rank.by);
  const value = `${shown(refined.value, measure.digits)} ${unitText(measure.unit)}`.trim();
  const note = refined.note === "" ? "" : ` (${refined.note})`;
  return `Off the grid, candidate ${entry.rank} becomes ${refined.dates.join(" → ")}: ${measure.symbol} ${value}${note}.`;
}

/** What a candidate is called: by its rank in the survey, or as one of the page's cells. */
function nameOf(entry) {
  return entry.exact ? `exact ${entry.rank}` : "page";
}
