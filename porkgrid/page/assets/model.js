// A survey in the page: its cells, its limits as they stand, and which cells these allow.
//
// Cells are numbered row by row as the chart has them: arrival × departures + departure.

const ALLOWED = 0, FORBIDDEN = 1, NO_FLIGHT = 2, NOT_SWEPT = 3;
const ALL_BITS = 0xffffffff;

/** The model of one survey of the page. Grids are unpacked when they are first asked for. */
function modelOf(survey) {
  const grid = survey.grid;
  const measures = new Map(grid.measures.map((measure) => [measure.name, measure]));
  const reasons = grid.flags.filter((flag) => flag.limit === null).length;
  return {
    survey,
    departures: grid.departure.iso.length,
    arrivals: grid.arrival.iso.length,
    cells: grid.departure.iso.length * grid.arrival.iso.length,
    measures,
    reasonBits: (1 << reasons) - 1,
    limits: limitsOf(grid.flags),
    blocked: null,
    states: null,
    places: [], // of each flyby's date
    held: new Map(), // values by measure, or by block
  };
}

/** The limits of the sweep, as they were. */
function limitsOf(flags) {
  return flags.flatMap((flag, bit) =>
    flag.limit === null ? [] : [{ ...flag.limit, title: flag.title, bit, on: true, swept: { ...flag.limit } }],
  );
}

/** A limit that the page adds; it lets everything pass until it is moved. */
function addedLimit(measure) {
  return { measure, least: null, most: null, title: null, bit: null, on: true, swept: null };
}

/** Unpack what forbids each cell and, of flybys, their dates. */
async function loadCells(model) {
  const { grid } = model.survey;
  model.blocked = await unpackedGrid(grid.blocked, model.arrivals, model.departures);
  model.places = await Promise.all(grid.flybys.map((flyby) => floatsOf(model, flyby.block)));
}

/** Unpack measures, so that `valuesOf` has them. */
async function loadMeasures(model, names) {
  await Promise.all(
    names.map(async (name) => {
      const measure = model.measures.get(name);
      if (measure.of === "both") await floatsOf(model, measure.block);
    }),
  );
}

async function floatsOf(model, block) {
  if (!model.held.has(block)) {
    const words = await unpackedGrid(block, model.arrivals, model.departures);
    model.held.set(block, new Float32Array(words.buffer));
  }
  return model.held.get(block);
}

/** The values of a measure at every cell, a Float32Array or, of epochs, a Float64Array. */
function valuesOf(model, name) {
  const measure = model.measures.get(name);
  if (measure.of === "both") return model.held.get(measure.block);
  if (!model.held.has(name)) {
    const wide = new Float64Array(model.cells);
    for (let cell = 0; cell < model.cells; cell++) wide[cell] = valueAt(model, name, cell);
    model.held.set(name, wide);
  }
  return model.held.get(name);
}

/** The value of a measure at one cell; NaN where it is not there. */
function valueAt(model, name, cell) {
  const measure = model.measures.get(name);
  if (measure === undefined) return NaN;
  if (measure.of === "both") return model.held.get(measure.block)?.[cell] ?? NaN;
  if (measure.of === "departure") return measure.values[cell % model.departures];
  if (measure.of === "arrival") return measure.values[Math.floor(cell / model.departures)];
  const flyby = model.survey.grid.flybys[measure.number - 1];
  return flyby.jd[model.places[measure.number - 1][cell]] ?? NaN;
}

/** The ISO dates of all encounters of a cell, in flying order; "–" where a flyby has none. */
function datesAt(model, cell) {
  const { grid } = model.survey;
  return [
    grid.departure.iso[cell % model.departures],
    ...grid.flybys.map((flyby, n) => flyby.iso[model.places[n][cell]] ?? "–"),
    grid.arrival.iso[Math.floor(cell / model.departures)],
  ];
}

/** The epochs of all encounters of a cell, TDB Julian dates. */
function epochsAt(model, cell) {
  const { grid } = model.survey;
  return [
    grid.departure.jd[cell % model.departures],
    ...grid.flybys.map((flyby, n) => flyby.jd[model.places[n][cell]] ?? NaN),
    grid.arrival.jd[Math.floor(cell / model.departures)],
  ];
}

/** Whether a limit stands as it was swept. Then the survey's own bits, from full precision, decide. */
function asSwept(limit) {
  return limit.swept !== null && limit.least === limit.swept.least && limit.most === limit.swept.most;
}

/** Whether a limit has no end at all: it was added and not yet moved. */
function isOpen(limit) {
  return limit.least === null && limit.most === null;
}

/** Whether a limit as it stands forbids a value; NaN is never inside. */
function forbids(limit, value) {
  return !((limit.least === null || value >= limit.least) && (limit.most === null || value <= limit.most));
}

/** Settle again which cells the limits allow: a code per cell in `model.states`. */
function applyLimits(model) {
  const states = new Uint8Array(model.cells);
  let bits = 0;
  for (const limit of model.limits) if (limit.on && asSwept(limit)) bits |= 1 << limit.bit;
  for (let cell = 0; cell < states.length; cell++) {
    const word = model.blocked[cell];
    if (word === ALL_BITS) states[cell] = NOT_SWEPT;
    else if (word & model.reasonBits) states[cell] = NO_FLIGHT;
    else if (word & bits || isEmpty(model, cell)) states[cell] = FORBIDDEN;
  }
  for (const limit of model.limits) if (limit.on && !asSwept(limit) && !isOpen(limit)) forbidMore(model, states, limit);
  model.states = states;
}

/** Whether the search for flyby dates kept no route in a cell: then no limit that is moved can open it. */
function isEmpty(model, cell) {
  return model.places.some((place) => place[cell] < 0);
}

function forbidMore(model, states, limit) {
  const values = valuesOf(model, limit.measure);
  const least = limit.least ?? -Infinity, most = limit.most ?? Infinity;
  for (let cell = 0; cell < states.length; cell++) {
    const value = values[cell];
    if (states[cell] === ALLOWED && !(value >= least && value <= most)) states[cell] = FORBIDDEN;
  }
}

/** What forbids one cell as the limits stand, in words; empty where it is allowed. */
function whyNot(model, cell) {
  const { flags } = model.survey.grid;
  const word = model.blocked[cell];
  if (word === ALL_BITS) return ["not swept yet"];
  if (word & model.reasonBits) {
    return flags.filter((flag, bit) => flag.limit === null && word & (1 << bit)).map((flag) => flag.title);
  }
  const standing = model.limits
    .filter((limit) => {
      if (!limit.on || isOpen(limit)) return false;
      if (asSwept(limit)) return word & (1 << limit.bit);
      return forbids(limit, valueAt(model, limit.measure, cell));
    })
    .map((limit) => limitTitle(model, limit));
  return standing.length === 0 && isEmpty(model, cell) ? ["no route kept under the limits of the sweep"] : standing;
}
