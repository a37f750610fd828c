// The table of candidates: sorted by any column, and a row for the mark in the chart.

/** Columns for a measure in the chart: dates, what tables begin with, and the two measures that matter now. */
function columnsOf(model, by) {
  const { survey } = model;
  const names = [...new Set([survey.rank.by, by, ...survey.columns.shown])];
  const stops = ["Departure", ...survey.grid.flybys.map((_, n) => `Flyby ${n + 1}`), "Arrival"];
  const measure = (name) => survey.columns.measures.find((each) => each.name === name);
  return [
    { id: "place", title: "#", text: (row) => String(row.place), sort: (row) => row.place, numeric: true },
    { id: "kind", title: "From", text: (row) => nameOf(row.entry), sort: (row) => (row.entry.exact ? row.entry.rank : 1e9) },
    ...stops.map((title, n) => ({ id: `stop-${n}`, title, text: (row) => row.entry.dates[n], sort: (row) => row.entry.epochs[n] })),
    ...names.map(measure).filter(Boolean).map((each) => ({
      id: each.name, title: each.symbol, unit: unitText(each.unit), hint: `${each.meaning} (${each.name})`, numeric: true, marked: each.name === by,
      text: (row) => shown(row.entry.value(each.name), each.digits), sort: (row) => row.entry.value(each.name),
    })),
  ];
}

/** Rows in the order asked for; what has no number comes last whichever way. */
function sortedRows(rows, column, descending) {
  const direction = descending ? -1 : 1;
  return [...rows].sort((a, b) => {
    const x = column.sort(a), y = column.sort(b);
    if (Number.isNaN(x) || Number.isNaN(y)) return Number(Number.isNaN(x)) - Number(Number.isNaN(y));
    return direction * (x - y) || a.place - b.place;
  });
}

/** Lay out the table. `order` is {id, descending}; `choose(entry)` and `sortBy(id)` answer the user. */
function layTable(model, by, entries, chosen, order, choose, sortBy) {
  const columns = columnsOf(model, by);
  const sorting = columns.find((column) => column.id === order.id) ?? columns[0];
  const rows = entries.map((entry, n) => ({ entry, place: n + 1 }));
  const table = byId("table");
  table.tHead.replaceChildren(element("tr", {}, ...columns.map((column) => heading(column, sorting, order, sortBy))));
  table.tBodies[0].replaceChildren(
    ...sortedRows(rows, sorting, order.descending).map((row) => rowElement(row, columns, chosen, choose)),
  );
}

function heading(column, sorting, order, sortBy) {
  const here = column === sorting;
  const button = element("button", { type: "button", title: column.hint ?? column.title }, column.title,
    column.unit ? element("small", {}, column.unit) : "");
  button.addEventListener("click", () => sortBy(column.id));
  return element("th", {
    scope: "col", "data-column": column.id,
    class: [column.numeric && "number", column.marked && "marked"].filter(Boolean).join(" "),
    "aria-sort": here ? (order.descending ? "descending" : "ascending") : "none",
  }, button);
}

function rowElement(row, columns, chosen, choose) {
  const { entry } = row;
  const made = element("tr", {
    tabindex: 0, "data-key": entry.key, class: entry.exact ? "exact" : "thinned", "aria-selected": String(entry.key === chosen?.key),
  }, ...columns.map((column) => element("td", {
    class: [column.numeric && "number", column.marked && "marked"].filter(Boolean).join(" "),
    "data-column": column.id,
  }, column.text(row))));
  made.addEventListener("click", () => choose(entry));
  made.addEventListener("keydown", (event) => {
    if (event.key === "Enter" || event.key === " ") choose(entry);
    else if (event.key === "ArrowDown") made.nextElementSibling?.focus();
    else if (event.key === "ArrowUp") made.previousElementSibling?.focus();
    else return;
    event.preventDefault();
  });
  return made;
}

/** Mark the chosen row, and bring it into view where the choice came from the chart. */
function markRow(chosen, intoView) {
  for (const row of byId("table").tBodies[0].rows) {
    const own = row.dataset.key === chosen?.key;
    row.setAttribute("aria-selected", String(own));
    if (own && intoView) row.scrollIntoView({ block: "nearest" });
  }
}
