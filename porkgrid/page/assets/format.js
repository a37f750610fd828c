// Numbers, names and elements as the page writes them. Text goes in as text, never as markup.

const NARROW_BLANK = "\u202f", MINUS = "\u2212", NOTHING = "\u2013";

/** A number with so many decimals, thousands apart: "12 345", "−28.5"; a dash where there is none. */
function shown(value, digits) {
  if (value === null || value === undefined || !Number.isFinite(value)) return NOTHING;
  const [whole, decimals] = Math.abs(value).toFixed(digits).split(".");
  const apart = whole.length > 4 ? whole.replace(/\B(?=(\d{3})+$)/g, NARROW_BLANK) : whole;
  const text = decimals ? `${apart}.${decimals}` : apart;
  return value < 0 && Number(value.toFixed(digits)) !== 0 ? MINUS + text : text;
}

/** A unit as it follows a number; nothing for a bare number. */
function unitText(unit) {
  return unit === "1" ? "" : unit === "deg" ? "°" : unit;
}

/** A measure's symbol with its unit, as for an axis. */
function labelOf(measure) {
  return measure.unit === "1" ? measure.symbol : `${measure.symbol} (${unitText(measure.unit)})`;
}

/** How a limit is called: in the survey's words while it stands as swept, else by what it says now. */
function limitTitle(model, limit) {
  if (limit.title !== null && asSwept(limit)) return limit.title;
  const measure = model.measures.get(limit.measure);
  const number = (value) => `${shown(value, Math.max(measure.digits, 1))}`;
  if (isOpen(limit)) return `${measure.symbol}: any`;
  const parts = [];
  if (limit.least !== null) parts.push(`at least ${number(limit.least)}`);
  if (limit.most !== null) parts.push(`at most ${number(limit.most)}`);
  return `${measure.symbol} ${parts.join(", ")} ${unitText(measure.unit)}`.trim();
}

/** A new element with attributes and children; strings become text nodes. */
function element(name, attributes, ...children) {
  const made = document.createElement(name);
  for (const [key, value] of Object.entries(attributes ?? {})) {
    if (value !== null && value !== undefined && value !== false) made.setAttribute(key, value === true ? "" : value);
  }
  made.append(...children);
  return made;
}

function byId(id) {
  return document.getElementById(id);
}

/** Put text into an element and hide it where there is none. */
function tell(id, text) {
  const place = byId(id);
  place.textContent = text;
  place.hidden = text === "";
}
