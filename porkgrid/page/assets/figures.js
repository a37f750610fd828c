// Figures that came along, and the tables of the other commands.

const URLS = new Map(); // of blocks shown as images

async function imageOf(figure, alt) {
  if (!URLS.has(figure.block)) {
    const bytes = await unpackedBytes(figure.block);
    URLS.set(figure.block, URL.createObjectURL(new Blob([bytes], { type: figure.type })));
  }
  return element("img", { src: URLS.get(figure.block), alt });
}

/** Show the figures of the chosen candidate, or say which candidates have some and how the others get theirs. */
async function showFigures(model, entry) {
  const { survey } = model;
  const figures = (entry?.exact && survey.figures[entry.rank]) || [];
  const images = await Promise.all(
    figures.map((figure) => imageOf(figure, `${figure.title} of candidate ${entry.rank}, ${entry.dates.join(" to ")}`)),
  );
  byId("figures").replaceChildren(
    ...images.map((image, n) => element("figure", {}, image, element("figcaption", {}, `${figures[n].title}, ${nameOf(entry)}`))),
  );
  tell("figured", figuredText(survey, entry, figures.length));
}

function figuredText(survey, entry, count) {
  if (survey.missing !== null) return "Paths and flybys are drawn when the sweep is finished.";
  const drawn = Object.keys(survey.figures);
  const have = drawn.length
    ? `Exact candidates with figures in this page: ${drawn.join(", ")}.`
    : "No candidate has figures in this page.";
  if (count) return have;
  if (entry === null) return `Choose a candidate in the table or in the chart. ${have}`;
  if (!entry.exact) return `Figures are drawn of exact candidates only. ${have}`;
  const flyby = survey.grid.flybys.length ? ` --flyby ${entry.rank}` : "";
  return `${have} To have those of candidate ${entry.rank}: porkgrid chart ${survey.folder} --path ${entry.rank}${flyby} --format svg, then porkgrid page again.`;
}

/** Lay out launch periods, slip and comparisons, where they were made. */
async function showBeside(survey, comparisons) {
  const sections = [
    ...survey.periods.map((period) => ({ title: "Launch period", ...period })),
    ...(survey.slip ? [{ title: "Leaving late", file: "slip.csv", table: survey.slip, figure: null }] : []),
    ...comparisons.map((comparison) => ({ title: "Comparison", ...comparison, table: turned(comparison.table) })),
  ];
  const made = await Promise.all(sections.map((section) => besideElement(survey, section)));
  byId("beside").replaceChildren(...made);
}

async function besideElement(survey, { title, file, table, figure }) {
  const section = element("section", { class: "beside" },
    element("div", { class: "bar" }, element("h2", {}, title), element("span", { class: "quiet" }, file)));
  if (figure) section.append(element("figure", {}, await imageOf(figure, `${title}: ${file}`)));
  section.append(
    element("details", { open: figure ? null : true }, element("summary", {}, "Table"),
      element("div", { class: "scroll" }, plainTable(survey, table))));
  return section;
}

/** Routes as columns: a comparison has a row per route and many columns. */
function turned({ headings, rows }) {
  const at = headings.indexOf("name");
  return {
    headings: ["", ...rows.map((row) => row[at])],
    rows: headings.flatMap((heading, n) => (n === at || rows.every((row) => row[n] === null) ? [] : [[heading, ...rows.map((row) => row[n])]])),
  };
}

function plainTable(survey, { headings, rows }) {
  const text = (value) => {
    if (value === null) return NOTHING;
    if (typeof value !== "number") return String(value);
    return Number.isInteger(value) ? String(value) : shown(value, Math.abs(value) < 100 ? 3 : 1);
  };
  return element("table", {},
    element("thead", {}, element("tr", {}, ...headings.map((heading) => element("th", { scope: "col" }, heading)))),
    element("tbody", {}, ...rows.map((row) => element("tr", {},
      ...row.map((value) => element("td", { class: typeof value === "number" ? "number" : null }, text(value)))))));
}
