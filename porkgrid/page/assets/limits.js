// Limits as sliders: those of the sweep, which can be moved or left out, and any that are added here.

const SLIDER_STEPS = 400;

/** Lay out the limits; `moved` is called when one has changed. */
function layLimits(model, moved) {
  byId("sliders").replaceChildren(...model.limits.map((limit) => limitElement(model, limit, moved)));
  const free = model.survey.grid.measures.filter(
    (measure) => measure.of !== "flyby" && !measure.name.endsWith("_epoch_jd_tdb"),
  );
  byId("more").replaceChildren(
    element("option", { value: "" }, "a limit on…"),
    ...free.map((measure) => element("option", { value: measure.name }, labelOf(measure))),
  );
}

function limitElement(model, limit, moved) {
  const measure = model.measures.get(limit.measure);
  const [low, high] = reachOf(model, limit);
  const title = element("span", { class: "limit-title" });
  const use = element("input", { type: "checkbox" });
  use.checked = limit.on;
  const box = element("fieldset", { "data-limit": limit.measure },
    element("legend", {}, element("label", { title: measure.meaning }, use, title)));
  const changed = () => {
    title.textContent = limitTitle(model, limit);
    box.classList.toggle("moved", !limit.on || !asSwept(limit));
    moved();
  };
  use.addEventListener("change", () => {
    limit.on = use.checked;
    changed();
  });
  for (const end of ["least", "most"]) {
    if (limit[end] !== null || limit.swept === null) box.append(endElement(measure, limit, end, low, high, changed));
  }
  title.textContent = limitTitle(model, limit);
  box.classList.toggle("moved", !limit.on || !asSwept(limit));
  return box;
}

/** A slider for one end of a limit, with its number beside it for values between the slider's steps. */
function endElement(measure, limit, end, low, high, changed) {
  const name = `${measure.symbol}: ${end === "least" ? "at least" : "at most"}`;
  const slider = element("input", {
    type: "range", min: low, max: high, step: (high - low) / SLIDER_STEPS, "aria-label": name, "data-end": end,
  });
  const number = element("input", { type: "number", step: "any", "aria-label": `${name}, as a number` });
  slider.value = String(limit[end] ?? (end === "least" ? low : high));
  number.value = limit[end] === null ? "" : String(limit[end]);
  slider.addEventListener("input", () => {
    limit[end] = Number(Number(slider.value).toPrecision(6));
    number.value = String(limit[end]);
    changed();
  });
  number.addEventListener("change", () => {
    if (number.value !== "") limit[end] = slider.value = Number(number.value);
    else if (limit.swept === null) limit[end] = null;
    else number.value = String(limit[end]);
    changed();
  });
  return element("div", { class: "end" },
    element("span", {}, end === "least" ? "at least" : "at most"), slider, number,
    element("span", { class: "unit" }, unitText(measure.unit)));
}

/**
 * How far the sliders of a limit reach: the values of the measure without their tails, the limit itself, and
 * of a long tail no farther beyond the limit than thrice what the limit leaves.
 */
function reachOf(model, limit) {
  const values = valuesOf(model, limit.measure);
  const sample = sampled(values, 20000).sort();
  const at = (share) => sample[Math.floor(share * (sample.length - 1))] ?? 0;
  let low = at(0), high = at(0.98);
  const { least, most } = limit.swept ?? {};
  if (Number.isFinite(most) && most > low) high = Math.min(high, most + 3 * (most - low));
  if (Number.isFinite(least) && least < high) low = Math.max(low, least - 3 * (high - least));
  const ends = [limit.least, limit.most, least, most].filter(Number.isFinite);
  [low, high] = [Math.min(low, ...ends), Math.max(high, ...ends)];
  return [low, high > low ? high : low + 1];
}
