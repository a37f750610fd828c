// Candidates as the limits stand: the survey's own, and the local bests of the cells that the page holds.

/** +1 where less of a measure is better, −1 where more is: as the survey ranks, else as its nature is. */
function betterSign(survey, name) {
  if (name === survey.rank.by) return survey.rank.sign;
  return survey.columns.measures.find((measure) => measure.name === name)?.better === "most" ? -1 : 1;
}

/** Everything to list: exact candidates that the limits allow and bests of the page's cells, best first. */
function ranked(model, by) {
  const sign = betterSign(model.survey, by);
  const exact = model.survey.candidates
    .filter((candidate) => allowsCandidate(model, candidate))
    .map((candidate) => exactEntry(model, candidate));
  const bests = distinctBests(model, by, sign, exact);
  const cost = (entry) => {
    const value = entry.value(by);
    return Number.isFinite(value) ? sign * value : Infinity;
  };
  return [...exact, ...bests].sort((a, b) => cost(a) - cost(b) || Number(b.exact) - Number(a.exact));
}

/** Whether the limits as they stand allow a candidate, by its own values at full precision. */
function allowsCandidate(model, candidate) {
  return model.limits.every(
    (limit) => !limit.on || asSwept(limit) || isOpen(limit) || !forbids(limit, candidate.values[limit.measure] ?? NaN),
  );
}

function exactEntry(model, candidate) {
  return {
    key: `exact-${candidate.rank}`,
    exact: true,
    rank: candidate.rank,
    dates: candidate.dates,
    epochs: candidate.epochs,
    refined: candidate.refined,
    cell: cellNear(model, candidate.epochs),
    value: (name) => candidate.values[name] ?? NaN,
  };
}

function cellEntry(model, cell, epochs) {
  return {
    key: `cell-${cell}`,
    exact: false,
    rank: null,
    dates: datesAt(model, cell),
    epochs,
    cell,
    value: (name) => valueAt(model, name, cell),
  };
}

/**
 * Local bests, best first, that are windows of their own: not closer in every date than the survey's
 * `apart_days` to a better one, or to an exact candidate that is as good.
 */
function distinctBests(model, by, sign, exact) {
  const { apartDays, keep } = model.survey.rank;
  const values = valuesOf(model, by);
  const known = exact.map((entry) => ({ epochs: entry.epochs, cost: sign * entry.value(by) }));
  const chosen = [];
  for (const cell of localBests(model, values, sign)) {
    if (chosen.length === keep) break;
    const epochs = epochsAt(model, cell);
    const cost = sign * values[cell];
    // a stored value has four bytes: it may fall below the exact one by their rounding
    const beaten = (other) => other.cost <= cost + 1e-6 * Math.abs(cost) && together(other.epochs, epochs, apartDays);
    if (known.some(beaten)) continue;
    known.push({ epochs, cost });
    chosen.push(cellEntry(model, cell, epochs));
  }
  return chosen;
}

function together(a, b, days) {
  return a.every((epoch, n) => Math.abs(epoch - b[n]) < days);
}

/**
 * Allowed cells that none of their eight neighbours beats, best first; of equal neighbours the first in the
 * order of departure, then arrival, counts. The same rule as porkgrid/survey/rank.py.
 */
function localBests(model, values, sign) {
  const { states, departures, arrivals } = model;
  const cost = new Float64Array(values.length);
  for (let cell = 0; cell < cost.length; cell++) {
    const value = sign * values[cell];
    cost[cell] = states[cell] === ALLOWED && value === value ? value : Infinity;
  }
  const found = [];
  for (let j = 0, cell = 0; j < arrivals; j++) {
    for (let i = 0; i < departures; i++, cell++) {
      if (cost[cell] !== Infinity && isLowest(cost, departures, arrivals, i, j)) found.push(cell);
    }
  }
  const order = (cell) => (cell % departures) * arrivals + Math.floor(cell / departures);
  return found.sort((a, b) => cost[a] - cost[b] || order(a) - order(b));
}

function isLowest(cost, departures, arrivals, i, j) {
  const own = cost[j * departures + i];
  for (let dj = -1; dj <= 1; dj++) {
    for (let di = -1; di <= 1; di++) {
      const ni = i + di, nj = j + dj;
      if ((di === 0 && dj === 0) || ni < 0 || nj < 0 || ni >= departures || nj >= arrivals) continue;
      const other = cost[nj * departures + ni];
      const earlier = di < 0 || (di === 0 && dj < 0);
      if (earlier ? own >= other : own > other) return false;
    }
  }
  return true;
}

/** The cell of the page whose dates are nearest to those of a route. */
function cellNear(model, epochs) {
  const { departure, arrival } = model.survey.grid;
  return nearest(arrival.jd, epochs[epochs.length - 1]) * model.departures + nearest(departure.jd, epochs[0]);
}

function nearest(sorted, value) {
  let low = 0, high = sorted.length - 1;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (sorted[middle] <= value) low = middle;
    else high = middle;
  }
  return Math.abs(sorted[high] - value) < Math.abs(sorted[low] - value) ? high : low;
}
